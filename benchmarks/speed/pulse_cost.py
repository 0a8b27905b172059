"""What one pulse with its verify costs, on one thread: noise, half-select accounting, energy and bookkeeping all on."""

from __future__ import annotations

import time
from dataclasses import dataclass, replace

import numpy as np

from programming.die_memory import clear_die, make_die
from programming.fuse import fuse
from programming.job import Job, Targets
from programming.orders import ORDERS
from programming.plan import DISTURBANCE_S
from programming.prepare import make_plan, make_rules


@dataclass(frozen=True)
class PulseCost:
    """Times per pulse [ns] and what the die looked like.

    whole: all of a die's time over its pulses. pulse: the same less making and scoring the die. stressed: mean size of
    the disturbance [S]. both: whether stress of both polarities occurs.
    """

    whole: float
    pulse: float
    make_per_cell: float
    pulses_per_cell: float
    stressed: float
    both: bool


def pulse_cost(job: Job, repeats: int = 5) -> PulseCost:
    """Best of several runs of one die."""
    best, die = _best_time(job, repeats)
    pulses = int(die.pulses.sum())
    stressed = float(np.abs(die.cells[:, DISTURBANCE_S]).mean())
    nothing = Targets("matrix", job.targets.low_S, job.targets.high_S, matrix_S=np.full((job.rows, job.columns), np.nan))
    empty, _ = _best_time(replace(job, targets=nothing), repeats)
    return PulseCost(
        best / pulses * 1e9,
        (best - empty) / pulses * 1e9,
        empty / die.target.size * 1e9,
        pulses / die.target.size,
        stressed,
        bool(make_plan(job).history),
    )


def _best_time(job: Job, repeats: int):  # type: ignore[no-untyped-def]
    plan, rules = make_plan(job), make_rules(job)
    die = make_die(job, plan, ORDERS[job.order](job.rows, job.columns, job.seed, 0), np.zeros(1, np.uint8))
    loop = fuse(job.cell.model, job.strategy).program_die
    times = []
    for _ in range(repeats):
        clear_die(die, plan)
        start = time.perf_counter()
        loop(plan, die, rules, 0)
        times.append(time.perf_counter() - start)
    return min(times), die
