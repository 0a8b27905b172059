"""Incremental-step pulse programming in amplitude, with verify.

Verify; in the band: done; below it SET, above it RESET. The first pulse of a run in one direction has that direction's
`start`, each further one adds `step` up to `stop`; a change of direction begins again at `start`.
Source of the principle: Suh et al., IEEE J. Solid-State Circuits 30:1149 (1995) (from memory).
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
        return SET, min(rules.set_start + step * rules.set_step, rules.set_stop), rules.set_width, 0.0
    return RESET, min(rules.reset_start + step * rules.reset_step, rules.reset_stop), rules.reset_width, 0.0


STRATEGY = CellStrategy(
    name="amplitude_staircase",
    summary="pulses of growing amplitude (ISPP), begun again at each change of direction",
    source="Suh et al., IEEE J. Solid-State Circuits 30:1149 (1995) (from memory)",
    knowledge="none",
    decide=decide,
    memory=2,
    amplitudes="staircase",
)
