"""One die from its making to its score: draw the cells, visit them in order for every pass, settle all stress, measure."""

from __future__ import annotations

import math

from device_models.faults import place_faults
from device_models.random_numbers import DEVICE_SPREAD, INITIAL, TARGETS, truncated_normal, uniform
from programming.energy import change_sums
from programming.half_select import find_stress_rates, ledger_totals, settle
from programming.job import STUCK
from programming.plan import (
    DISTURBANCE_S,
    FINAL_S,
    OWN_COLUMN,
    OWN_REST,
    OWN_ROW,
    OWN_STATE,
    STATE,
    VARIED,
)
from programming.slots import bounds, conductance, record, state_of
from programming.visit import load_parameters, visit


def draw_cell(plan, die, die_number, cell):  # type: ignore[no-untyped-def]
    """The cell's own parameters and its state before programming."""
    for place in range(plan.varied.shape[0]):
        which = plan.varied[place]
        z = truncated_normal(plan.seed, die_number, cell, DEVICE_SPREAD, which, 0, plan.truncation)
        size = plan.spread_size[place]
        factor = 1.0 + size * z if plan.spread_law[place] == 0 else math.exp(size * z - 0.5 * size * size)
        die.cells[cell, VARIED + place] = plan.base_values[which] * factor
    p = load_parameters(plan, die, cell)
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


def draw_target(plan, die_number, cell):  # type: ignore[no-untyped-def]
    """Target of a cell [S]; NaN where it is not addressed."""
    if plan.target_kind == 2:
        return plan.matrix[cell]
    u = uniform(plan.seed, die_number, cell, TARGETS, 0, 0)
    if plan.target_kind == 1:
        return plan.low + u * (plan.high - plan.low)
    return plan.levels[int(u * plan.levels.shape[0])]


def make_die(plan, die, die_number):  # type: ignore[no-untyped-def]
    """Clear the worker's memory and draw a fresh die into it."""
    die.cells[:, :] = 0.0
    die.values[:] = plan.base_values
    for array in (die.row_sum, die.column_sum, die.all_sum, die.line_open, die.line_sum, die.all_open, die.all_reference):
        array[:, :] = 0.0
    die.row_count[:, :] = 0
    die.column_count[:, :] = 0
    for counts in (die.all_count, die.line_records, die.all_records, die.counter):
        counts[:] = 0
    die.pulses[:] = 0
    die.verifies[:] = 0
    die.last_visit[:] = 0
    die.status[:] = 0
    die.energy[:] = 0.0
    die.total[:] = 0.0
    die.top[0] = -1
    die.top[1] = -1
    place_faults(
        plan.seed,
        die_number,
        plan.rows,
        plan.columns,
        plan.stuck_low,
        plan.stuck_high,
        plan.clustered != 0,
        plan.cluster_size,
        die.fault,
    )
    for cell in range(die.target.shape[0]):
        draw_cell(plan, die, die_number, cell)
        die.target[cell] = draw_target(plan, die_number, cell)


def score_cell(plan, die, die_number, cell):  # type: ignore[no-untyped-def]
    """Settle a cell for the last time and write its results over its record."""
    p = load_parameters(plan, die, cell)
    row, column = cell // plan.columns, cell % plan.columns
    find_stress_rates(plan, die, p)
    totals = ledger_totals(plan, die, row, column)
    settle(plan, die, p, die_number, cell, row, column, plan.passes, totals)
    row_up, row_down, column_up, column_down, rest_up, rest_down, _, _ = totals
    final = conductance(die.cells[cell, STATE], plan.read_voltage, p)
    own = conductance(die.cells[cell, OWN_STATE], plan.read_voltage, p)
    row_dose = max(row_up + row_down - die.cells[cell, OWN_ROW], 0.0)
    column_dose = max(column_up + column_down - die.cells[cell, OWN_COLUMN], 0.0)
    rest_dose = max(rest_up + rest_down - die.cells[cell, OWN_REST], 0.0)
    dose = row_dose + column_dose + rest_dose
    share = 1.0 / dose if dose > 0.0 else 0.0
    die.cells[cell, OWN_ROW] = row_dose * share
    die.cells[cell, OWN_COLUMN] = column_dose * share
    die.cells[cell, OWN_REST] = rest_dose * share
    die.cells[cell, FINAL_S] = final
    die.cells[cell, DISTURBANCE_S] = final - own
    tolerance = max(plan.tolerance_S, plan.tolerance_fraction * die.target[cell])
    die.in_band[cell] = abs(final - die.target[cell]) <= tolerance


def program_die(plan, die, rules, die_number):  # type: ignore[no-untyped-def]
    """Simulate one die. Results are left in `die` (see programming.plan); ends early if die.stop is set."""
    make_die(plan, die, die_number)
    nominal = record(plan.base_values)
    for visit_pass in range(plan.passes):
        for place in range(die.order.shape[0]):
            cell = die.order[place]
            if math.isnan(die.target[cell]) or die.status[cell] == STUCK:
                continue
            if die.stop[0] != 0:
                return
            visit(plan, die, rules, nominal, die_number, cell, visit_pass)
    for cell in range(die.target.shape[0]):
        score_cell(plan, die, die_number, cell)
