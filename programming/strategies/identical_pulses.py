"""Identical pulses with verify: the same pulse, in the direction of the target, until the reading is in the band.

Closed-loop programming with identical pulses as in Yao et al., Nature 577:641 (2020) (from memory).
"""

from __future__ import annotations

from device_models.compiled import compiled
from programming.strategy_contract import ACCEPT, RESET, SET, CellStrategy


@compiled
def decide(target, tolerance, reading, pulses, memory, rules):
    """Below the band one SET pulse, above it one RESET pulse, always the train's `start` and `width`."""
    error = reading - target
    if abs(error) <= tolerance:
        return ACCEPT, 0.0, 0.0, 0.0
    if error < 0.0:
        return SET, rules.set_start, rules.set_width, 0.0
    return RESET, rules.reset_start, rules.reset_width, 0.0


STRATEGY = CellStrategy(
    name="identical_pulses",
    summary="the same pulse, SET or RESET, until the reading is in the band",
    source="Yao et al., Nature 577:641 (2020) (from memory)",
    knowledge="none",
    decide=decide,
)
