"""The pulses a strategy may give, as a grid: one ledger bin for each amplitude and width.

Pulse generators have discrete steps. The pulse itself is rounded to the generator's resolution, never only its entry in
the ledger.
"""

from __future__ import annotations

import math
from typing import Any

import numpy as np
import numpy.typing as npt

from programming.job import Job, PulseTrain
from programming.strategy_contract import CellStrategy

Floats = npt.NDArray[np.float64]
Steps = tuple[float, float, float]  # first value, last value, spacing; before any rounding


def staircase_values(start: float, step: float, stop: float) -> Floats:
    """start, start + step, ... and stop itself as the last value; just [start] where the step is 0."""
    if step <= 0.0 or stop <= start:
        return np.array([start])
    whole_steps = int(np.floor((stop - start) / step * (1.0 + 1e-12)))
    values = start + step * np.arange(whole_steps + 1)
    if stop - values[-1] > 1e-9 * step:
        values = np.append(values, stop)
    return np.asarray(np.minimum(values, stop))


def amplitude_grid(train: PulseTrain, strategy: CellStrategy, resolution: float) -> tuple[Floats, Steps]:
    """Amplitudes [V] the generator gives when the strategy goes through its grid, and the steps of that grid."""
    spacing = {"one": 0.0, "staircase": train.step, "any": resolution}[strategy.amplitudes]
    values = staircase_values(train.start, spacing, train.stop)
    steps = (float(values[0]), float(values[-1]), spacing)
    if resolution > 0.0:
        values = np.round(values / resolution) * resolution
    return values, steps


def width_grid(train: PulseTrain, strategy: CellStrategy) -> tuple[Floats, Steps]:
    """Widths [s] the strategy can ask for in one direction, and the steps of their grid."""
    spacing = train.width_step if strategy.widths == "staircase" else 0.0
    values = staircase_values(train.width, spacing, train.width_stop)
    return values, (float(values[0]), float(values[-1]), spacing)


def class_fractions(job: Job) -> dict[str, float]:
    """Fraction of the selected voltage on each class of cell; sizes that differ by rounding only are made equal."""
    row, column, rest = job.bias.same_row, job.bias.same_column, job.bias.rest
    column = row if math.isclose(column, row, rel_tol=1e-12) else column
    rest = math.copysign(row, rest) if math.isclose(abs(rest), row, rel_tol=1e-12) else rest
    return {"row_fraction": row, "column_fraction": column, "rest_fraction": rest}


def pulse_fields(job: Job) -> dict[str, Any]:
    """The fields of a plan that describe the pulses, and (more than a plan holds) the voltage of every ledger bin [V]."""
    amplitudes, widths, amplitude_steps, width_steps = [], [], [], []
    for train in (job.set, job.reset):
        values, steps = amplitude_grid(train, job.strategy, job.resolution)
        times, time_steps = width_grid(train, job.strategy)
        amplitudes.append(values)
        widths.append(times)
        amplitude_steps.append(steps)
        width_steps.append(time_steps)
    fractions = class_fractions(job)
    sign = np.array([1.0, -1.0]) * job.cell.model.set_polarity
    bins = [a.size * w.size for a, w in zip(amplitudes, widths, strict=True)]
    return {
        **fractions,
        "word_fraction": job.bias.word,
        "bit_fraction": job.bias.bit,
        "overhead": np.array([2.0 * train.rise + train.dead_time for train in (job.set, job.reset)]),
        "amplitudes": np.concatenate(amplitudes),
        "widths": np.concatenate(widths),
        "amplitude_first": np.array([0, amplitudes[0].size, amplitudes[0].size + amplitudes[1].size]),
        "width_first": np.array([0, widths[0].size, widths[0].size + widths[1].size]),
        "bin_first": np.array([0, bins[0], bins[0] + bins[1]]),
        "amplitude_steps": np.array(amplitude_steps),
        "width_steps": np.array(width_steps),
        "cell_sign": sign,
        "bin_voltage": np.concatenate([np.repeat(a * s, w.size) for a, w, s in zip(amplitudes, widths, sign, strict=True)]),
        "bin_amplitude": np.concatenate(
            [
                first + np.repeat(np.arange(a.size), w.size)
                for first, a, w in zip((0, amplitudes[0].size), amplitudes, widths, strict=True)
            ]
        ),
        "mirrored": int(
            fractions["rest_fraction"] == -fractions["row_fraction"] and np.array_equal(amplitudes[0], amplitudes[1])
        ),
        "bin_width": np.concatenate([np.tile(w, a.size) for a, w in zip(amplitudes, widths, strict=True)]),
    }
