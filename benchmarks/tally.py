"""What is known of all dies so far, in memory that doesn't grow with their number.

Dies are added in order, one at a time, whoever ran them: the same digits for any number of workers. Counts are whole
numbers and add exactly; means and scatter over dies are running moments (see statistics.DieMoments).
"""

from __future__ import annotations

import numpy as np
import numpy.typing as npt

from benchmarks.die_summary import DieSummariser, DieSummary, ErrorTotals, summarise_die
from benchmarks.error_scale import LEVEL_SPAN, ErrorScale
from benchmarks.statistics import DieMoments
from programming.job import ENERGY_PARTS, STATUS_NAMES, Job

__all__ = ["DieSummariser", "DieSummary", "ErrorTally", "Tally", "summarise_die"]

SAMPLED = 20_480  # points kept for the scatter of final against target


class ErrorTally:
    """Final error of a set of cells: moments of its sum, its square and the cells in band; the largest size [S]."""

    def __init__(self) -> None:
        """Start without any die."""
        self.mean = DieMoments()
        self.square = DieMoments()
        self.in_band = DieMoments()
        self.largest = 0.0
        self.cells_in_band = 0

    def add(self, totals: ErrorTotals) -> None:
        """Add the totals of one die."""
        self.mean.add(totals.sum, totals.cells)
        self.square.add(totals.square, totals.cells)
        self.in_band.add(totals.in_band, totals.cells)
        self.largest = max(self.largest, totals.largest)
        self.cells_in_band += totals.in_band


class LevelTally:
    """Final error per level: moments as arrays over levels; histogram (levels, bins) in half widths of the band."""

    def __init__(self, levels: int) -> None:
        """Start without any die."""
        self.cells = np.zeros(levels, dtype=np.int64)
        self.mean = DieMoments((levels,))
        self.square = DieMoments((levels,))
        self.in_band = DieMoments((levels,))
        self.histogram = np.zeros((levels, ErrorScale.bins(LEVEL_SPAN)), dtype=np.int64)

    def add(self, summary: DieSummary) -> None:
        """Add one die."""
        totals = summary.levels
        self.cells += totals.cells
        self.mean.add(totals.sum, totals.cells)
        self.square.add(totals.square, totals.cells)
        self.in_band.add(totals.in_band, totals.cells)
        self.histogram += totals.histogram


class DisturbanceTally:
    """Disturbance over all cells: moments of its square, in all and by class; the largest size; a map of the array."""

    def __init__(self, cells: int) -> None:
        """Start without any die."""
        self.square = DieMoments()
        self.class_square = DieMoments((3,))
        self.largest = 0.0
        self._size_sum = np.zeros(cells)
        self._square_sum = np.zeros(cells)

    def add(self, summary: DieSummary) -> None:
        """Add one die."""
        totals = summary.disturbance
        cells = totals.signed_S.size
        self.square.add(totals.square, cells)
        self.class_square.add(totals.class_square, np.full(3, cells))
        self.largest = max(self.largest, totals.largest)
        self._size_sum += np.abs(totals.signed_S)
        self._square_sum += totals.signed_S * totals.signed_S

    def mean_map(self, rows: int, columns: int) -> npt.NDArray[np.float64]:
        """Mean size of the disturbance of each cell over dies, (rows, columns) [S]."""
        return (self._size_sum / self.square.dies).reshape(rows, columns)

    def rms_map(self, rows: int, columns: int) -> npt.NDArray[np.float64]:
        """Root mean square disturbance of each cell over dies, (rows, columns) [S]."""
        return np.sqrt(self._square_sum / self.square.dies).reshape(rows, columns)


class Tally:
    """All dies so far of one job.

    pulses, verifies: histograms, cells by count. status: cells by index into STATUS_NAMES. energy: moments of the six
    of ENERGY_PARTS; dissipated: of their sum without the supply [J]; time: of the time per die [s], all per addressed
    cell. sample: (points, 3), target and final conductance [S] and whether truly stuck, of at most SAMPLED cells.
    """

    def __init__(self, job: Job) -> None:
        """Start without any die."""
        self.job = job
        self.scale = ErrorScale(job)
        self.dies = 0
        self.addressed = 0
        self.stuck_missed = 0
        self.stuck_false = 0
        self.status = np.zeros(len(STATUS_NAMES), dtype=np.int64)
        self.pulses = np.zeros(1, dtype=np.int64)
        self.verifies = np.zeros(1, dtype=np.int64)
        self.pulse_moments = DieMoments()
        self.verify_moments = DieMoments()
        self.all = ErrorTally()
        self.responding = ErrorTally()
        self.levels = LevelTally(self.scale.levels_S.size)
        self.error_histogram = np.zeros(ErrorScale.bins(self.scale.span), dtype=np.int64)
        self.sample = np.empty((0, 3))
        self.disturbance = DisturbanceTally(job.rows * job.columns)
        self.energy = DieMoments((len(ENERGY_PARTS),))
        self.dissipated = DieMoments()
        self.half_select_error = 0.0
        self.time = DieMoments()
        self.stress_dominates = 0  # dies
        self.score = DieMoments()
        self._last_die = -1

    def add(self, summary: DieSummary) -> None:
        """Add one die. Dies come in rising order; raises ValueError if this one doesn't."""
        if summary.die <= self._last_die:
            raise ValueError(f"die {summary.die} comes after die {self._last_die}")
        self._last_die = summary.die
        self.dies += 1
        self._add_counts(summary)
        self.all.add(summary.all)
        self.responding.add(summary.responding)
        self.levels.add(summary)
        self.disturbance.add(summary)
        room = SAMPLED - len(self.sample)
        if room > 0:
            self.sample = np.concatenate((self.sample, summary.sample[:room]))
        addressed = summary.addressed
        self.energy.add(summary.energy_J, np.full(len(ENERGY_PARTS), addressed))
        self.dissipated.add(float(summary.energy_J[:-1].sum()), addressed)
        self.half_select_error = max(self.half_select_error, summary.half_select_error)
        self.time.add(summary.time_s, addressed)
        self.stress_dominates += summary.stress_dominates
        if summary.score is not None:
            self.score.add(summary.score, 1)

    def _add_counts(self, summary: DieSummary) -> None:
        self.addressed += summary.addressed
        self.status += summary.status
        self.stuck_missed += summary.stuck_missed
        self.stuck_false += summary.stuck_false
        self.error_histogram += summary.error_histogram
        self.pulses = _added(self.pulses, summary.pulses)
        self.verifies = _added(self.verifies, summary.verifies)
        self.pulse_moments.add(_total(summary.pulses), summary.addressed)
        self.verify_moments.add(_total(summary.verifies), summary.addressed)


def _added(one: npt.NDArray[np.int64], other: npt.NDArray[np.int64]) -> npt.NDArray[np.int64]:
    """The sum of two histograms, as long as the longer one."""
    longer, shorter = (one, other) if len(one) >= len(other) else (other, one)
    result = longer.copy()
    result[: len(shorter)] += shorter
    return result


def _total(histogram: npt.NDArray[np.int64]) -> int:
    """Sum of all counts: pulses, or verifies."""
    return int((histogram * np.arange(len(histogram))).sum())
