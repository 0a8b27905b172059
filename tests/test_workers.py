"""Workers, dies and orders: who does what, and when, never changes a digit; and a run ends when it should."""

import dataclasses
import threading
import time

import numpy as np
import pytest

from programming.job import Faults
from programming.orders import ORDERS
from programming.run import program_dies
from tests.jobs import job
from tests.test_loop_against_twin import copied

FAULTY = Faults(0.01, 0.02, "clustered", 4.0)


def outcomes(a_job, dies, workers, reduce=copied):
    return list(program_dies(a_job, dies, workers, reduce))


def busy_job(**changes):
    """Everything random is on: spreads, cycle and read noise, faults, random order, a second pass."""
    settings = {"order": "random", "passes": 2, "faults": FAULTY, "stuck_false_alarm": 1e-3, "scheme": "V/3"}
    return job(12, 9, **settings | changes)


def same(one, other):
    """Every field of two outcomes equal to the last bit."""
    for field in dataclasses.fields(one):
        left, right = getattr(one, field.name), getattr(other, field.name)
        assert np.array_equal(left, right, equal_nan=isinstance(left, np.ndarray) and left.dtype.kind == "f"), field.name


@pytest.fixture(scope="module")
def alone():
    """Seven dies by one worker."""
    return outcomes(busy_job(), 7, 1)


@pytest.mark.parametrize("workers", [2, 3])
def test_the_number_of_workers_changes_nothing(alone, workers):
    many = outcomes(busy_job(), 7, workers)
    assert [o.die for o in many] == list(range(7))
    for one, other in zip(alone, many, strict=True):
        same(one, other)


def test_the_dies_differ(alone):
    for field in ("target_S", "final_S", "pulses", "energy_J"):
        assert len({getattr(o, field).tobytes() for o in alone}) == 7


@pytest.mark.parametrize("slow", [0, 1, 2])
def test_dies_come_in_order_whichever_is_done_first(alone, slow):
    finished = []
    over = [threading.Event() for _ in range(7)]

    def late(outcome):
        if outcome.die == slow:
            assert over[outcome.die + 1].wait(60)  # the next die overtakes this one
        finished.append(outcome.die)
        over[outcome.die].set()
        return copied(outcome)

    got = outcomes(busy_job(), 7, 3, late)
    assert [o.die for o in got] == list(range(7))
    assert finished.index(slow + 1) < finished.index(slow)
    for one, other in zip(alone, got, strict=True):
        same(one, other)


def test_a_die_is_the_same_alone_and_in_a_long_run(alone):
    """A worker's memory is used again: nothing of one die is left for the next."""
    same(outcomes(busy_job(), 1, 1)[0], alone[0])
    fresh = outcomes(busy_job(), 7, 7)  # seven workers: some dies find memory that was never used
    for one, other in zip(alone, fresh, strict=True):
        same(one, other)


def test_at_most_two_dies_per_worker_are_in_flight():
    seen = []
    run = program_dies(busy_job(), 50, 2, lambda outcome: seen.append(outcome.die))
    next(run)
    time.sleep(0.2)
    assert len(seen) <= 4
    run.close()


class OwnError(Exception):
    """Raised by a test's own reduction."""


@pytest.mark.parametrize("error", [OwnError, KeyboardInterrupt])
@pytest.mark.parametrize("workers", [1, 3])
def test_an_error_in_the_reduction_comes_out_and_ends_the_run(error, workers):
    seen = []

    def fail(outcome):
        seen.append(outcome.die)
        if outcome.die == 2:
            raise error("on purpose")
        return outcome.die

    before = set(threading.enumerate())
    got = []
    with pytest.raises(error, match="on purpose"):
        got.extend(program_dies(busy_job(), 1000, workers, fail))
    assert got == [0, 1]
    assert len(seen) <= 2 + 2 * workers
    assert set(threading.enumerate()) == before  # no worker is left behind


def test_a_die_in_flight_is_stopped_in_the_middle():
    """The one worker has begun the next die when the error of the first is noticed: it must not finish it."""
    seen = []

    def fail(outcome):
        seen.append(outcome.die)
        raise OwnError("on purpose")

    with pytest.raises(OwnError, match="on purpose"):
        outcomes(job(400, 400), 2, 1, fail)  # most of a second per die
    assert seen == [0]


# ---- orders


@pytest.mark.parametrize("name", ORDERS)
@pytest.mark.parametrize(
    ("rows", "columns"), [(1, 1), (1, 7), (7, 1), (2, 2), (2, 3), (8, 8), (6, 9), (12, 5), (64, 48), (65, 20)]
)
def test_every_order_visits_each_cell_once(name, rows, columns):
    order = ORDERS[name](rows, columns, 3, 0)
    assert order.dtype == np.int32
    assert np.array_equal(np.sort(order), np.arange(rows * columns))


@pytest.mark.parametrize(
    ("rows", "columns"), [(2, 3), (3, 2), (3, 3), (8, 8), (6, 9), (12, 5), (64, 48), (64, 64), (65, 20), (7, 7)]
)
def test_interleaved_neighbours_share_no_line(rows, columns):
    row, column = np.divmod(ORDERS["interleaved"](rows, columns, 3, 0), columns)
    assert (np.diff(row) != 0).all()
    assert (np.diff(column) != 0).all()


def test_rows_and_columns_written_out():
    assert ORDERS["row_by_row"](2, 3, 0, 0).tolist() == [0, 1, 2, 3, 4, 5]
    assert ORDERS["column_by_column"](2, 3, 0, 0).tolist() == [0, 3, 1, 4, 2, 5]


def test_random_order_is_the_dies_own_and_no_strategys():
    """A function of seed and die only; that is all it is given, so no strategy can change it."""
    orders = [ORDERS["random"](16, 16, seed, die).tobytes() for seed in (1, 2) for die in range(4)]
    assert len(set(orders)) == 8
    assert ORDERS["random"](16, 16, 1, 2).tobytes() == orders[2]
    place = np.array([np.argsort(ORDERS["random"](4, 4, 1, die)) for die in range(4000)])
    # every cell is anywhere on average: mean place 7.5, variance (16 squared - 1) / 12
    error = np.sqrt((16**2 - 1) / 12 / 4000)
    assert np.abs(place.mean(axis=0) - 7.5).max() < 4.5 * error  # 16 cells: 4.5 standard errors


def test_the_order_changes_what_stress_does_and_not_what_is_drawn():
    rows, random = (outcomes(job(order=order), 2, 1) for order in ("row_by_row", "random"))
    for one, other in zip(rows, random, strict=True):
        assert np.array_equal(one.target_S, other.target_S)
        assert not np.array_equal(one.final_S, other.final_S)
