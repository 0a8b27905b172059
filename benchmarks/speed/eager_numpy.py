"""The plain alternative: NumPy vectors that step every half-selected cell at every pulse, at once.

The same kinetics, noise and verify as the demo cell, with per-cell thresholds and rates. Only the half-selected cells are
touched under V/2, all cells under V/3.
"""

from __future__ import annotations

import time
from typing import Any

import numpy as np
import numpy.typing as npt

Floats = npt.NDArray[np.float64]


class EagerArray:
    """A die of demo cells in conductance fraction u, stepped eagerly."""

    def __init__(self, size: int, seed: int) -> None:
        """Draw size x size cells."""
        rng = np.random.default_rng(seed)
        self.rng = rng
        self.u = np.full((size, size), 0.02)
        self.v_on = 1.05 * (1 + 0.12 * np.clip(rng.standard_normal((size, size)), -3, 3))
        self.v_off = 1.05 * (1 + 0.12 * np.clip(rng.standard_normal((size, size)), -3, 3))
        self.k_on = 3.9 * rng.lognormal(-0.02, 0.198, (size, size))
        self.k_off = 3.9 * rng.lognormal(-0.02, 0.198, (size, size))

    def step(self, where: Any, voltage: float) -> None:
        """One pulse of that voltage (positive: SET) on a slice of the array."""
        threshold, speed = (self.v_on, self.k_on) if voltage > 0 else (self.v_off, self.k_off)
        over = np.maximum(abs(voltage) / threshold[where] - 1.0, 0.0)
        fade = np.exp(-speed[where] * over * over * over)
        u = self.u[where]
        self.u[where] = 1.0 - (1.0 - u) * fade if voltage > 0 else u * fade

    def pulse_and_verify(self, row: int, column: int, voltage: float, third: bool) -> float:
        """Pulse one cell with all its stress, then read it."""
        own = self.u[row, column]
        if third:
            row_own, column_own = self.u[row].copy(), self.u[:, column].copy()
            self.step((slice(None), slice(None)), -voltage / 3)
            self.u[row], self.u[:, column] = row_own, column_own
        fraction = 3 if third else 2
        self.step((row, slice(None)), voltage / fraction)
        self.step((slice(None), column), voltage / fraction)
        self.u[row, column] = own
        self.step((slice(row, row + 1), slice(column, column + 1)), voltage * self.rng.lognormal(-0.02, 0.198))
        g = 1e-5 + 9e-5 * self.u[row, column]
        return float(g + np.sqrt(g * (2e-12 + 2.5e-5 * g)) * self.rng.standard_normal())


def nanoseconds_per_pulse(size: int, third: bool, pulses: int) -> float:
    """Time per pulse with its verify [ns]."""
    array = EagerArray(size, 1)
    start = time.perf_counter()
    for i in range(pulses):
        array.pulse_and_verify(i // 32 % size, i // 32 // size, 0.8 + 0.02 * (i % 32), third)
    return (time.perf_counter() - start) / pulses * 1e9
