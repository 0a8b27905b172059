"""Passes, disturbance and truth: what a second look does to a cell, and what is scored in the end."""

from dataclasses import replace

import numpy as np
import pytest

from device_models.catalog import load_device
from programming.job import ACCEPTED, ENERGY_PARTS, GAVE_UP, NOT_ADDRESSED, STUCK, Faults, PulseTrain, Targets
from tests.jobs import cell_of, job, quiet_verify
from tests.test_loop_against_twin import run

DEMO = cell_of(load_device("voltage_threshold"), "demo_oxide")
PLAIN = replace(DEMO, spreads={}, initial_spread=0.0, cycle=None)
MIDDLE = Targets("levels", 20e-6, 80e-6, np.linspace(20e-6, 80e-6, 16))


def quiet_job(passes, **changes):
    """Perfect reads; thresholds far above any half-select voltage."""
    settings = {"cell": replace(PLAIN, cycle=DEMO.cycle), "verify": quiet_verify(), "targets": MIDDLE, "passes": passes}
    return job(16, 16, **settings | changes)


def test_a_second_pass_verifies_everything_once_more():
    one, two, three = (run(quiet_job(passes))[0] for passes in (1, 2, 3))
    assert (one.status == ACCEPTED).all()
    for more, outcome in ((1, two), (2, three)):
        assert np.array_equal(outcome.pulses, one.pulses)
        assert np.array_equal(outcome.verifies, one.verifies + more)
        assert np.array_equal(outcome.final_S, one.final_S)


def test_stuck_cells_are_left_alone_in_later_passes():
    settings = {"faults": Faults(0.1, 0.1), "stuck_false_alarm": 1e-3}
    one, two = (run(quiet_job(passes, **settings))[0] for passes in (1, 2))
    stuck = one.status == STUCK
    assert stuck.sum() > 20
    assert np.array_equal(stuck, two.status == STUCK)
    assert np.array_equal(two.verifies, one.verifies + ~stuck)
    assert np.array_equal(two.pulses[stuck], one.pulses[stuck])


def test_cells_that_are_not_addressed_are_never_touched():
    matrix = np.full((16, 16), np.nan)
    matrix[3, :] = 50e-6
    outcome = run(quiet_job(2, targets=Targets("matrix", 20e-6, 80e-6, matrix_S=matrix)))[0]
    left = np.isnan(matrix).ravel()
    assert (outcome.status[left] == NOT_ADDRESSED).all()
    assert (outcome.status[~left] == ACCEPTED).all()
    assert outcome.pulses[left].sum() == outcome.verifies[left].sum() == 0
    assert not outcome.in_band[left].any()
    assert np.isnan(outcome.target_S[left]).all()
    np.testing.assert_allclose(outcome.final_S[left], PLAIN.initial_S, rtol=1e-12, atol=0)


@pytest.mark.parametrize("passes", [1, 2, 5])
def test_max_pulses_is_per_pass_and_each_pass_starts_the_strategy_again(passes):
    """Twelve steps of 20 mV from 0.8 V end at 1.02 V, below the threshold of 1.05 V; a thirteenth and more would not."""
    outcome = run(quiet_job(passes, max_pulses=12))[0]
    assert (outcome.status == GAVE_UP).all()
    assert (outcome.pulses == 12 * passes).all()
    assert (outcome.verifies == 13 * passes).all()
    np.testing.assert_allclose(outcome.final_S, PLAIN.initial_S, rtol=1e-12, atol=0)
    assert (run(quiet_job(passes, max_pulses=16))[0].final_S > 1.0001 * PLAIN.initial_S).all()


def test_counts_of_passes_add_up():
    noisy = {"cell": DEMO, "tolerance_S": 0.5e-6}
    one, two = (run(job(16, 16, passes=passes, targets=MIDDLE, **noisy))[0] for passes in (1, 2))
    assert (two.pulses >= one.pulses).all()
    assert (two.pulses > one.pulses).any()
    assert (two.verifies - two.pulses == one.verifies - one.pulses + 1).all()  # one reading before the first pulse, per pass


# ---- disturbance

EASY = cell_of(load_device("voltage_threshold"), "demo_oxide", overrides={"v_on": -0.5, "k_on": -0.0117})
EASY = replace(EASY, spreads={}, initial_spread=0.0, cycle=None)


def pair_job(passes, first=60e-6, second=75e-6, tolerance=1.5e-6):
    """Two cells on one word line: programming the second disturbs the first, and nothing disturbs the second."""
    return job(
        1,
        2,
        cell=EASY,
        verify=quiet_verify(),
        passes=passes,
        tolerance_S=tolerance,
        targets=Targets("matrix", 20e-6, 90e-6, matrix_S=np.array([[first, second]])),
        set=PulseTrain(1.2, 0.01, 1.5, 5e-9),
        reset=PulseTrain(0.8, 0.02, 1.6, 5e-9),
    )


def test_disturbance_is_what_moved_a_cell_since_its_own_last_pulse():
    undisturbed, outcome = run(pair_job(1, second=np.nan))[0], run(pair_job(1))[0]
    assert undisturbed.disturbance_S[0] == 0
    assert outcome.disturbance_S[0] > 1e-9
    assert outcome.disturbance_S[0] == pytest.approx(outcome.final_S[0] - undisturbed.final_S[0], rel=1e-9, abs=0)
    assert outcome.disturbance_S[1] == 0
    assert outcome.dose_share[0].tolist() == [1, 0, 0]
    assert outcome.dose_share[1].tolist() == [0, 0, 0]
    # the second cell was disturbed before it got its own pulses: no part of the account
    assert undisturbed.disturbance_S[1] > 1e-9


def test_a_verify_without_a_pulse_does_not_reset_the_disturbance():
    one, two = run(pair_job(1))[0], run(pair_job(2))[0]
    assert np.array_equal(one.pulses, two.pulses)
    assert np.array_equal(two.verifies, one.verifies + 1)
    assert two.in_band.all()
    assert one.disturbance_S[0] > 1e-9
    assert two.disturbance_S[0] == pytest.approx(one.disturbance_S[0], rel=1e-12, abs=0)
    assert two.dose_share[0].tolist() == [1, 0, 0]


def test_a_pulse_of_its_own_does():
    """The disturbance takes the first cell over the edge of its band, and the second pass programs it again."""
    landed = run(pair_job(1))[0]
    edge = landed.final_S[0] - 0.5 * landed.disturbance_S[0]
    one, two = (run(pair_job(passes, first=edge - 1e-6, tolerance=1e-6))[0] for passes in (1, 2))
    assert one.disturbance_S[0] == landed.disturbance_S[0]
    assert one.status[0] == ACCEPTED
    assert not one.in_band[0]
    assert two.pulses[0] > one.pulses[0]
    assert two.pulses[1] == one.pulses[1]
    assert two.disturbance_S[0] == 0
    assert two.dose_share[0].tolist() == [0, 0, 0]
    assert two.in_band[0]


# ---- truth and belief


def test_in_band_is_the_truth_and_accepted_is_what_the_controller_believes():
    a_job = job(32, 32, targets=MIDDLE, tolerance_S=0.8e-6, max_pulses=60)
    outcome = run(a_job)[0]
    truth = np.abs(outcome.final_S - outcome.target_S) <= 0.8e-6
    assert np.array_equal(outcome.in_band, truth)
    accepted = outcome.status == ACCEPTED
    assert (accepted & ~truth).sum() > 50  # accepted by a lucky reading, or moved since
    assert (~accepted & truth).sum() > 0  # given up, and yet there


def test_the_band_is_the_wider_of_the_two_tolerances():
    outcome = run(job(24, 24, targets=MIDDLE, tolerance_S=1e-6, tolerance_fraction=0.04))[0]
    band = np.maximum(1e-6, 0.04 * outcome.target_S)
    assert np.array_equal(outcome.in_band, np.abs(outcome.final_S - outcome.target_S) <= band)
    inside_wide_only = outcome.in_band & (np.abs(outcome.final_S - outcome.target_S) > 1e-6)
    assert inside_wide_only.sum() > 50


def test_open_loop_gives_one_pulse_and_takes_no_verify():
    train = PulseTrain(1.1, 0.02, 1.6, 100e-9)
    settings = {"strategy": "open_loop", "cell": PLAIN, "set": train, "targets": MIDDLE}
    one, two = (run(job(16, 16, passes=passes, **settings))[0] for passes in (1, 2))
    for passes, outcome in ((1, one), (2, two)):
        assert (outcome.status == ACCEPTED).all()
        assert (outcome.pulses == passes).all()
        assert outcome.verifies.sum() == 0
        assert outcome.energy_J[ENERGY_PARTS.index("verify")] == 0
        assert outcome.time_s == pytest.approx(passes * 256 * 100e-9, rel=1e-12, abs=0)
    # the law written out: 5 mV generator, dose k (V / 1.05 V - 1)^3 t over 3 nm, a fixed fraction of the distance left
    wanted = 1.1 + 0.5 * (one.target_S - 20e-6) / 60e-6
    voltage = np.round(wanted / 5e-3) * 5e-3
    dose = 0.117 * (voltage / 1.05 - 1) ** 3 * 100e-9 / 3e-9
    expected = 100e-6 - (100e-6 - 12e-6) * np.exp(-dose)
    np.testing.assert_allclose(one.final_S, expected, rtol=1e-9, atol=0)
    np.testing.assert_allclose(two.final_S, 100e-6 - (100e-6 - 12e-6) * np.exp(-2 * dose), rtol=1e-9, atol=0)
