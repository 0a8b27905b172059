"""Incremental-step pulse programming in width, with verify: fixed amplitude, growing width.

Verify; in the band: done; below it SET, above it RESET. The first pulse of a run in one direction has that direction's
`width`, each further one adds `width_step` up to `width_stop`; a change of direction begins again at `width`. The amplitude
is the train's `start`. Common practice, no source.
"""

from __future__ import annotations

from device_models.compiled import compiled
from programming.staircase import next_step
from programming.strategy_contract import ACCEPT, RESET, SET, CellStrategy


@compiled
def decide(target, tolerance, reading, pulses, memory, rules):
    """memory: see programming.staircase."""
    error = reading - target
    if abs(error) <= tolerance:
        return ACCEPT, 0.0, 0.0, 0.0
    direction, step = next_step(error, memory)
    if direction == SET:
        return SET, rules.set_start, min(rules.set_width + step * rules.set_width_step, rules.set_width_stop), 0.0
    return RESET, rules.reset_start, min(rules.reset_width + step * rules.reset_width_step, rules.reset_width_stop), 0.0


STRATEGY = CellStrategy(
    name="width_staircase",
    summary="pulses of growing width at fixed amplitude, begun again at each change of direction",
    source="common practice, no source",
    knowledge="none",
    decide=decide,
    memory=2,
    widths="staircase",
)
