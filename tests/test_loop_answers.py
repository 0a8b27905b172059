"""What the loop makes of a strategy's answers, and that it does the same compiled and as plain Python."""

from dataclasses import replace

import numpy as np
import pytest

from device_models.catalog import load_device
from device_models.compiled import compiled
from programming.catalog import load_strategy
from programming.job import ACCEPTED, GAVE_UP, Faults, PulseTrain, Targets, Verify
from programming.strategy_contract import ACCEPT, READ, RESET, SET, CellStrategy
from programming.strategy_contract import GIVE_UP as STOP
from tests.interpreted_loop import interpret
from tests.jobs import cell_of, job, quiet_verify
from tests.test_loop_against_twin import run

STAIRCASE = load_strategy("amplitude_staircase")
PLAIN = replace(cell_of(load_device("voltage_threshold"), "demo_oxide"), spreads={}, initial_spread=0.0, cycle=None)


def test_compiled_and_plain_python_agree():
    """Everything on: noise, faults, stress of both polarities, two passes; a small array, for plain Python is slow."""
    settings = {"faults": Faults(0.05, 0.05), "stuck_false_alarm": 1e-3, "verify": Verify(0.2, 100e-9, 2, 8, 120e-6)}
    a_job = job(4, 5, "V/2", passes=2, cell=cell_of(load_device("voltage_threshold"), overrides={"v_on": -0.8}), **settings)
    one, other = run(a_job)[0], interpret(a_job)
    assert one.pulses.sum() > 300
    for name in ("pulses", "verifies", "status", "fault", "in_band"):
        assert np.array_equal(getattr(one, name), getattr(other, name)), name
    for name in ("target_S", "final_S", "energy_J", "time_s"):
        np.testing.assert_allclose(getattr(one, name), getattr(other, name), rtol=1e-9, atol=0)
    np.testing.assert_allclose(one.disturbance_S, other.disturbance_S, rtol=1e-6, atol=1e-15 * one.final_S.max())
    assert np.abs(one.disturbance_S).max() > 1e-9


def strategy(decide, **changes):
    return CellStrategy(
        **{"name": "made up", "summary": "", "source": "", "knowledge": "", "memory": 2, "amplitudes": "staircase"} | changes,
        decide=compiled(decide),
    )


def answer(decide, **changes):
    """One cell from 12 uS, target 50 uS, perfect reads, by a strategy made up for the test."""
    targets = Targets("matrix", 20e-6, 80e-6, matrix_S=np.array([[50e-6]]))
    settings = {"cell": PLAIN, "verify": quiet_verify(), "targets": targets, "max_pulses": 30, "strategy": strategy(decide)}
    return interpret(job(1, 1, **settings | changes), planned_with=STAIRCASE)


def first_of(outcome):
    return int(outcome.status[0]), int(outcome.pulses[0]), int(outcome.verifies[0])


def test_a_further_reading_costs_a_verify_and_no_pulse():
    def three_readings(target, tolerance, reading, pulses, memory, rules):
        memory[0] += 1.0
        return (ACCEPT if memory[0] == 3.0 else READ), 0.0, 0.0, 0.0

    outcome = answer(three_readings)
    assert first_of(outcome) == (ACCEPTED, 0, 3)
    assert outcome.time_s == pytest.approx(3 * 100e-9, rel=1e-12, abs=0)


def test_reading_for_ever_ends_as_given_up():
    def reads_on(target, tolerance, reading, pulses, memory, rules):
        return READ, 0.0, 0.0, 0.0

    assert first_of(answer(reads_on)) == (GAVE_UP, 0, 1 + 64 * 30)


def test_giving_up_is_the_strategys_right():
    def stops_after_two(target, tolerance, reading, pulses, memory, rules):
        return (STOP if pulses == 2 else SET), 0.8, 100e-9, 0.0

    assert first_of(answer(stops_after_two)) == (GAVE_UP, 2, 3)


def test_a_pulse_beyond_max_pulses_is_not_given():
    def never_stops(target, tolerance, reading, pulses, memory, rules):
        return SET, 0.8, 100e-9, 0.0

    assert first_of(answer(never_stops, passes=2)) == (GAVE_UP, 60, 62)


def test_memory_and_pulses_start_at_zero_in_every_pass_and_for_every_cell():
    def notes(target, tolerance, reading, pulses, memory, rules):
        if pulses == 0.0 and (memory[0] != 0.0 or memory[1] != 0.0):
            return ACCEPT, 0.0, 0.0, 0.0
        memory[0] += 1.0
        memory[1] = reading
        return SET, 0.8, 100e-9, 0.0

    targets = Targets("matrix", 20e-6, 80e-6, matrix_S=np.full((1, 3), 50e-6))
    outcome = interpret(
        job(1, 3, cell=PLAIN, targets=targets, max_pulses=4, passes=3, strategy=strategy(notes)), planned_with=STAIRCASE
    )
    assert outcome.pulses.tolist() == [12, 12, 12]


@pytest.mark.parametrize(("asked", "given"), [(0.1, 1.2), (1.2, 1.2), (1.229, 1.22), (1.2301, 1.24), (1.31, 1.32), (9.0, 1.4)])
def test_an_amplitude_is_rounded_to_the_grid_and_kept_in_its_limits(asked, given):
    train = PulseTrain(1.2, 0.02, 1.4, 100e-9)

    def one_pulse(target, tolerance, reading, pulses, memory, rules):
        return (SET if pulses == 0 else ACCEPT), asked, 100e-9, 0.0

    outcome = answer(one_pulse, set=train)
    dose = 0.117 * (given / 1.05 - 1) ** 3 * 100e-9 / 3e-9
    assert outcome.final_S[0] == pytest.approx(100e-6 - 88e-6 * np.exp(-dose), rel=1e-9, abs=0)


def test_the_reset_train_is_used_for_reset():
    def down(target, tolerance, reading, pulses, memory, rules):
        return (RESET if pulses == 0 else ACCEPT), 1.3, 100e-9, 0.0

    outcome = answer(down, reset=PulseTrain(1.1, 0.1, 1.5, 200e-9), cell=replace(PLAIN, initial_S=60e-6))
    dose = 0.117 * (1.3 / 1.05 - 1) ** 3 * 200e-9 / 3e-9
    assert outcome.final_S[0] == pytest.approx(10e-6 + 50e-6 * np.exp(-dose), rel=1e-9, abs=0)
