"""Stuck cells: injected counts against the binomial law, exact intervals, redundancy.

Fractions: a published 4 Mb HfO2 test chip, SA0 1.75 % and SA1 9.04 % (from memory; which of the two means low
resistance depends on the author: here the first is stuck low in conductance). Binomial law and Clopper-Pearson
intervals: common practice.
"""

import numpy as np
import pytest
from scipy.stats import binom, binomtest

from device_models.faults import STUCK_HIGH, STUCK_LOW, place_faults

LOW, HIGH = 0.0175, 0.0904
TOTAL = LOW + HIGH
SEED = np.uint64(14)


def placed(die, rows=64, columns=64, low=LOW, high=HIGH, clustered=False, size=8.0):
    fault = np.empty(rows * columns, dtype=np.uint8)
    place_faults(SEED, die, rows, columns, low, high, clustered, size, fault)
    return fault.reshape(rows, columns)


UNIFORM = np.stack([placed(die) for die in range(200)])


def in_range(count, trials, chance, confidence=0.999):
    low, high = binom.interval(confidence, trials, chance)
    return low <= count <= high


def test_counts_of_one_die():
    die = UNIFORM[0]
    assert die.size * TOTAL == pytest.approx(441.9584, rel=1e-12, abs=0)
    assert in_range(np.count_nonzero(die == STUCK_LOW), 4096, LOW)
    assert in_range(np.count_nonzero(die == STUCK_HIGH), 4096, HIGH)
    assert in_range(np.count_nonzero(die), 4096, TOTAL)


def test_counts_over_many_dies():
    assert in_range(np.count_nonzero(UNIFORM == STUCK_LOW), UNIFORM.size, LOW)
    assert in_range(np.count_nonzero(UNIFORM == STUCK_HIGH), UNIFORM.size, HIGH)
    # scatter between dies: sd 19.8562607, four standard errors of a standard deviation
    counts = np.count_nonzero(UNIFORM, axis=(1, 2))
    assert counts.std(ddof=1) == pytest.approx(19.8562607, rel=4 / np.sqrt(2 * len(counts)), abs=0)


def test_a_wrong_fraction_would_be_noticed():
    assert not in_range(np.count_nonzero(UNIFORM), UNIFORM.size, TOTAL * 1.02)


def test_clean_rows_cannot_be_bought_at_this_rate():
    chance = (1 - TOTAL) ** 64
    assert chance == pytest.approx(6.70604587e-4, rel=1e-8, abs=0)
    rows = UNIFORM.reshape(-1, 64)
    assert in_range(np.count_nonzero(~rows.any(axis=1)), len(rows), chance)


@pytest.mark.parametrize(
    ("rows", "columns", "low", "high", "size"),
    [(64, 64, LOW, HIGH, 8.0), (64, 64, 0.01, 0.01, 3.0), (65, 20, 0.02, 0.0, 30.0), (1, 256, 0.0, 0.05, 6.0)],
)
def test_clusters_keep_the_expected_fractions(rows, columns, low, high, size):
    dies = np.stack([placed(die, rows, columns, low, high, True, size) for die in range(3000)])
    for kind, fraction in ((STUCK_LOW, low), (STUCK_HIGH, high)):
        per_die = np.count_nonzero(dies == kind, axis=(1, 2)) / (rows * columns)
        assert abs(per_die.mean() - fraction) <= 4 * per_die.std(ddof=1) / np.sqrt(len(dies))


def test_clusters_cluster():
    dies = np.stack([placed(die, low=0.01, high=0.01, clustered=True) for die in range(300)])
    even = np.stack([placed(die, low=0.01, high=0.01) for die in range(300)])

    def neighbours(faults):
        return np.mean((faults[:, :, 1:] > 0)[faults[:, :, :-1] > 0])

    assert abs(neighbours(even) - 0.02) < 0.004
    assert neighbours(dies) > 0.5
    # one kind per cluster: two stuck neighbours agree unless two clusters meet
    both = (dies[:, :, 1:] > 0) & (dies[:, :, :-1] > 0)
    assert np.mean((dies[:, :, 1:] == dies[:, :, :-1])[both]) > 0.95
    # so more rows stay clean than of the same number of scattered faults
    assert np.mean(~dies.any(axis=2)) > 1.3 * np.mean(~even.any(axis=2))


@pytest.mark.parametrize(
    ("stuck", "cells", "low", "high"),
    [
        (0, 77, 0.0, 0.0467780682),
        (3, 1000, 6.19099932e-4, 0.00874202324),
        (0, 1000, 0.0, 0.00368208390),
        (7165, 65536, 0.106949825, 0.111743275),
        (10, 10, 0.691502892, 1.0),
    ],
)
def test_exact_intervals(stuck, cells, low, high):
    interval = binomtest(stuck, cells).proportion_ci(method="exact")
    assert interval.low == pytest.approx(low, rel=5e-9, abs=0)
    assert interval.high == pytest.approx(high, rel=5e-9, abs=0)


def test_exact_interval_of_an_injected_count_holds_the_fraction():
    held = 0
    for die in UNIFORM:
        interval = binomtest(int(np.count_nonzero(die)), die.size).proportion_ci(method="exact")
        held += interval.low <= TOTAL <= interval.high
    # at least 95 % of dies, less four standard errors
    assert held / len(UNIFORM) >= 0.95 - 4 * np.sqrt(0.95 * 0.05 / len(UNIFORM))
