"""The axes on which errors are counted: levels of the target, and error in units of the half width of the band."""

from __future__ import annotations

import math

import numpy as np
import numpy.typing as npt

from programming.job import Job

Floats = npt.NDArray[np.float64]

BINS_PER_HALF_WIDTH = 16
LEVEL_SPAN = 8  # per level, errors are resolved up to this many half widths on either side
MOST_LEVELS = 64  # a target matrix with more values than this is summarised in equal ranges
RANGES = 16


class ErrorScale:
    """Levels, band and error bins of a job; fixed before the first die, so that every die is counted alike.

    levels_S: the target levels [S], rising; for continuous targets the centres of 16 equal ranges. discrete: whether
    they are levels. absolute_S, fraction: the tolerance, one of them 0. span: half widths on either side that the error
    histogram resolves; its first and last bin hold the rest.
    """

    def __init__(self, job: Job) -> None:
        """Raises ValueError for a tolerance of zero and for targets that address no cell."""
        self.absolute_S, self.fraction = job.tolerance_S, job.tolerance_fraction
        self.levels_S, self.discrete, low, high = _levels(job)
        self._edges_S = np.linspace(low, high, RANGES + 1) if not self.discrete else None
        smallest = float(np.min(self.half_width(np.array([low, high]))))
        if not smallest >= 0.0 or self.absolute_S + self.fraction <= 0.0:
            raise ValueError("the tolerance must be above zero")
        # Conductances are never negative, so no error goes below -high; above, the last bin takes what is left.
        widest = high / smallest if smallest > 0.0 else math.inf
        self.span = int(min(max(widest, LEVEL_SPAN), 512.0)) + 1

    def half_width(self, target_S: Floats) -> Floats:
        """Half the width of the band [S] around each target [S]: the absolute tolerance or the fraction, if larger."""
        return np.maximum(self.absolute_S, self.fraction * np.abs(target_S))

    def level_of(self, target_S: Floats) -> npt.NDArray[np.int64]:
        """Index of the level (or range) of each target [S]."""
        if self._edges_S is not None:
            return np.searchsorted(self._edges_S[1:-1], target_S, side="right")
        middles = 0.5 * (self.levels_S[1:] + self.levels_S[:-1])
        return np.searchsorted(middles, target_S)

    def scaled(self, error_S: Floats, target_S: Floats) -> Floats:
        """Errors in half widths of the band; infinite or 0 where it has no width (a fraction of a target of zero)."""
        half = np.maximum(self.half_width(target_S), np.finfo(np.float64).tiny)
        with np.errstate(over="ignore"):
            return error_S / half

    @staticmethod
    def bin_of(scaled: Floats, span: int) -> npt.NDArray[np.int64]:
        """Bin of each scaled error: 0 below -span, BINS_PER_HALF_WIDTH bins per half width, the last bin above span."""
        most = span * BINS_PER_HALF_WIDTH
        return np.clip(np.floor(scaled * BINS_PER_HALF_WIDTH), -most - 1, most).astype(np.int64) + (most + 1)

    @staticmethod
    def bins(span: int) -> int:
        """Number of bins of `bin_of`."""
        return 2 * span * BINS_PER_HALF_WIDTH + 2

    @property
    def band(self) -> float | None:
        """Half the width of the band where it is the same for all targets [S], else None."""
        ends = self.half_width(self.levels_S)
        return float(ends[0]) if np.all(ends == ends[0]) else None


def _levels(job: Job) -> tuple[Floats, bool, float, float]:
    """Levels, whether they are discrete, and the lowest and highest target [S]."""
    targets = job.targets
    low, high = targets.low_S, targets.high_S
    if targets.kind != "uniform":
        values = targets.levels_S if targets.matrix_S is None else targets.matrix_S[~np.isnan(targets.matrix_S)]
        levels = np.unique(np.asarray(values, dtype=np.float64))
        if levels.size == 0:
            raise ValueError("the targets address no cell")
        low, high = float(levels[0]), float(levels[-1])
        if levels.size <= MOST_LEVELS:
            return levels, True, low, high
    edges = np.linspace(low, high, RANGES + 1)
    return 0.5 * (edges[1:] + edges[:-1]), False, low, high
