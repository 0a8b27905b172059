"""Half-select stress in O(1) per pulse: ledgers of pulses per line, settled when a cell is looked at.

What a cell suffers between two of its own visits depends only on how many pulses of each kind its word line, its bit line
and the whole array carried. A pulse adds to three counters. A cell's debt is the sum over the bins of its own rate at the
half-select voltage, less what it had already settled. Own method; the plain loop it replaces is in tests/twins.
"""

from __future__ import annotations

import math

import numpy as np

from device_models.random_numbers import STRESS, normal
from programming.plan import SETTLED_DOWN, SETTLED_UP, SQUARE_DOWN, SQUARE_UP, STATE
from programming.slots import advance_mixed, conductance, rate
from programming.stress_history import replay


def find_stress_rates(plan, die, p):
    """Fill die.stress_rate for the visited cell: from the highest amplitude down to where nothing moves it any more."""
    same = plan.row_fraction == plan.column_fraction
    for direction in range(2):
        first = plan.amplitude_first[direction]
        index = plan.amplitude_first[direction + 1] - 1
        sign = plan.cell_sign[direction]
        while index >= first:
            voltage = sign * plan.amplitudes[index]
            row = rate(plan.row_fraction * voltage, p)
            column = row if same else rate(plan.column_fraction * voltage, p)
            rest = 0.0
            if plan.rest_fraction != 0.0 and plan.mirrored == 0:
                rest = rate(plan.rest_fraction * voltage, p)
            if row == 0.0 and column == 0.0 and rest == 0.0:
                break
            die.stress_rate[0, index] = row
            die.stress_rate[1, index] = column
            die.stress_rate[2, index] = rest
            index -= 1
        die.stress_low[direction] = index + 1
    if plan.mirrored != 0:
        mirror_rest_rates(plan, die)


def mirror_rest_rates(plan, die):
    """Rates of the rest where it sees the same voltages as the rows do in the other direction (V/3)."""
    half = plan.amplitude_first[1]
    low = min(die.stress_low[0], die.stress_low[1] - half)
    for direction in range(2):
        for index in range(half * direction + low, die.stress_low[direction]):
            die.stress_rate[0, index] = 0.0
            die.stress_rate[1, index] = 0.0
        die.stress_low[direction] = half * direction + low
    for index in range(low, half):
        die.stress_rate[2, index] = die.stress_rate[0, half + index]
        die.stress_rate[2, half + index] = die.stress_rate[0, index]


def ledger_totals(plan, die, row, column):
    """Doses of the visited cell from all pulses so far: up and down by class (row, column, rest), and sums of squares."""
    row_up = row_down = column_up = column_down = rest_up = rest_down = square_up = square_down = 0.0
    for direction in range(2):
        amplitude_first = plan.amplitude_first[direction]
        widths = plan.width_first[direction + 1] - plan.width_first[direction]
        first = plan.bin_first[direction] + (die.stress_low[direction] - amplitude_first) * widths
        end = plan.bin_first[direction] + (die.top[direction] + 1 - amplitude_first) * widths
        for bin_ in range(first, end):
            index = plan.bin_amplitude[bin_]
            time = plan.bin_width[bin_]
            row_pulses = die.row_count[row, bin_]
            column_pulses = die.column_count[column, bin_]
            rest_pulses = die.all_count[bin_] - row_pulses - column_pulses
            row_dose = die.stress_rate[0, index] * time
            column_dose = die.stress_rate[1, index] * time
            rest_dose = die.stress_rate[2, index] * time
            row_sum, column_sum, rest_sum = row_pulses * row_dose, column_pulses * column_dose, rest_pulses * rest_dose
            up, down = max(row_dose, 0.0), max(-row_dose, 0.0)
            row_up += row_pulses * up
            row_down += row_pulses * down
            square_up += row_sum * up
            square_down -= row_sum * down
            up, down = max(column_dose, 0.0), max(-column_dose, 0.0)
            column_up += column_pulses * up
            column_down += column_pulses * down
            square_up += column_sum * up
            square_down -= column_sum * down
            up, down = max(rest_dose, 0.0), max(-rest_dose, 0.0)
            rest_up += rest_pulses * up
            rest_down += rest_pulses * down
            square_up += rest_sum * up
            square_down -= rest_sum * down
    return row_up, row_down, column_up, column_down, rest_up, rest_down, square_up, square_down


def add_own_pulse(plan, die, totals, direction, index, width):
    """Ledger totals of the visited cell after one of its own pulses: counted on its lines, but no stress to itself."""
    if index < die.stress_low[direction]:
        return totals
    row_up, row_down, column_up, column_down, rest_up, rest_down, square_up, square_down = totals
    row_dose = die.stress_rate[0, index] * width
    column_dose = die.stress_rate[1, index] * width
    rest_dose = die.stress_rate[2, index] * width  # all less row less column: 1 - 1 - 1 = -1 for an own pulse
    row_up += max(row_dose, 0.0)
    row_down += max(-row_dose, 0.0)
    column_up += max(column_dose, 0.0)
    column_down += max(-column_dose, 0.0)
    rest_up -= max(rest_dose, 0.0)
    rest_down -= max(-rest_dose, 0.0)
    line_square = row_dose * row_dose + column_dose * column_dose
    rest_square = rest_dose * rest_dose
    square_up += (line_square if row_dose > 0.0 else 0.0) - (rest_square if rest_dose > 0.0 else 0.0)
    square_down += (line_square if row_dose < 0.0 else 0.0) - (rest_square if rest_dose < 0.0 else 0.0)
    return row_up, row_down, column_up, column_down, rest_up, rest_down, square_up, square_down


def noisy_stress(plan, die_number, cell, visit_pass, polarity, dose, square):
    """A sum of noisy doses, drawn once with the mean and variance of the sum; exact in law for a single pulse."""
    if dose <= 0.0 or square <= 0.0 or plan.cycle_law == 0 or plan.stress_noise == 0:
        return dose
    z = normal(plan.seed, die_number, cell, STRESS, visit_pass, polarity)
    variance = plan.cycle_spread * plan.cycle_spread * square
    if plan.cycle_law == 1:
        return dose + math.sqrt(variance) * z
    log_variance = math.log1p(variance / (dose * dose))
    return dose * math.exp(math.sqrt(log_variance) * z - 0.5 * log_variance)


def settle(plan, die, p, die_number, cell, row, column, visit_pass, totals):
    """Apply the stress a cell has not yet settled, to its state. `totals` as from ledger_totals, of this moment."""
    row_up, row_down, column_up, column_down, rest_up, rest_down, square_up, square_down = totals
    up = row_up + column_up + rest_up - die.cells[cell, SETTLED_UP]
    down = row_down + column_down + rest_down - die.cells[cell, SETTLED_DOWN]
    # what is left of a difference of equal sums is rounding, not dose
    if up < 1e-15 * (row_up + column_up + abs(rest_up)):
        up = 0.0
    if down < 1e-15 * (row_down + column_down + abs(rest_down)):
        down = 0.0
    if (up == 0.0 and down == 0.0) or die.fault[cell] != 0:
        return
    noisy_up = noisy_stress(plan, die_number, cell, visit_pass, 0, up, square_up - die.cells[cell, SQUARE_UP])
    noisy_down = noisy_stress(plan, die_number, cell, visit_pass, 1, down, square_down - die.cells[cell, SQUARE_DOWN])
    before = die.cells[cell, STATE]
    if noisy_up > 0.0 and noisy_down > 0.0 and plan.history != 0 and up + down > plan.history_step * plan.unit_dose:
        after = replay(plan, die, p, cell, row, column, totals, up, down, noisy_up / up, noisy_down / down)
    else:
        # a few pulses of normal noise may come out below zero: a dose the other way
        rising = max(noisy_up, 0.0) + max(-noisy_down, 0.0)
        after = advance_mixed(before, rising, max(noisy_down, 0.0) + max(-noisy_up, 0.0), p)
    die.cells[cell, STATE] = after
    change = conductance(after, plan.read_voltage, p) - conductance(before, plan.read_voltage, p)
    die.total[1] += abs(change) * (die.counter[0] - np.int64(die.settled_at[cell]))


def mark_settled(die, cell, totals):
    """Note that a cell's stress is settled up to `totals`."""
    row_up, row_down, column_up, column_down, rest_up, rest_down, square_up, square_down = totals
    die.cells[cell, SETTLED_UP] = row_up + column_up + rest_up
    die.cells[cell, SETTLED_DOWN] = row_down + column_down + rest_down
    die.cells[cell, SQUARE_UP] = square_up
    die.cells[cell, SQUARE_DOWN] = square_down
    die.settled_at[cell] = np.uint32(die.counter[0])
