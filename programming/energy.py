"""Energy of one pulse: what is dissipated in the selected, half-selected and other cells, and what the supplies deliver.

Elementary circuit laws with ideal wires: cell dissipation I V; a rail delivers its voltage times the current it sources, and
nothing where the current flows back into it (rails that cannot sink). Line sums of the conductance make it O(1) per pulse
(kept at a few voltages, with interpolation, where cells are not ohmic). They leave out the selected cell, and lag behind by
stress that is not settled yet.
"""

from __future__ import annotations

from programming.plan import HALF_SELECTED, REST, SELECTED, SUPPLY
from programming.slots import conductance, mean_conductance


def sum_at(plan, sums, line, voltage):
    """Sum of the conductances of a line at a voltage [S]: cubic between its nodes, unless the cells are ohmic."""
    points = plan.node_voltages.shape[0] - 1
    if points == 0:
        return sums[line, 0]
    place = (voltage - plan.node_voltages[1]) / (plan.node_voltages[2] - plan.node_voltages[1])
    first = min(max(int(place) - 1, 0), points - 4)
    t = place - first
    return (
        -(t - 1.0) * (t - 2.0) * (t - 3.0) / 6.0 * sums[line, first + 1]
        + t * (t - 2.0) * (t - 3.0) / 2.0 * sums[line, first + 2]
        - t * (t - 1.0) * (t - 3.0) / 2.0 * sums[line, first + 3]
        + t * (t - 1.0) * (t - 2.0) / 6.0 * sums[line, first + 4]
    )


def change_sums(plan, die, p, cell_state, row, column, sign):
    """Take a cell out of the line sums (sign -1) or put it back (+1)."""
    for node in range(plan.node_voltages.shape[0]):
        share = sign * conductance(cell_state, plan.node_voltages[node], p)
        die.row_sum[row, node] += share
        die.column_sum[column, node] += share
        die.all_sum[0, node] += share


def add_pulse_energy(plan, die, p, before, after, dose, row, column, direction, amplitude, width):
    """Add the energy of one pulse of the given amplitude [V] and width [s] to die.energy [J]."""
    voltage = plan.cell_sign[direction] * amplitude
    square_time = amplitude * amplitude * width
    selected = mean_conductance(before, after, dose, voltage, p)
    row_sum = sum_at(plan, die.row_sum, row, plan.row_fraction * voltage)
    column_sum = sum_at(plan, die.column_sum, column, plan.column_fraction * voltage)
    rest_sum = 0.0
    if plan.rest_fraction != 0.0:
        rest_voltage = plan.rest_fraction * voltage
        rest_sum = (
            sum_at(plan, die.all_sum, 0, rest_voltage)
            - sum_at(plan, die.row_sum, row, rest_voltage)
            - sum_at(plan, die.column_sum, column, rest_voltage)
        )
    row_current = plan.row_fraction * row_sum
    column_current = plan.column_fraction * column_sum
    rest_current = plan.rest_fraction * rest_sum
    die.energy[SELECTED] += square_time * selected
    die.energy[HALF_SELECTED] += square_time * (plan.row_fraction * row_current + plan.column_fraction * column_current)
    die.energy[REST] += square_time * plan.rest_fraction * rest_current
    # currents out of the three rails, per volt of the pulse; the selected bit line is ground
    word_rail = column_current + rest_current
    bit_rail = -row_current - rest_current
    die.energy[SUPPLY] += square_time * (
        selected + row_current + max(plan.word_fraction * word_rail, 0.0) + max(plan.bit_fraction * bit_rail, 0.0)
    )


def simpson_conductance(before, middle, after, voltage, p):
    """Time average of the conductance over a pulse by Simpson's rule [S]."""
    ends = conductance(before, voltage, p) + conductance(after, voltage, p)
    return (ends + 4.0 * conductance(middle, voltage, p)) / 6.0
