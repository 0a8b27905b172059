"""One die from its making to its score: draw the cells, visit them in order for every pass, settle all stress, measure."""

from __future__ import annotations

import math

import numpy as np

from device_models.faults import place_faults, uniform_fault
from device_models.random_numbers import DEVICE_SPREAD, INITIAL, TARGETS, truncated_normal, uniform
from programming.calibration import spread_factor
from programming.energy import change_sums
from programming.job import STUCK
from programming.plan import OWN_STATE, STATE, VARIED
from programming.slots import bounds, record, state_of
from programming.visit import load_parameters, visit


def draw_clusters(plan, die, die_number):
    """Which cells of the die are stuck, into die.fault, where faults are clustered.

    Apart from the rest, and called before it: it allocates, which the loop may not, and few scenarios need it compiled.
    """
    place_faults(
        plan.seed,
        die_number,
        plan.rows,
        plan.columns,
        plan.stuck_low,
        plan.stuck_high,
        True,
        plan.cluster_size,
        die.fault,
    )


def draw_cell(plan, die, die_number, cell):
    """The cell's own parameters and its state before programming."""
    for place in range(plan.varied.shape[0]):
        which = plan.varied[place]
        z = truncated_normal(plan.seed, die_number, cell, DEVICE_SPREAD, which, 0, plan.truncation)
        factor = spread_factor(plan.spread_law[place], plan.spread_size[place], z)
        die.cells[cell, VARIED + place] = plan.base_values[which] * factor
    p = load_parameters(plan, die, cell)
    if plan.clustered == 0:
        die.fault[cell] = uniform_fault(plan.seed, die_number, cell, plan.stuck_low, plan.stuck_high)
    lowest, highest = bounds(p)
    if die.fault[cell] == 1:
        start = lowest
    elif die.fault[cell] == 2:
        start = highest
    else:
        z = truncated_normal(plan.seed, die_number, cell, INITIAL, 0, 0, plan.truncation)
        start = plan.initial_S * (1.0 + plan.initial_spread * z)
    die.cells[cell, STATE] = state_of(min(max(start, lowest), highest), p)
    die.cells[cell, OWN_STATE] = die.cells[cell, STATE]
    change_sums(plan, die, p, die.cells[cell, STATE], cell // plan.columns, cell % plan.columns, 1.0)


def draw_target(plan, die_number, cell):
    """Target of a cell [S]; NaN where it is not addressed."""
    if plan.target_kind == 2:
        return plan.matrix[cell]
    u = uniform(plan.seed, die_number, cell, TARGETS, 0, 0)
    if plan.target_kind == 1:
        return plan.low + u * (plan.high - plan.low)
    return plan.levels[int(u * plan.levels.shape[0])]


def make_die(plan, die, die_number):
    """Draw the cells and targets of a fresh die; its memory is cleared, and clustered faults are drawn, already."""
    for cell in range(die.target.shape[0]):
        draw_cell(plan, die, die_number, cell)
        die.target[cell] = draw_target(plan, die_number, cell)


def program_die(plan, die, rules, die_number):
    """Simulate one die. Results are left in `die` (see programming.plan); ends early if die.stop is set."""
    make_die(plan, die, die_number)
    nominal = record(plan.base_values)
    for visit_pass in range(plan.passes + 1):
        score = visit_pass == plan.passes
        for place in range(die.order.shape[0]):
            cell = np.int64(die.order[place])
            if not score and (math.isnan(die.target[cell]) or die.status[cell] == STUCK):
                continue
            if die.stop[0] != 0:
                return
            visit(plan, die, rules, nominal, die_number, cell, visit_pass, score)
