"""The pulses a strategy may give: grids written out, rounding to the generator's resolution, and the loop's use of them."""

from dataclasses import replace

import numpy as np
import pytest

from programming.catalog import load_strategy
from programming.job import PulseTrain
from programming.pulse_grid import amplitude_grid, pulse_fields, staircase_values, width_grid
from programming.visit import nearest
from tests.jobs import job
from tests.test_loop_against_twin import one_polarity, run, twin_of

STAIRCASE = load_strategy("amplitude_staircase")
WIDTHS = load_strategy("width_staircase")
ANY = load_strategy("open_loop")
ONE = load_strategy("identical_pulses")


@pytest.mark.parametrize(
    ("start", "step", "stop", "expected"),
    [
        (0.8, 0.2, 1.4, [0.8, 1.0, 1.2, 1.4]),
        (0.8, 0.25, 1.4, [0.8, 1.05, 1.3, 1.4]),  # stop is not on the grid
        (0.1, 0.1, 0.3, [0.1, 0.2, 0.3]),  # 0.3 is not 3 times 0.1 in binary: still one value, not two
        (0.8, 0.02, 0.82, [0.8, 0.82]),
        (0.8, 2.0, 1.4, [0.8, 1.4]),
        (0.8, 0.0, 1.4, [0.8]),
        (0.8, 0.1, 0.8, [0.8]),
        (0.8, 0.1, 0.7, [0.8]),
        (100e-9, 50e-9, 220e-9, [100e-9, 150e-9, 200e-9, 220e-9]),
    ],
)
def test_staircase_written_out(start, step, stop, expected):
    np.testing.assert_allclose(staircase_values(start, step, stop), expected, rtol=1e-12, atol=0)


def test_staircase_never_passes_its_stop_nor_repeats_it():
    for step in np.linspace(0.003, 0.2, 97):
        for stop in (1.1, 1.37, 1.6):
            values = staircase_values(0.8, float(step), stop)
            assert values[0] == 0.8
            assert values[-1] == stop
            assert (np.diff(values) > 1e-10).all()
            np.testing.assert_allclose(np.diff(values)[:-1], step, rtol=1e-9, atol=0)


TRAIN = PulseTrain(0.8, 0.25, 1.4, 100e-9, width_step=50e-9, width_stop=220e-9)


def test_amplitudes_by_kind_of_strategy():
    np.testing.assert_allclose(amplitude_grid(TRAIN, STAIRCASE, 0.0)[0], [0.8, 1.05, 1.3, 1.4], rtol=1e-12, atol=0)
    np.testing.assert_allclose(amplitude_grid(TRAIN, ONE, 0.05)[0], [0.8], rtol=1e-12, atol=0)
    every = np.arange(16, 29) * 0.05
    np.testing.assert_allclose(amplitude_grid(TRAIN, ANY, 0.05)[0], every, rtol=1e-12, atol=0)


def test_widths_by_kind_of_strategy():
    np.testing.assert_allclose(width_grid(TRAIN, WIDTHS)[0], [100e-9, 150e-9, 200e-9, 220e-9], rtol=1e-12, atol=0)
    for strategy in (STAIRCASE, ONE, ANY):
        assert width_grid(TRAIN, strategy)[0].tolist() == [100e-9]
    assert width_grid(replace(TRAIN, width_stop=0.0), WIDTHS)[0].tolist() == [100e-9]


def test_the_pulse_itself_is_rounded_to_the_resolution():
    odd = PulseTrain(0.8024, 0.003, 0.8133, 100e-9)
    # wanted 0.8024 0.8054 0.8084 0.8114 0.8133
    np.testing.assert_allclose(amplitude_grid(odd, STAIRCASE, 0.005)[0], [0.8, 0.805, 0.81, 0.81, 0.815], rtol=1e-12, atol=0)
    np.testing.assert_allclose(amplitude_grid(odd, STAIRCASE, 0.01)[0], [0.8, 0.81, 0.81, 0.81, 0.81], rtol=1e-12, atol=0)


@pytest.mark.parametrize("resolution", [0.0, 1e-3, 5e-3, 20e-3])
@pytest.mark.parametrize("train", [(0.8, 0.02, 1.6), (0.8024, 0.003, 1.5033), (0.797, 0.05, 1.603)])
def test_every_amplitude_asked_for_is_found(train, resolution):
    """Also where the generator is coarser than the step, and where rounding moves the first or the last value."""
    values, steps = amplitude_grid(PulseTrain(*train, 100e-9), STAIRCASE, resolution)
    wanted = staircase_values(*train)
    found = [nearest(np.array([steps]), 0, 5, 5 + values.size, float(amplitude)) - 5 for amplitude in wanted]
    assert found == list(range(values.size))
    table = np.array([steps])
    assert nearest(table, 0, 5, 5 + values.size, 0.1) == 5
    assert nearest(table, 0, 5, 5 + values.size, 9.0) == 5 + values.size - 1
    assert nearest(table, 0, 5, 5 + values.size, np.nan) == 5  # not a number: the lowest


def test_bins_are_amplitude_major_set_first():
    both = replace(STAIRCASE, widths="staircase")
    a_job = job(strategy=both, set=TRAIN, reset=PulseTrain(0.9, 0.3, 1.2, 80e-9, width_step=10e-9, width_stop=90e-9))
    fields = pulse_fields(a_job)
    sign = a_job.cell.model.set_polarity
    expected = [(sign * a, w) for a in (0.8, 1.05, 1.3, 1.4) for w in (100e-9, 150e-9, 200e-9, 220e-9)]
    expected += [(-sign * a, w) for a in (0.9, 1.2) for w in (80e-9, 90e-9)]
    got = np.column_stack([fields["bin_voltage"], fields["bin_width"]])
    np.testing.assert_allclose(got, expected, rtol=1e-12, atol=0)
    assert fields["bin_first"].tolist() == [0, 16, 20]
    assert fields["amplitude_first"].tolist() == [0, 4, 6]
    assert fields["width_first"].tolist() == [0, 4, 6]
    np.testing.assert_allclose(fields["amplitudes"][fields["bin_amplitude"]], np.abs(got[:, 0]), rtol=1e-12, atol=0)


def test_edges_and_pauses_add_to_the_time_of_a_pulse():
    a_job = job(
        set=PulseTrain(0.8, 0.1, 1.6, 1e-7, rise=2e-9, dead_time=3e-9), reset=PulseTrain(0.8, 0.1, 1.6, 1e-7, rise=5e-9)
    )
    np.testing.assert_allclose(pulse_fields(a_job)["overhead"], [7e-9, 10e-9], rtol=1e-12, atol=0)


def test_the_loop_rounds_as_the_twin_does_with_a_coarse_generator():
    odd = PulseTrain(0.8024, 0.003, 1.5033, 100e-9)
    a_job = one_polarity("V/2", set=odd, reset=odd, resolution=5e-3, max_pulses=400)
    twin, outcome = twin_of(a_job), run(a_job)[0]
    assert twin.pulses.sum() > 5000
    assert np.array_equal(outcome.pulses, twin.pulses)
    np.testing.assert_allclose(outcome.final_S, twin.conductance(), rtol=1e-12, atol=0)
