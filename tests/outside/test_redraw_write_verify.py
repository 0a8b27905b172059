"""Redraw write-verify: each pulse a fresh N(100, sp), accepted when the reading, with noise sv, is within w of 100.

The laws of tries, of true levels and of accepting reads are derived (two jointly normal variables, one of them cut off)
and were simulated elsewhere. Sampled laws are held to 4 standard errors; seeds are fixed.
"""

from math import sqrt

import numpy as np
import pytest
from scipy.stats import norm

from tests.outside.plugin_jobs import plugin_job, read_noise, relative_cycle, sample, step_targets
from tests.outside.standard_errors import agrees, deviation_of, mean_of, standard_errors, variance_of
from tests.twins import plain_random

DIES = 256  # of 64 x 64 cells


def approx(value, rel=1e-9):
    return pytest.approx(value, rel=rel, abs=0)


SP, SV, W = 5.0, 1.0, 2.0
TOTAL = sqrt(SP * SP + SV * SV)
CHANCE = 2.0 * norm.cdf(W / TOTAL) - 1.0
CUT = 1.0 - 2.0 * W / TOTAL * norm.pdf(W / TOTAL) / CHANCE  # variance of an accepted reading over that of any reading
SHARE = SP * SP / TOTAL**2
TRUE_SD = sqrt(SHARE * SV * SV + SHARE**2 * TOTAL**2 * CUT)


@pytest.fixture(scope="module")
def redraw():
    noise, verify = read_noise(SV)
    cell = {"initial_S": 1e-4, "initial_spread": 0.0, "cycle": relative_cycle("normal", SP / 100.0), "noise": noise}
    a_job = plugin_job("redraw", cell=cell, verify=verify, targets=step_targets(100.0, 100.0), tolerance_S=W * 1e-10)
    return a_job, sample(a_job, DIES)


def test_redraw_tries(redraw):
    tries = redraw[1].pulses
    assert approx(0.305113398, rel=2e-9) == CHANCE
    assert approx(3.27747, rel=2e-6) == 1.0 / CHANCE
    assert agrees(mean_of(tries), 1.0 / CHANCE)
    assert agrees(variance_of(tries), (1.0 - CHANCE) / CHANCE**2)
    assert agrees(mean_of((tries == 1).astype(float)), CHANCE)
    assert np.quantile(tries, 0.99, method="inverted_cdf") == 13
    assert agrees(mean_of(tries.reshape(DIES, -1).max(axis=1)), 24.9366547)  # the slowest of 4096 cells


def test_redraw_spread_is_scored_on_the_truth(redraw):
    result = redraw[1]
    assert approx(1.47281369, rel=4e-9) == TRUE_SD
    assert agrees(deviation_of(result.overshoot), TRUE_SD)
    assert agrees(mean_of(result.overshoot), 0.0)
    outside = (np.abs(result.overshoot) > W).astype(float)
    assert agrees(mean_of(outside), 0.181099236)
    assert np.array_equal(outside == 0.0, result.in_band)


def test_the_accepting_read_would_flatter(redraw):
    """The accepting read of each cell, rebuilt by the twin of the random numbers, and one more read after it."""
    a_job, result = redraw
    count = 2 * 4096

    def reading(cell, event):
        z = plain_random.normal(a_job.seed, cell // 4096, cell % 4096, plain_random.READ, int(event), 0)
        return result.overshoot[cell] + SV * z

    accepting = np.array([reading(cell, result.verifies[cell] - 1) for cell in range(count)])
    again = np.array([reading(cell, result.verifies[cell]) for cell in range(count)])
    assert np.abs(accepting).max() <= W * (1.0 + 1e-5)  # none outside, where 18 % of the cells are
    assert agrees(deviation_of(accepting), 1.14288463)
    assert approx(1.14288463, rel=2e-9) == TOTAL * sqrt(CUT)
    assert agrees(deviation_of(again), 1.78021914)
    assert sqrt(TRUE_SD**2 + SV**2) == approx(1.78021914, rel=2e-9)
    assert approx(0.224, rel=2e-3) == 1.0 - 1.14288463 / TRUE_SD
    assert standard_errors(deviation_of(result.overshoot), 1.14288463) > 100.0
