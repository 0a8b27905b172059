"""Incremental-step pulse programming in amplitude, with verify.

Verify; in the band: done; below it SET, above it RESET. The first pulse of a run in one direction has that direction's
`start`, each further one adds `step` up to `stop`; a change of direction begins again at `start`.
Source of the principle: Suh et al., IEEE J. Solid-State Circuits 30:1149 (1995) (from memory).
"""

from __future__ import annotations

from device_models.compiled import compiled
from programming.strategy_contract import ACCEPT, RESET, SET, CellStrategy


@compiled
def decide(target, tolerance, reading, pulses, memory, rules):
    """memory[0]: direction of the run; memory[1]: pulses given in it."""
    error = reading - target
    if abs(error) <= tolerance:
        return ACCEPT, 0.0, 0.0, 0.0
    direction = SET if error < 0.0 else RESET
    if direction != memory[0]:
        memory[0] = direction
        memory[1] = 0.0
    step = memory[1]
    memory[1] += 1.0
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
