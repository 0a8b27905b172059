"""A fast cell for logic in memory, voltage-threshold law with the numbers of Talati et al. (2016)."""

from __future__ import annotations

from device_models.contract import ParameterSet, Sourced
from device_models.resistance_laws import LINEAR_RESISTANCE
from device_models.windows import NONE

_PAPER = "Talati, Gupta, Mane, Kvatinsky, IEEE Trans. Nanotechnol. 15:635 (2016), table of parameters, from memory"


def talati2016() -> ParameterSet:
    """RESET threshold far below the SET threshold: switches in about a nanosecond, and is easily disturbed."""
    return ParameterSet(
        name="talati2016",
        title="Voltage-threshold cell for logic (1 kohm to 300 kohm, thresholds -1.5 V and 0.3 V)",
        values={
            "R_on": Sourced(1e3, _PAPER),
            "R_off": Sourced(300e3, _PAPER),
            "x_on": Sourced(0.0, _PAPER),
            "x_off": Sourced(3e-9, _PAPER),
            "v_on": Sourced(-1.5, _PAPER),
            "v_off": Sourced(0.3, _PAPER),
            "k_on": Sourced(-216.2, _PAPER),
            "k_off": Sourced(0.091, _PAPER),
            "alpha_on": Sourced(4.0, _PAPER),
            "alpha_off": Sourced(4.0, _PAPER),
            "law": Sourced(LINEAR_RESISTANCE, _PAPER),
            "window": Sourced(NONE, "stand-in: the table names no window"),
            "window_exponent": Sourced(1.0, "stand-in: unused without window"),
        },
        initial_S=1e-5,
    )
