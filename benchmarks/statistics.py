"""Intervals for numbers averaged over dies, the die being the unit: cells of one die share lines, stress and a reader.

Every quantity is a ratio of totals, R = sum over dies of y / sum over dies of n (pulses over cells, squared error over
cells, cells in band over cells). Its standard error comes from the residuals y - R n of whole dies, the linearised
ratio estimator (Cochran, Sampling Techniques, 3rd ed., 1977, eq. 6.9); with the same n on every die it is the standard
error of the mean of die means. Quantiles are Student's t with dies - 1 degrees of freedom (Student, Biometrika 6:1,
1908).
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

Interval = tuple[float, float]
CONFIDENCE = 0.95


@dataclass(frozen=True)
class RatioEstimate:
    """A ratio of totals over dies.

    value: the ratio, None where the counts sum to zero. standard_error: None with a single die or without a value.
    dies: number of dies. count: sum of the counts over dies.
    """

    value: float | None
    standard_error: float | None
    dies: int
    count: float


class DieMoments:
    """Running mean and co-moments, over dies, of totals y and counts n; adding dies in order gives the same digits
    always.

    Updates after Welford, Technometrics 4:419 (1962), so that a small scatter about a large mean keeps its digits.
    shape: one number (the default) or an array of quantities that are updated together.
    """

    def __init__(self, shape: tuple[int, ...] = ()) -> None:
        """Start without any die."""
        self.dies = 0
        self.total = np.zeros(shape)
        self.count = np.zeros(shape)
        self._total_total = np.zeros(shape)
        self._total_count = np.zeros(shape)
        self._count_count = np.zeros(shape)

    def add(self, total: npt.ArrayLike, count: npt.ArrayLike) -> None:
        """Add one die: its totals and the counts they are spread over, each of the shape given at the start."""
        self.dies += 1
        total, count = np.asarray(total, dtype=np.float64), np.asarray(count, dtype=np.float64)
        total_step, count_step = total - self.total, count - self.count
        self.total = self.total + total_step / self.dies
        self.count = self.count + count_step / self.dies
        total_rest = total - self.total
        self._total_total = self._total_total + total_step * total_rest
        self._total_count = self._total_count + count_step * total_rest
        self._count_count = self._count_count + count_step * (count - self.count)

    def estimate(self, index: int | tuple[()] = ()) -> RatioEstimate:
        """The ratio of totals with its standard error over dies; `index` picks one quantity of an array."""
        total, count = float(self.total[index]), float(self.count[index])
        if count == 0.0:
            return RatioEstimate(None, None, self.dies, 0.0)
        ratio = total / count
        error = None
        if self.dies > 1:
            residual = self._total_total[index] - 2.0 * ratio * self._total_count[index]
            residual = max(0.0, float(residual + ratio * ratio * self._count_count[index]))
            error = math.sqrt(residual / (self.dies * (self.dies - 1))) / abs(count)
        return RatioEstimate(ratio, error, self.dies, count * self.dies)


def t_quantile(dies: int, confidence: float = CONFIDENCE) -> float:
    """Two-sided quantile of Student's t for a mean over that many dies (at least two)."""
    from scipy.special import stdtrit  # scipy.stats would take a second to import

    return float(stdtrit(dies - 1, 0.5 + 0.5 * confidence))


def mean_interval(estimate: RatioEstimate) -> Interval | None:
    """The t interval of a ratio of totals; None with a single die."""
    if estimate.value is None or estimate.standard_error is None:
        return None
    half = t_quantile(estimate.dies) * estimate.standard_error
    return estimate.value - half, estimate.value + half


def rms_interval(mean_square: RatioEstimate) -> Interval | None:
    """Interval of the root of a mean square, by the delta method on its logarithm; None with a single die.

    d ln(rms) = d(ms) / (2 ms). The logarithm keeps the interval positive and follows the skew that die mean squares
    have; a bootstrap would need every die kept, and with few dies covers less well. Source of the method: Casella &
    Berger, Statistical Inference, 2nd ed. (2002), theorem 5.5.24. Zero in every cell of every die gives (0, 0).
    """
    if mean_square.value is None or mean_square.standard_error is None:
        return None
    if mean_square.value == 0.0:
        return 0.0, 0.0
    rms = math.sqrt(mean_square.value)
    factor = math.exp(t_quantile(mean_square.dies) * mean_square.standard_error / (2.0 * mean_square.value))
    return rms / factor, rms * factor


def wilson_interval(fraction: float, trials: float, quantile: float) -> Interval:
    """Score interval of a fraction: Wilson, J. Am. Stat. Assoc. 22:209 (1927). It stays in 0..1 and has a width."""
    spread = quantile * quantile / trials
    centre = (fraction + 0.5 * spread) / (1.0 + spread)
    half = math.sqrt(fraction * (1.0 - fraction) * spread + 0.25 * spread * spread) / (1.0 + spread)
    # The fraction itself always lies within; rounding must not put it a hair outside.
    return max(0.0, min(fraction, centre - half)), min(1.0, max(fraction, centre + half))


def fraction_interval(estimate: RatioEstimate, variance_floor: float | None = None) -> Interval | None:
    """Interval of a fraction of cells: Wilson's, with the effective number of cells; None with a single die.

    The effective number is p (1 - p) over the variance of p between dies, that is cells over the design effect (Kish,
    Survey Sampling, 1965, sec. 8.2), used with the t quantile (Korn & Graubard, Survey Methodology 24:193, 1998). The
    design effect is floored at 1, so that few dies that happen to agree promise no more than independent cells would;
    `variance_floor` replaces that floor on the variance of p. At exactly 0 or 1 nothing is known of the scatter between
    dies, and cells count as independent.
    """
    if estimate.value is None or estimate.standard_error is None:
        return None
    binomial = estimate.value * (1.0 - estimate.value)
    floor = binomial / estimate.count if variance_floor is None else variance_floor
    variance = max(estimate.standard_error**2, floor)
    trials = binomial / variance if binomial > 0.0 else estimate.count
    return wilson_interval(estimate.value, trials, t_quantile(estimate.dies))


def score_interval(estimate: RatioEstimate, samples: int) -> Interval | None:
    """Interval of a score that each die reaches on one and the same set of `samples` (the accuracy of a classifier).

    The set is fixed, so a die's score scatters less than a binomial of `samples`; its variance is floored at that of
    rounding to whole samples, 1 / (12 samples^2). estimate: totals are fractions, counts are 1 per die.
    """
    floor = 1.0 / (12.0 * samples * samples * estimate.dies)
    per_sample = RatioEstimate(estimate.value, estimate.standard_error, estimate.dies, estimate.count * samples)
    return fraction_interval(per_sample, floor)


def count_quantile(histogram: npt.NDArray[np.int64], numerator: int, denominator: int) -> int:
    """Smallest count c with at least numerator/denominator of all cells at or below c, exactly.

    histogram[c] is the number of cells with count c. This is the inverse of the empirical distribution, definition 1 of
    Hyndman & Fan, Am. Stat. 50:361 (1996); ranks are whole numbers, so no rounding decides.
    """
    cells = int(histogram.sum())
    rank = -(-cells * numerator // denominator)
    return int(np.searchsorted(np.cumsum(histogram), max(rank, 1)))
