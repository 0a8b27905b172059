"""Intervals over dies: their arithmetic against two-pass formulas, and their coverage by seeded simulation."""

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from scipy import stats

from benchmarks.statistics import (
    DieMoments,
    RatioEstimate,
    count_quantile,
    fraction_interval,
    mean_interval,
    rms_interval,
    score_interval,
    t_quantile,
    wilson_interval,
)

REPLICATES = 4000


def moments_of(totals, counts):
    """Moments of dies along the first axis; the second axis, if any, holds independent experiments."""
    moments = DieMoments(np.shape(totals[0]))
    for total, count in zip(totals, counts, strict=True):
        moments.add(total, count)
    return moments


def covered(moments, interval, truth):
    """How many of the independent experiments have an interval around the truth."""
    hits = 0
    for index in range(moments.total.size):
        low, high = interval(moments.estimate(index))
        hits += low <= truth <= high
    return hits


def assert_nominal(hits):
    """The number of hits is within the 99.9 % range of a binomial with the nominal 95 %."""
    low, high = stats.binom.interval(0.999, REPLICATES, 0.95)
    assert low <= hits <= high, hits / REPLICATES


# Arithmetic


def test_equal_counts_give_the_t_interval_of_die_means():
    rng = np.random.default_rng(1)
    means = rng.normal(12.0, 0.8, 9)
    low, high = mean_interval(moments_of(4096 * means, [4096] * 9).estimate())
    expected = stats.t.interval(0.95, 8, means.mean(), stats.sem(means))
    assert (low, high) == pytest.approx(expected, rel=1e-12, abs=0)


def test_unequal_counts_give_the_linearised_ratio():
    rng = np.random.default_rng(2)
    counts = rng.integers(50, 150, 12)
    totals = 3.0 * counts + rng.normal(0.0, 20.0, 12)
    estimate = moments_of(totals, counts).estimate()
    ratio = totals.sum() / counts.sum()
    residual = totals - ratio * counts
    error = np.sqrt(12 / 11 * (residual**2).sum()) / counts.sum()
    assert estimate.value == pytest.approx(ratio, rel=1e-13, abs=0)
    assert estimate.standard_error == pytest.approx(error, rel=1e-12, abs=0)
    assert estimate.count == counts.sum()


def test_small_scatter_about_a_large_mean_keeps_its_digits():
    """Summing squares would lose the scatter: it is 1e-9 of the mean, its square 1e-18."""
    steps = np.array([3.0, -1.0, 4.0, 1.0, -5.0, 9.0, 2.0, -6.0])
    estimate = moments_of(2e-5 * (1.0 + 1e-9 * steps), [1] * 8).estimate()
    assert estimate.standard_error == pytest.approx(2e-14 * stats.sem(steps), rel=1e-6, abs=0)


def test_dies_that_all_agree_have_no_scatter():
    estimate = moments_of([0.3 * 7] * 5, [7] * 5).estimate()
    assert estimate.standard_error == 0.0
    assert mean_interval(estimate) == (estimate.value, estimate.value)


def test_quantities_updated_together_equal_those_updated_alone():
    rng = np.random.default_rng(3)
    totals, counts = rng.normal(5.0, 1.0, (6, 4)), rng.integers(1, 9, (6, 4))
    together = moments_of(totals, counts)
    for index in range(4):
        assert together.estimate(index) == moments_of(totals[:, index], counts[:, index]).estimate()


@pytest.mark.parametrize("interval", [mean_interval, rms_interval, fraction_interval])
def test_no_interval_from_a_single_die_or_without_cells(interval):
    assert interval(moments_of([3.0], [10]).estimate()) is None
    nothing = moments_of([0.0, 0.0], [0, 0]).estimate()
    assert nothing.value is None
    assert interval(nothing) is None


def test_rms_interval_is_positive_and_zero_only_for_zero():
    assert rms_interval(moments_of([0.0, 0.0, 0.0], [5, 5, 5]).estimate()) == (0.0, 0.0)
    low, high = rms_interval(moments_of([0.0, 8e-12], [2, 2]).estimate())
    assert 0.0 < low < np.sqrt(2e-12) < high
    assert low * high == pytest.approx(2e-12, rel=1e-12, abs=0)


@pytest.mark.parametrize("dies", [2, 3, 32])
@pytest.mark.parametrize("fraction", [0.0, 0.01, 0.5, 0.99, 1.0])
def test_fraction_intervals_stay_inside_and_have_a_width(dies, fraction):
    estimate = moments_of([fraction * 200] * dies, [200] * dies).estimate()
    for low, high in (fraction_interval(estimate), score_interval(estimate, 200)):
        assert 0.0 <= low < high <= 1.0
        assert low <= estimate.value <= high


def test_design_effect_widens_and_is_floored_at_one():
    agree = RatioEstimate(0.9, 0.0, 8, 8000.0)
    scatter = RatioEstimate(0.9, 0.02, 8, 8000.0)
    t = t_quantile(8)
    assert fraction_interval(agree) == wilson_interval(0.9, 8000.0, t)
    assert fraction_interval(scatter) == pytest.approx(wilson_interval(0.9, 0.09 / 0.02**2, t), rel=1e-12, abs=0)


# Coverage


def test_coverage_of_the_mean():
    rng = np.random.default_rng(11)
    totals = 100.0 * rng.normal(12.0, 1.5, (6, REPLICATES))
    assert_nominal(covered(moments_of(totals, np.full(totals.shape, 100)), mean_interval, 12.0))


def test_coverage_of_a_ratio_with_scattered_counts():
    """Cells without the stuck ones: their number differs from die to die."""
    rng = np.random.default_rng(12)
    counts = rng.binomial(400, 0.9, (12, REPLICATES))
    totals = counts * 5.0 + np.sqrt(counts) * rng.normal(0.0, 1.0, counts.shape)
    assert_nominal(covered(moments_of(totals, counts), mean_interval, 5.0))


@pytest.mark.parametrize("dies", [4, 32])
def test_coverage_of_the_rms(dies):
    """Dies with their own rms (lognormal, 15 %) over 1000 cells each, normal errors within a die."""
    rng = np.random.default_rng(13)
    own = np.exp(0.15 * rng.standard_normal((dies, REPLICATES)))
    totals = own**2 * rng.chisquare(1000, own.shape)
    truth = np.exp(0.15**2)
    assert_nominal(covered(moments_of(totals, np.full(totals.shape, 1000)), rms_interval, truth))


@pytest.mark.parametrize("dies", [8, 32])
def test_coverage_of_a_fraction_of_cells_that_depend_on_their_die(dies):
    rng = np.random.default_rng(14)
    own = rng.beta(60.0, 2.5, (dies, REPLICATES))
    totals = rng.binomial(1000, own)
    moments, truth = moments_of(totals, np.full(totals.shape, 1000)), 60.0 / 62.5
    assert_nominal(covered(moments, fraction_interval, truth))
    # The test can tell: intervals that take cells for independent miss most of the time.
    naive = covered(moments, lambda e: wilson_interval(e.value, e.count, 1.96), truth)
    assert naive < 0.7 * REPLICATES


@pytest.mark.parametrize("dies", [2, 8, 32])
def test_coverage_of_a_fraction_of_independent_cells(dies):
    """With the design effect floored at 1 the interval may cover more than it says, never less."""
    rng = np.random.default_rng(15)
    totals = rng.binomial(200, 0.97, (dies, REPLICATES))
    hits = covered(moments_of(totals, np.full(totals.shape, 200)), fraction_interval, 0.97)
    assert hits >= stats.binom.ppf(0.0005, REPLICATES, 0.95)
    if dies == 32:
        assert hits < 0.985 * REPLICATES


def test_coverage_of_a_score_on_one_set_of_samples():
    rng = np.random.default_rng(16)
    right = np.round(rng.normal(700.0, 3.0, (16, REPLICATES)))
    assert_nominal(covered(moments_of(right / 797, np.ones(right.shape)), lambda e: score_interval(e, 797), 700 / 797))


# Counts


@given(st.lists(st.integers(0, 40), min_size=1, max_size=60), st.sampled_from([(1, 2), (99, 100), (999, 1000), (1, 1)]))
def test_quantiles_of_counts_are_those_of_the_sorted_list(counts, rank):
    numerator, denominator = rank
    expected = sorted(counts)[-(-len(counts) * numerator // denominator) - 1]
    assert count_quantile(np.bincount(counts), numerator, denominator) == expected
