"""From the outcome of one die to the few numbers that are kept of it. Runs where the die ran, in a worker thread."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from benchmarks.error_scale import LEVEL_SPAN, ErrorScale
from device_models.faults import HEALTHY
from programming.job import STATUS_NAMES, STUCK, DieOutcome, Job

Floats = npt.NDArray[np.float64]
Counts = npt.NDArray[np.int64]
Score = Callable[[Floats], float]

SAMPLED_PER_DIE = 4096  # most points a die offers for the scatter of final against target


@dataclass(frozen=True)
class ErrorTotals:
    """Final error over a set of cells: number, sum [S], sum of squares [S^2], largest size [S], number in band."""

    cells: int
    sum: float
    square: float
    largest: float
    in_band: int


@dataclass(frozen=True)
class LevelTotals:
    """The same per level, arrays of length levels; histogram (levels, bins): errors in half widths of the band."""

    cells: Counts
    sum: Floats
    square: Floats
    in_band: Counts
    histogram: Counts


@dataclass(frozen=True)
class DisturbanceTotals:
    """Disturbance over all cells of the array, addressed or not.

    signed_S: per cell, row-major [S]. square: sum of squares [S^2]; class_square: of the shares of same row, same
    column and rest [S^2]; largest: largest size [S].
    """

    signed_S: Floats
    square: float
    class_square: Floats
    largest: float


@dataclass(frozen=True)
class DieSummary:
    """What is kept of one die.

    status: cells by index into STATUS_NAMES; stuck_missed: truly stuck, addressed, not called stuck; stuck_false:
    healthy, called stuck. pulses, verifies: histograms, cells by count, addressed cells. all, responding: final error
    over all addressed cells and over those not truly stuck. error_histogram: see ErrorScale.bin_of. sample: (points,
    3), target and final conductance [S] and whether truly stuck (0 or 1), of cells spread evenly over the die.
    energy_J: the six of ENERGY_PARTS, for the die [J]. score: of the final array, None without a score.
    """

    die: int
    addressed: int
    status: Counts
    stuck_missed: int
    stuck_false: int
    pulses: Counts
    verifies: Counts
    all: ErrorTotals
    responding: ErrorTotals
    levels: LevelTotals
    error_histogram: Counts
    sample: Floats
    disturbance: DisturbanceTotals
    energy_J: Floats
    half_select_error: float
    time_s: float
    stress_dominates: bool
    score: float | None


class DieSummariser:
    """Callable DieOutcome -> DieSummary for one job; what depends on the job alone is prepared once.

    The summary owns its memory: the arrays of the outcome may be overwritten by the next die.

    score: function of the final conductances (rows, columns) [S], for instance the accuracy of a classifier.
    Raises ValueError for an outcome that is not finite or that addresses no cell.
    """

    def __init__(self, job: Job, score: Score | None = None) -> None:
        """Prepare the levels and bins of the job."""
        self._job = job
        self._score = score
        self._scale = ErrorScale(job)

    def __call__(self, outcome: DieOutcome) -> DieSummary:
        """Summarise one die."""
        chosen = _addressed(outcome)
        target, final = outcome.target_S[chosen], outcome.final_S[chosen]
        error = final - target
        scaled = self._scale.scaled(error, target)
        in_band, status = outcome.in_band[chosen], outcome.status[chosen]
        healthy = outcome.fault[chosen] == HEALTHY
        stride = -(-target.size // SAMPLED_PER_DIE)
        return DieSummary(
            die=outcome.die,
            addressed=target.size,
            status=np.bincount(status, minlength=len(STATUS_NAMES)),
            stuck_missed=int(np.count_nonzero(~healthy & (status != STUCK))),
            stuck_false=int(np.count_nonzero(healthy & (status == STUCK))),
            pulses=np.bincount(outcome.pulses[chosen]),
            verifies=np.bincount(outcome.verifies[chosen]),
            all=_error_totals(error, in_band),
            responding=_error_totals(error[healthy], in_band[healthy]),
            levels=self._level_totals(target, error, scaled, in_band),
            error_histogram=self._histogram(scaled),
            sample=np.column_stack((target[::stride], final[::stride], ~healthy[::stride])),
            disturbance=_disturbance_totals(outcome),
            energy_J=outcome.energy_J.copy(),
            half_select_error=outcome.half_select_error,
            time_s=outcome.time_s,
            stress_dominates=outcome.stress_dominates,
            score=self._scored(outcome),
        )

    def _histogram(self, scaled: Floats) -> Counts:
        span = self._scale.span
        return np.bincount(ErrorScale.bin_of(scaled, span), minlength=ErrorScale.bins(span))

    def _level_totals(self, target: Floats, error: Floats, scaled: Floats, in_band: npt.NDArray[np.bool_]) -> LevelTotals:
        level, levels = self._scale.level_of(target), self._scale.levels_S.size
        bins = ErrorScale.bins(LEVEL_SPAN)
        flat = np.bincount(level * bins + ErrorScale.bin_of(scaled, LEVEL_SPAN), minlength=levels * bins)
        return LevelTotals(
            cells=np.bincount(level, minlength=levels),
            sum=_weighed(level, error, levels),
            square=_weighed(level, error * error, levels),
            in_band=np.bincount(level[in_band], minlength=levels),
            histogram=flat.reshape(levels, bins),
        )

    def _scored(self, outcome: DieOutcome) -> float | None:
        if self._score is None:
            return None
        score = float(self._score(outcome.final_S.reshape(self._job.rows, self._job.columns)))
        if not np.isfinite(score):
            raise ValueError(f"die {outcome.die}: the score is {score}")
        return score


def summarise_die(outcome: DieOutcome, job: Job, score: Score | None = None) -> DieSummary:
    """Summarise one die; for many dies of one job make a DieSummariser once."""
    return DieSummariser(job, score)(outcome)


def _addressed(outcome: DieOutcome) -> npt.NDArray[np.bool_] | slice:
    """Which cells are addressed; raises ValueError where the outcome is not finite or there is no such cell."""
    missing = np.isnan(outcome.target_S)
    chosen = ~missing if missing.any() else slice(None)
    if missing.all():
        raise ValueError(f"die {outcome.die}: no cell is addressed")
    for name, values in (
        ("final conductance", outcome.final_S[chosen]),
        ("disturbance", outcome.disturbance_S),
        ("energy", outcome.energy_J),
        ("time", outcome.time_s),
    ):
        if not np.isfinite(values).all():
            raise ValueError(f"die {outcome.die}: {name} is not a finite number")
    return chosen


def _weighed(level: Counts, weights: Floats, levels: int) -> Floats:
    return np.asarray(np.bincount(level, weights=weights, minlength=levels), dtype=np.float64)


def _error_totals(error: Floats, in_band: npt.NDArray[np.bool_]) -> ErrorTotals:
    return ErrorTotals(
        cells=error.size,
        sum=float(error.sum()),
        square=float((error * error).sum()),
        largest=float(np.abs(error).max(initial=0.0)),
        in_band=int(np.count_nonzero(in_band)),
    )


def _disturbance_totals(outcome: DieOutcome) -> DisturbanceTotals:
    signed = outcome.disturbance_S.copy()
    square = signed * signed
    return DisturbanceTotals(
        signed_S=signed,
        square=float(square.sum()),
        class_square=np.array([float((square * share * share).sum()) for share in outcome.dose_share.T]),
        largest=float(np.abs(signed).max()),
    )
