"""Cycle noise of half-select stress, drawn once for the sum of many pulses, against a twin that draws it for every pulse."""

import math
from dataclasses import replace

import numpy as np
import pytest
from scipy import stats

from device_models.catalog import load_device
from programming.job import Cell, ParameterSpread, PulseTrain, Targets
from programming.run import program_dies
from tests.jobs import NO_NOISE, cell_of, job, quiet_verify
from tests.test_loop_against_twin import run, twin_of

SEEDS = range(100, 132)
TRAIN = PulseTrain(1.1, 0.05, 1.6, 100e-9)


def easily_stressed(**changes: object) -> Cell:
    """The demo cell with its SET threshold just below half of the pulses, slower, and with strong cycle noise."""
    cell = cell_of(load_device("voltage_threshold"), "demo_oxide", overrides={"v_on": -0.5, "k_on": -0.0117}, noise=NO_NOISE)
    settings = {
        "spreads": {**cell.spreads, "v_on": ParameterSpread("normal", 0.03)},
        "cycle": ParameterSpread("lognormal", 0.6),
    }
    return replace(cell, **settings | changes)


def stressed_job(seed, stress_noise=True):
    """SET pulses only: the band reaches beyond the cells. The first cells get the stress of dozens of pulses."""
    return job(
        20,
        20,
        seed=seed,
        cell=easily_stressed(),
        targets=Targets("levels", 75e-6, 75e-6, np.array([75e-6])),
        tolerance_S=45e-6,
        set=TRAIN,
        reset=TRAIN,
        stress_noise=stress_noise,
    )


@pytest.fixture(scope="module")
def dies():
    """Per seed: disturbance [S] of all cells of one die, by the loop, by the twin, and by the loop without stress noise."""
    out = []
    for seed in SEEDS:
        outcome, frozen = run(stressed_job(seed))[0], run(stressed_job(seed, stress_noise=False))[0]
        twin = twin_of(stressed_job(seed), stress_rng=np.random.default_rng(seed))
        assert outcome.pulses.min() >= 1
        out.append(
            (outcome.disturbance_S, twin.conductance() - (twin.low + (twin.high - twin.low) * twin.own), frozen.disturbance_S)
        )
    return np.array(out)


def within_4_standard_errors(one, other):
    """Paired differences, one per die, must average to zero within 4 standard errors of their mean."""
    difference = np.asarray(one) - np.asarray(other)
    error = difference.std(ddof=1) / math.sqrt(difference.size)
    assert 0 < error < 0.2 * np.mean(other)  # the comparison means something
    assert abs(difference.mean()) <= 4 * error


def test_disturbance_has_the_mean_spread_and_tail_of_noise_drawn_per_pulse(dies):
    loop, twin, _ = dies.transpose(1, 0, 2)
    assert loop.mean() > 3e-7
    within_4_standard_errors(loop.mean(axis=1), twin.mean(axis=1))
    within_4_standard_errors(loop.var(axis=1), twin.var(axis=1))
    within_4_standard_errors(np.quantile(loop, 0.99, axis=1), np.quantile(twin, 0.99, axis=1))


def test_what_the_noise_alone_does_has_the_same_spread_and_tail(dies):
    """Less the disturbance without noise, which both share: the variance and the tail of the noise itself."""
    loop, twin, frozen = dies.transpose(1, 0, 2)
    loop, twin = loop - frozen, twin - frozen
    difference = loop.mean(axis=1) - twin.mean(axis=1)
    assert abs(difference.mean()) <= 4 * difference.std(ddof=1) / math.sqrt(difference.size)
    within_4_standard_errors(loop.var(axis=1), twin.var(axis=1))
    for share in (0.01, 0.99):
        within_4_standard_errors(np.abs(np.quantile(loop, share, axis=1)), np.abs(np.quantile(twin, share, axis=1)))


def single_pulse_doses(cycle, dies=4000):
    """Dose that one pulse on a cell gives to its neighbour on the same word line, on many dies, over its mean."""
    cell = easily_stressed(spreads={}, cycle=cycle, initial_spread=0.0, initial_S=40e-6)
    a_job = job(
        1,
        2,
        cell=cell,
        verify=quiet_verify(),
        targets=Targets("matrix", 60e-6, 90e-6, matrix_S=np.array([[90e-6, np.nan]])),
        tolerance_S=1e-6,
        max_pulses=1,
        set=PulseTrain(1.4, 0.0, 1.4, 100e-9),
    )
    final = np.array(list(program_dies(a_job, dies, 1, lambda o: (o.final_S[1], o.disturbance_S[1], o.pulses.sum()))))
    assert (final[:, 2] == 1).all()
    np.testing.assert_allclose(final[:, 0] - 40e-6, final[:, 1], rtol=1e-9, atol=0)
    low, high = 10e-6, 100e-6
    up = np.log((high - 40e-6) / (high - final[:, 0]))  # change proportional to the distance left
    down = -np.log((40e-6 - low) / (final[:, 0] - low))
    mean = 0.0117 * (0.7 / 0.5 - 1) ** 3 * 100e-9 / 3e-9
    return np.where(up >= 0, up, down) / mean


def test_a_single_pulse_is_exactly_lognormal():
    sigma = math.sqrt(math.log1p(0.6**2))
    z = (np.log(single_pulse_doses(ParameterSpread("lognormal", 0.6))) + 0.5 * sigma**2) / sigma
    assert stats.kstest(z, "norm").pvalue > 1e-3


def test_a_single_pulse_is_exactly_normal_where_that_is_the_law():
    """Also below zero, where the dose goes the other way as it does for a cell's own pulses."""
    doses = single_pulse_doses(ParameterSpread("normal", 0.6))
    assert (doses < 0).sum() > 50
    assert stats.kstest((doses - 1) / 0.6, "norm").pvalue > 1e-3


def test_no_cycle_noise_no_stress_noise():
    np.testing.assert_allclose(single_pulse_doses(None, 5), 1.0, rtol=1e-9, atol=0)
