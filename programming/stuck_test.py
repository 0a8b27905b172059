"""Has this cell stopped responding? A test on what its readings did, with a stated false-alarm rate.

Only pulses that should have moved the cell count: each pulse adds the dose that all but the slowest allowed share of healthy
cells would have got. When a cell as slow as that should have moved by twice what reading noise can hide, and the readings
still look like no movement, it is called stuck. Own method.
"""

from __future__ import annotations

import math

from programming.slots import advance, conductance, state_of


def hidden_change(plan, first):
    """How far two readings of an unmoved cell first read at `first` [S] may lie apart [S], noise and converter included."""
    variance = first * (plan.noise_linear / plan.reads + plan.verify_square * first)
    variance += plan.converter_step * plan.converter_step / 12.0
    return plan.stuck_limit * math.sqrt(2.0 * max(variance, 0.0)) + plan.converter_step


def looks_stuck(plan, nominal, first, reading, hidden, evidence):
    """True if a cell first read at `first` [S] must have moved by now, and did not.

    hidden: hidden_change of `first` [S]. evidence: dose of a slow cell so far in this run of pulses (its sign is the
    direction). nominal: nominal parameters.
    """
    if evidence == 0.0 or abs(reading - first) > hidden:
        return False
    start = state_of(first, nominal)
    expected = conductance(advance(start, evidence, nominal), plan.read_voltage, nominal)
    return abs(expected - conductance(start, plan.read_voltage, nominal)) > 2.0 * hidden
