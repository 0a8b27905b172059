"""The pulses a strategy may give, as a grid: one ledger bin for each amplitude and width.

Pulse generators have discrete steps. The pulse itself is rounded to the generator's resolution, never only its entry in
the ledger.
"""

from __future__ import annotations

import numpy as np
import numpy.typing as npt

from programming.job import PulseTrain
from programming.strategy_contract import CellStrategy

Floats = npt.NDArray[np.float64]


def staircase_values(start: float, step: float, stop: float) -> Floats:
    """start, start + step, ... and stop itself as the last value; just [start] where the step is 0."""
    if step <= 0.0 or stop <= start:
        return np.array([start])
    whole_steps = int(np.floor((stop - start) / step * (1.0 + 1e-12)))
    values = start + step * np.arange(whole_steps + 1)
    if stop - values[-1] > 1e-9 * step:
        values = np.append(values, stop)
    return np.minimum(values, stop)


def amplitude_grid(train: PulseTrain, strategy: CellStrategy, resolution: float) -> tuple[Floats, float]:
    """Amplitudes [V] the strategy can ask for in one direction, and the spacing [V] by which they are looked up."""
    spacing = {"one": 0.0, "staircase": train.step, "any": resolution}[strategy.amplitudes]
    values = staircase_values(train.start, spacing, train.stop)
    if resolution > 0.0:
        values = np.round(values / resolution) * resolution
    return values, spacing


def width_grid(train: PulseTrain, strategy: CellStrategy) -> tuple[Floats, float]:
    """Widths [s] the strategy can ask for in one direction, and the spacing [s] by which they are looked up."""
    spacing = train.width_step if strategy.widths == "staircase" else 0.0
    return staircase_values(train.width, spacing, train.width_stop), spacing
