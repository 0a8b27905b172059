"""What the two staircases share: which way the cell must go, and how far up the stairs this run of pulses is."""

from __future__ import annotations

from device_models.compiled import compiled
from programming.strategy_contract import RESET, SET


@compiled
def next_step(error, memory):
    """(direction, step) of the next pulse for a reading off by `error` [S]; a change of direction begins again at step 0.

    memory[0]: direction of the run; memory[1]: pulses given in it.
    """
    direction = SET if error < 0.0 else RESET
    if direction != memory[0]:
        memory[0] = direction
        memory[1] = 0.0
    step = memory[1]
    memory[1] += 1.0
    return direction, step
