"""Fault placement and the converter against their plain twins, and independence from the order of dies."""

import numpy as np
import pytest

from device_models.converter import convert
from device_models.faults import place_faults
from tests.twins import plain_faults

SEED = np.uint64(20_240_517)


def placed(die, rows, columns, low, high, clustered, size=8.0):
    fault = np.full(rows * columns, 77, dtype=np.uint8)
    place_faults(SEED, die, rows, columns, low, high, clustered, size, fault)
    return fault


@pytest.mark.parametrize(
    ("rows", "columns", "low", "high", "clustered", "size"),
    [
        (16, 16, 0.05, 0.02, False, 8.0),
        (20, 24, 0.05, 0.02, True, 3.0),
        (16, 16, 0.01, 0.10, True, 8.0),
        (3, 50, 0.10, 0.00, True, 8.0),
        (1, 40, 0.00, 0.10, True, 4.0),
        (16, 16, 0.05, 0.02, True, 1.0),
    ],
)
def test_placement_is_that_of_the_plain_twin(rows, columns, low, high, clustered, size):
    stuck = 0
    for die in range(4):
        ours = placed(die, rows, columns, low, high, clustered, size)
        assert ours.tolist() == plain_faults.place_faults(int(SEED), die, rows, columns, low, high, clustered, size)
        stuck += np.count_nonzero(ours)
    assert stuck > 0


def test_no_faults_leave_every_cell_healthy():
    for clustered in (False, True):
        assert not placed(0, 8, 8, 0.0, 0.0, clustered).any()


def test_order_of_dies_does_not_matter():
    forward = [placed(die, 16, 16, 0.03, 0.02, True).tolist() for die in range(5)]
    backward = [placed(die, 16, 16, 0.03, 0.02, True).tolist() for die in reversed(range(5))]
    assert forward == backward[::-1]
    assert forward[0] != forward[1]


def test_converter_is_that_of_the_plain_twin():
    for value in np.random.default_rng(3).uniform(-20e-6, 120e-6, 300):
        assert convert(value, 100e-6 / 64, 63) == pytest.approx(plain_faults.convert(value, 100e-6 / 64, 63), rel=1e-14, abs=0)
