"""The saturating (soft-bound) update of Fusi and Abbott (2007) with round illustrative numbers."""

from __future__ import annotations

from math import log1p

from device_models.constants import BOLTZMANN, ELEMENTARY_CHARGE
from device_models.contract import ParameterSet, Sourced

_LAW = "law of Fusi & Abbott, Nature Neurosci. 10:485 (2007), from memory"
_ROUND = "stand-in: round illustrative value"
# L k T / (gamma a0 q) with gamma = 16, a0 = 0.25 nm, L = 12 nm, T = 298.15 K: 77 mV
_HOPPING_SCALE = 12e-9 * BOLTZMANN * 298.15 / (16.0 * 0.25e-9 * ELEMENTARY_CHARGE)
_HOPPING = "Guan, Yu, Wong, IEEE Electron Device Lett. 33:1405 (2012), from memory: a0 0.25 nm, gamma 16, L 12 nm, 298 K"


def fusi2007() -> ParameterSet:
    """1 to 100 uS; a nominal pulse moves 5 % of the distance left upwards, 8 % downwards."""
    return ParameterSet(
        name="fusi2007",
        title="Saturating update with illustrative numbers: 1 to 100 uS, 5 % up, 8 % down per pulse",
        values={
            "G_min": Sourced(1e-6, _ROUND),
            "G_max": Sourced(100e-6, _ROUND),
            "set_rate": Sourced(-log1p(-0.05) / 100e-9, f"{_LAW}; 5 % in 100 ns: {_ROUND}"),
            "reset_rate": Sourced(-log1p(-0.08) / 100e-9, f"{_LAW}; 8 % in 100 ns: {_ROUND}"),
            "set_voltage": Sourced(1.0, _ROUND),
            "reset_voltage": Sourced(1.0, _ROUND),
            "set_scale": Sourced(_HOPPING_SCALE, _HOPPING),
            "reset_scale": Sourced(_HOPPING_SCALE, _HOPPING),
        },
        initial_S=10e-6,
    )
