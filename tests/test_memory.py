"""Memory: what a cell in flight costs, and that the number of dies costs nothing."""

import gc
import tracemalloc

import numpy as np
import pytest

from programming.die_memory import make_die
from programming.orders import ORDERS
from programming.prepare import make_plan
from programming.run import program_dies
from tests.jobs import job

# What the device declares for each cell, as 8-byte numbers: its state and the parameters that vary from cell to cell.
DEMO_OWN = 8 * (1 + 6)
MOST = 100 + DEMO_OWN  # bytes


@pytest.mark.parametrize("scheme", ["V/2", "V/3"])
@pytest.mark.parametrize("size", [512, 1024])
def test_bytes_per_cell_in_flight(size, scheme):
    a_job = job(size, size, scheme)
    assert len(a_job.cell.spreads) == 6
    order = ORDERS[a_job.order](size, size, 1, 0)
    die = make_die(a_job, make_plan(a_job), order, np.zeros(1, dtype=np.uint8))
    assert sum(array.nbytes for array in die) <= MOST * size * size


@pytest.fixture
def traced():
    """Python's and NumPy's allocations, counted from a state where everything is compiled and loaded."""
    list(program_dies(job(4, 4), 1, 1, lambda outcome: outcome.die))
    tracemalloc.start()
    yield tracemalloc
    tracemalloc.stop()


@pytest.mark.parametrize("workers", [1, 2])
def test_a_whole_run_needs_no_more_than_the_dies_in_flight(traced, workers):
    """Everything counts here: also the copies that the results of a die are made with. The order is there once more."""
    size = 512
    list(program_dies(job(size, size), workers, workers, lambda outcome: float(outcome.final_S.sum())))
    _, peak = traced.get_traced_memory()
    assert peak <= (workers * MOST + 4) * size * size


def test_many_dies_need_no_more_than_few(traced):
    a_job = job(24, 24, "V/2", passes=2)
    used = []
    for dies in (4, 4, 200):
        traced.reset_peak()
        total = sum(program_dies(a_job, dies, 2, lambda outcome: int(outcome.pulses.sum())))
        assert total > 1000 * dies
        gc.collect()  # a worker's die is freed with its thread, which may take a collection
        used.append(traced.get_traced_memory())
    (_, _), (kept_few, peak_few), (kept_many, peak_many) = used
    # one number kept for each cell of each die would be 900 kB; numba's own books grow a little at first
    assert kept_many <= kept_few + 150_000
    assert peak_many <= peak_few + 300_000
