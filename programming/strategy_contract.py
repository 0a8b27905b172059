"""The contract of a cell strategy: given what a controller can know, propose the next pulse or stop.

A strategy is one compiled scalar function. It never sees the true state of a cell, only readings; it never touches a
device. The loop owns counts, energy, stuck detection and status.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from typing import Any, Literal, NamedTuple

# What `decide` may answer. RESET lowers the conductance, SET raises it, READ asks for one more reading without a pulse.
RESET, ACCEPT, SET, GIVE_UP, READ = -1, 0, 1, 2, 3


class Rules(NamedTuple):
    """What the controller is told before it starts: the scenario's pulses (magnitudes, volts and seconds) and limits.

    low, high: range of the targets [S]. read_noise: standard deviation of one reading at mid-range [S], which a
    controller knows from its data sheet.
    """

    set_start: float
    set_step: float
    set_stop: float
    set_width: float
    set_width_step: float
    set_width_stop: float
    reset_start: float
    reset_step: float
    reset_stop: float
    reset_width: float
    reset_width_step: float
    reset_width_stop: float
    low: float
    high: float
    max_pulses: float
    read_noise: float


@dataclass(frozen=True)
class CellStrategy:
    """One way to write a cell.

    decide(target, tolerance, reading, pulses, memory, rules) -> (action, amplitude, width, gate)
        target, tolerance, reading [S]; pulses: number given in this pass; memory: float64 array of `memory` places,
        zero at the start of each visit, the strategy's own; rules: Rules. The answer is one of the actions above, and
        for SET and RESET a magnitude [V] and width [s], which the loop rounds to what the generator can do; gate [V]
        is for cells with a transistor (0.0 without). `reading` is NaN if the strategy does not verify.
    amplitudes: "one" (only the train's `start`), "staircase" (start, start + step, ... stop) or "any" (every multiple of
        the generator's resolution from start to stop). widths: "one" (`width`) or "staircase" (width, width + width_step,
        ... width_stop).
    verifies: a reading is taken before the first and after each pulse.
    knowledge: one line saying what the strategy must know beforehand.
    """

    name: str
    summary: str
    source: str
    knowledge: str
    decide: Callable[..., Any]
    memory: int = 0
    amplitudes: Literal["one", "staircase", "any"] = "one"
    widths: Literal["one", "staircase"] = "one"
    verifies: bool = True
