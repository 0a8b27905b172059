"""Intervals and standard errors over dies against published formulas and worked numbers.

Wilson, J. Am. Stat. Assoc. 22:209 (1927); Student, Biometrika 6:1 (1908); Welch, Biometrika 34:28 (1947). The numbers
were computed independently of this program, from these formulas.
"""

import math

import pytest
from scipy import stats

from benchmarks.statistics import DieMoments, fraction_interval, mean_interval, t_quantile, wilson_interval


def estimate_of(values):
    """Each value as the mean of one die."""
    moments = DieMoments()
    for value in values:
        moments.add(value, 1)
    return moments.estimate()


def test_wilson_interval():
    # Wilson 1927: 3 of 1000 at 95 %.
    low, high = wilson_interval(3 / 1000, 1000, 1.959963984540054)
    assert low == pytest.approx(0.00102078388, rel=1e-8, abs=0)
    assert high == pytest.approx(0.00878301405, rel=1e-8, abs=0)


def test_wilson_interval_at_the_ends():
    # Wilson 1927, derived: with no hit the upper end is z^2 / (n + z^2); all hits mirror it.
    z = 1.959963984540054
    low, high = wilson_interval(0.0, 77, z)
    assert low == 0.0
    assert high == pytest.approx(z * z / (77 + z * z), rel=1e-14, abs=0)
    low, high = wilson_interval(1.0, 77, z)
    assert low == pytest.approx(77 / (77 + z * z), rel=1e-14, abs=0)
    assert high == 1.0


@pytest.mark.parametrize(("hits", "cells"), [(3, 1000), (7165, 65536), (0, 1000), (10, 10)])
def test_no_narrower_than_the_exact_interval_of_independent_cells_allows(hits, cells):
    """Clopper & Pearson, Biometrika 26:404 (1934): their interval covers at least 95 %; ours, with t for z, contains
    the middle of it and, on dies that agree perfectly, is at least as wide as the plain score interval."""
    exact = stats.binomtest(hits, cells).proportion_ci(method="exact")
    moments = DieMoments()
    for _die in range(5):
        moments.add(hits / 5, cells / 5)
    low, high = fraction_interval(moments.estimate())
    plain = stats.binomtest(hits, cells).proportion_ci(method="wilson")
    assert low <= plain.low <= plain.high <= high
    assert low < 0.5 * (exact.low + exact.high) < high


@pytest.mark.parametrize(("dies", "quantile"), [(2, 12.706), (3, 4.303), (10, 2.262), (32, 2.040), (121, 1.980)])
def test_quantiles_of_students_t(dies, quantile):
    # Student 1908 and the tables printed since: two-sided 95 %, dies - 1 degrees of freedom, three decimals.
    assert round(t_quantile(dies), 3) == quantile


A = (9.1, 10.3, 8.7, 11.2, 10.0, 9.5, 10.9, 9.9)
B = (9.4, 10.5, 9.1, 11.3, 10.5, 9.6, 11.3, 10.2)


def test_standard_error_of_paired_differences():
    # Student 1908: paired t of eight pairs is -5.57831938 with 7 degrees of freedom, p = 8.34698e-4.
    difference = estimate_of([a - b for a, b in zip(A, B, strict=True)])
    t = difference.value / difference.standard_error
    assert t == pytest.approx(-5.57831938, rel=1e-8, abs=0)
    assert 8 * difference.standard_error**2 == pytest.approx(0.02125, rel=1e-9, abs=0)
    low, high = mean_interval(difference)
    assert low < high < 0.0  # p < 0.05: the interval excludes zero


WELCH_ONE = (27.5, 21.0, 19.0, 23.6, 17.0, 17.9, 16.9, 20.1, 21.9, 22.6, 23.1, 19.6, 19.0, 21.7, 21.4)
WELCH_TWO = (27.1, 22.0, 20.8, 23.4, 23.4, 23.5, 25.8, 22.0, 24.8, 20.2, 21.9, 22.1, 22.9, 30.5, 24.4)


@pytest.mark.parametrize(
    ("one", "two", "t"), [(A, B, -0.684511683), (WELCH_ONE, WELCH_TWO, -2.85295487)], ids=["eight", "fifteen"]
)
def test_standard_errors_give_welchs_t(one, two, t):
    # Welch 1947: t of two independent samples with their own variances.
    first, second = estimate_of(one), estimate_of(two)
    error = math.hypot(first.standard_error, second.standard_error)
    assert (first.value - second.value) / error == pytest.approx(t, rel=1e-8, abs=0)
