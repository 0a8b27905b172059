"""One visit to one cell: settle its stress, then verify, pulse, decide, until the strategy or the loop ends it."""

from __future__ import annotations

import math

import numpy as np

from device_models.random_numbers import CYCLE, normal
from programming.energy import add_pulse_energy, change_sums
from programming.half_select import add_own_pulse, find_stress_rates, ledger_totals, mark_settled, settle
from programming.job import ACCEPTED, GAVE_UP, STUCK
from programming.plan import DISTURBANCE_S, FINAL_S, OWN_COLUMN, OWN_REST, OWN_ROW, OWN_STATE, STATE, VARIED
from programming.reading import read_cell
from programming.slots import advance, conductance, decide, rate, record
from programming.strategy_contract import ACCEPT, GIVE_UP, READ, SET
from programming.stress_history import note_pulse
from programming.stuck_test import hidden_change, looks_stuck


def load_parameters(plan, die, cell):
    """Parameter record of a cell: its own values where they vary, else the nominal ones."""
    for place in range(plan.varied.shape[0]):
        die.values[plan.varied[place]] = die.cells[cell, VARIED + place]
    return record(die.values)


def noisy_dose(plan, die_number, cell, event, dose):
    """Dose of one own pulse with its cycle-to-cycle noise."""
    if plan.cycle_law == 0 or dose == 0.0:
        return dose
    z = normal(plan.seed, die_number, cell, CYCLE, event, 0)
    if plan.cycle_law == 1:
        return dose * (1.0 + plan.cycle_spread * z)
    return dose * math.exp(plan.cycle_sigma * z - 0.5 * plan.cycle_sigma * plan.cycle_sigma)


def nearest(steps, direction, first, end, wanted):
    """Index (from `first` on, below `end`) of the grid value that a wanted magnitude is rounded to.

    steps: see Plan. The last value of a grid need not lie on its even steps.
    """
    start, stop, spacing = steps[direction, 0], steps[direction, 1], steps[direction, 2]
    if spacing <= 0.0 or not wanted > start:
        return first
    if wanted >= stop:
        return end - 1
    return min(first + int((wanted - start) / spacing + 0.5), end - 1)


def give_pulse(plan, die, p, die_number, cell, row, column, direction, index, width_index, bin_):
    """One pulse on the selected cell: state, ledgers, energy and time."""
    amplitude = plan.amplitudes[index]
    width = plan.widths[width_index]
    before = die.cells[cell, STATE]
    after = before
    dose = 0.0
    if die.fault[cell] == 0:
        dose = rate(plan.cell_sign[direction] * amplitude, p) * width
        dose = noisy_dose(plan, die_number, cell, np.int64(die.pulses[cell]), dose)
        after = advance(before, dose, p)
        die.cells[cell, STATE] = after
    die.pulses[cell] += np.uint32(1)
    die.row_count[row, bin_] += 1
    die.column_count[column, bin_] += 1
    die.all_count[bin_] += 1
    die.counter[0] += 1
    die.top[direction] = max(die.top[direction], index)
    add_pulse_energy(plan, die, p, before, after, dose, row, column, direction, amplitude, width)
    die.total[0] += width + plan.overhead[direction]
    if plan.history != 0:
        note_pulse(plan, die, row, column, direction, bin_)


def mark_own_pulse(die, cell, totals):
    """From here on, what moves the cell is disturbance: note its state and the stress of each class so far."""
    row_up, row_down, column_up, column_down, rest_up, rest_down, _, _ = totals
    die.cells[cell, OWN_STATE] = die.cells[cell, STATE]
    die.cells[cell, OWN_ROW] = row_up + row_down
    die.cells[cell, OWN_COLUMN] = column_up + column_down
    die.cells[cell, OWN_REST] = rest_up + rest_down


def program_cell(plan, die, rules, p, nominal, die_number, cell, row, column, totals):
    """Write-verify on one settled cell. Returns (ledger totals after it, pulses given); sets die.status."""
    target = die.target[cell]
    tolerance = max(plan.tolerance_S, plan.tolerance_fraction * target)
    die.memory[:] = 0.0
    reading = read_cell(plan, die, p, die_number, cell, row, column) if plan.verifies != 0 else math.nan
    first = reading
    hidden = evidence = 0.0
    run, given = -1, 0
    spare_reads = 64 * plan.max_pulses
    status = GAVE_UP
    while True:
        action, amplitude, width, _gate = decide(target, tolerance, reading, given, die.memory, rules)
        if action == ACCEPT:
            status = ACCEPTED
            break
        if action == GIVE_UP or (action == READ and spare_reads == 0) or (action != READ and given >= plan.max_pulses):
            break
        if action == READ:
            spare_reads -= 1
            reading = read_cell(plan, die, p, die_number, cell, row, column)
            continue
        direction = 0 if action == SET else 1
        a_first, a_end = plan.amplitude_first[direction], plan.amplitude_first[direction + 1]
        w_first, w_end = plan.width_first[direction], plan.width_first[direction + 1]
        index = nearest(plan.amplitude_steps, direction, a_first, a_end, amplitude)
        width_index = nearest(plan.width_steps, direction, w_first, w_end, width)
        bin_ = plan.bin_first[direction] + (index - a_first) * (w_end - w_first) + width_index - w_first
        if direction != run:
            run, first, evidence = direction, reading, 0.0
            hidden = hidden_change(plan, first)
        give_pulse(plan, die, p, die_number, cell, row, column, direction, index, width_index, bin_)
        totals = add_own_pulse(plan, die, totals, direction, index, plan.widths[width_index])
        given += 1
        if plan.verifies == 0:
            continue
        reading = read_cell(plan, die, p, die_number, cell, row, column)
        evidence += plan.slow_dose[bin_]
        if looks_stuck(plan, nominal, first, reading, hidden, evidence):
            status = STUCK
            break
    die.status[cell] = status
    return totals, given


def dose_since(total, before):
    """What was added to a sum of doses; a difference in the last digits is rounding, not dose."""
    dose = total - before
    return dose if dose > 1e-12 * total else 0.0


def score_cell(plan, die, p, cell, totals):
    """Write the results of a settled cell over its record."""
    row_up, row_down, column_up, column_down, rest_up, rest_down, _, _ = totals
    final = conductance(die.cells[cell, STATE], plan.read_voltage, p)
    own = conductance(die.cells[cell, OWN_STATE], plan.read_voltage, p)
    row_dose = dose_since(row_up + row_down, die.cells[cell, OWN_ROW])
    column_dose = dose_since(column_up + column_down, die.cells[cell, OWN_COLUMN])
    rest_dose = dose_since(rest_up + rest_down, die.cells[cell, OWN_REST])
    dose = row_dose + column_dose + rest_dose
    share = 1.0 / dose if dose > 0.0 else 0.0
    die.cells[cell, OWN_ROW] = row_dose * share
    die.cells[cell, OWN_COLUMN] = column_dose * share
    die.cells[cell, OWN_REST] = rest_dose * share
    die.cells[cell, FINAL_S] = final
    die.cells[cell, DISTURBANCE_S] = final - own
    tolerance = max(plan.tolerance_S, plan.tolerance_fraction * die.target[cell])
    error = final - die.target[cell]
    die.in_band[cell] = abs(error) <= tolerance
    programmed = die.status[cell] == ACCEPTED or die.status[cell] == GAVE_UP
    if programmed and abs(error) > tolerance and abs(final - own) > abs(error - (final - own)):
        die.total[2] += 1.0


def visit(plan, die, rules, nominal, die_number, cell, visit_pass, score):
    """Settle a cell's stress; then program it, or (score) take down how it ended."""
    row, column = cell // plan.columns, cell % plan.columns
    p = load_parameters(plan, die, cell)
    stale = die.cells[cell, STATE]
    find_stress_rates(plan, die, p)
    totals = ledger_totals(plan, die, row, column)
    settle(plan, die, p, die_number, cell, row, column, visit_pass, totals)
    if score:
        score_cell(plan, die, p, cell, totals)
        return
    change_sums(plan, die, p, stale, row, column, -1.0)
    totals, given = program_cell(plan, die, rules, p, nominal, die_number, cell, row, column, totals)
    mark_settled(die, cell, totals)
    if given > 0:
        mark_own_pulse(die, cell, totals)
    change_sums(plan, die, p, die.cells[cell, STATE], row, column, 1.0)
