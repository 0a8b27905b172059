"""The programming loop in plain Python, for tests of rare paths with strategies of their own: slow, but nothing to compile."""

from dataclasses import replace
from unittest import mock

import numpy as np

from programming import die_loop, fuse
from programming.die_memory import clear_die, make_die
from programming.job import DieOutcome, Job
from programming.orders import ORDERS
from programming.prepare import make_plan, make_rules
from programming.run import _outcome
from programming.strategy_contract import CellStrategy


def not_compiled(**_options):
    return lambda function: function


def interpret(job: Job, planned_with: CellStrategy | None = None, die: int = 0) -> DieOutcome:
    """One die of a small job, uncompiled.

    planned_with: a strategy of the same grids and memory whose compiled functions are there already; the plan is made with it.
    """
    fillings = fuse.slot_fillings(job.cell.model, job.strategy)
    with mock.patch.object(fuse, "njit", not_compiled):
        loop = fuse.fill_slots(die_loop.program_die, fillings)
    planned = replace(job, strategy=planned_with or job.strategy)
    plan = make_plan(planned)._replace(verifies=int(job.strategy.verifies))
    memory = make_die(job, plan, ORDERS[job.order](job.rows, job.columns, job.seed, die), np.zeros(1, dtype=np.uint8))
    clear_die(memory, plan)
    if plan.clustered:
        die_loop.draw_clusters(plan, memory, die)
    loop(plan, memory, make_rules(job), die)
    return _outcome(memory, die)
