"""Run a job: dies in parallel on threads (the compiled loop releases the GIL), their results handed on in die order."""

from __future__ import annotations

import threading
from collections import deque
from collections.abc import Callable, Iterator
from concurrent.futures import CancelledError, Future, ThreadPoolExecutor
from typing import TypeVar

import numpy as np

from programming.die_memory import clear_die, make_die
from programming.fuse import fuse
from programming.job import ENERGY_PARTS, NOT_ADDRESSED, DieOutcome, Job
from programming.orders import ORDERS
from programming.plan import DISTURBANCE_S, FINAL_S, OWN_REST, OWN_ROW, Die
from programming.prepare import make_plan, make_rules

T = TypeVar("T")


def program_dies(job: Job, dies: int, workers: int, reduce: Callable[[DieOutcome], T]) -> Iterator[T]:
    """Simulate `dies` dies and yield reduce(outcome) in die order; the same values for any number of workers.

    `reduce` runs in the worker, on arrays that are overwritten by the worker's next die: it must copy what it keeps. At
    most two dies per worker are in flight. An exception in `reduce`, KeyboardInterrupt included, stops all workers early.
    """
    fused = fuse(job.cell.model, job.strategy)
    plan, rules = make_plan(job), make_rules(job)
    stop = np.zeros(1, dtype=np.uint8)
    own = threading.local()
    same_order = job.order != "random"
    order = ORDERS[job.order](job.rows, job.columns, job.seed, 0)

    def simulate(die_number: int) -> T:
        if not hasattr(own, "die"):
            own.die = make_die(job, plan, order.copy(), stop)
        if not same_order:
            own.die.order[:] = ORDERS[job.order](job.rows, job.columns, job.seed, die_number)
        clear_die(own.die, plan)
        if plan.clustered:
            fused.draw_clusters(plan, own.die, die_number)
        fused.program_die(plan, own.die, rules, die_number)
        if stop[0] != 0:
            raise CancelledError  # half done, and nobody waits for it
        return reduce(_outcome(own.die, die_number))

    pool = ThreadPoolExecutor(max_workers=workers, thread_name_prefix="die")
    try:
        waiting: deque[Future[T]] = deque()
        for die_number in range(dies):
            waiting.append(pool.submit(simulate, die_number))
            if len(waiting) >= 2 * workers:
                yield waiting.popleft().result()
        while waiting:
            yield waiting.popleft().result()
    finally:
        stop[0] = 1
        pool.shutdown(wait=True, cancel_futures=True)


def _outcome(die: Die, die_number: int) -> DieOutcome:
    """The results of a finished die as views into the worker's memory."""
    final = die.cells[:, FINAL_S]
    seen = float(final.sum()) * max(int(die.counter[0]), 1)
    assert len(ENERGY_PARTS) == die.energy.size
    assert NOT_ADDRESSED == 0
    return DieOutcome(
        die=die_number,
        target_S=die.target,
        final_S=final,
        disturbance_S=die.cells[:, DISTURBANCE_S],
        pulses=die.pulses,
        verifies=die.verifies,
        status=die.status,
        fault=die.fault,
        in_band=die.in_band,
        dose_share=die.cells[:, OWN_ROW : OWN_REST + 1],
        energy_J=die.energy,
        half_select_error=float(die.total[1]) / seen if seen > 0.0 else 0.0,
        time_s=float(die.total[0]),
        stress_dominates=bool(die.total[2] > 0.1 * np.count_nonzero(die.status)),
    )
