"""Linear ion drift with the numbers of Strukov, Snider, Stewart, Williams, Nature 453:80 (2008)."""

from __future__ import annotations

from dataclasses import replace

from device_models.contract import ParameterSet, Sourced
from device_models.windows import JOGLEKAR, NONE

_PAPER = "Strukov et al., Nature 453:80 (2008), from memory"


def strukov2008() -> ParameterSet:
    """No window: the state moves with the charge until it reaches an end."""
    return ParameterSet(
        name="strukov2008",
        title="Linear ion drift without window, 10 nm of oxide, resistance ratio 160",
        values={
            "R_on": Sourced(100.0, "stand-in: the paper gives the ratio of 160; 100 ohm sets the scale"),
            "R_off": Sourced(16e3, f"160 R_on, {_PAPER}"),
            "mobility": Sourced(1e-14, f"1e-10 cm^2/(V s), {_PAPER}"),
            "thickness": Sourced(10e-9, f"10 nm, {_PAPER}"),
            "window": Sourced(NONE, f"the law as first stated, {_PAPER}"),
            "window_exponent": Sourced(1.0, "stand-in: unused without window"),
        },
        initial_S=1.0 / 14410.0,  # x = 0.1
    )


def strukov2008_joglekar() -> ParameterSet:
    """The same cell with the Joglekar window, p = 1: the state slows down towards both ends."""
    plain = strukov2008()
    window = {
        "window": Sourced(JOGLEKAR, "Joglekar & Wolf, Eur. J. Phys. 30:661 (2009)"),
        "window_exponent": Sourced(1.0, "stand-in: p = 1, the window with a closed form"),
    }
    return replace(
        plain,
        name="strukov2008_joglekar",
        title="Linear ion drift with the Joglekar window, p = 1",
        values={**plain.values, **window},
    )
