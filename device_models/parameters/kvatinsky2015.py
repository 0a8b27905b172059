"""The voltage-threshold law of Kvatinsky et al. (2015) with round illustrative numbers, equal in both directions."""

from __future__ import annotations

from device_models.contract import ParameterSet, Sourced
from device_models.resistance_laws import LINEAR_RESISTANCE
from device_models.windows import NONE

_PAPER = "Kvatinsky et al., IEEE Trans. Circuits Syst. II 62:786 (2015), from memory"
_ROUND = "stand-in: round illustrative value"


def kvatinsky2015() -> ParameterSet:
    """Linear resistance law, no window; symbols of the paper, numbers ours."""
    return ParameterSet(
        name="kvatinsky2015",
        title="Voltage-threshold law with illustrative numbers (1 kohm to 100 kohm, thresholds 0.5 V)",
        values={
            "R_on": Sourced(1e3, _ROUND),
            "R_off": Sourced(1e5, _ROUND),
            "x_on": Sourced(0.0, f"origin of the state, {_PAPER}"),
            "x_off": Sourced(3e-9, f"3 nm, {_PAPER}"),
            "v_on": Sourced(-0.5, _ROUND),
            "v_off": Sourced(0.5, _ROUND),
            "k_on": Sourced(-0.02, _ROUND),
            "k_off": Sourced(0.02, _ROUND),
            "alpha_on": Sourced(3.0, _ROUND),
            "alpha_off": Sourced(3.0, _ROUND),
            "law": Sourced(LINEAR_RESISTANCE, f"linear current-voltage relation, {_PAPER}"),
            "window": Sourced(NONE, "stand-in: no window, the law has a closed form"),
            "window_exponent": Sourced(1.0, "stand-in: unused without window"),
        },
        initial_S=2e-5,
    )
