"""Has this cell stopped responding? A test on what its readings did, with a stated false-alarm rate.

Only pulses that should have moved the cell count: each pulse adds the dose that all but the slowest allowed share of healthy
cells would have got. When a cell as slow as that, and with as little room in its range, should have moved by twice what
reading noise can hide, and the readings still look like no movement, it is called stuck. Own method.
"""

from __future__ import annotations

import math

from programming.slots import advance, conductance, state_of

_ROUNDING = 1e-9  # of a reading: less than this is no movement


def hidden_change(plan, first):
    """How far two readings of an unmoved cell first read at `first` [S] may lie apart [S]: by noise, and one converter step."""
    variance = first * (plan.noise_linear / plan.reads + plan.verify_square * first)
    return plan.stuck_limit * math.sqrt(2.0 * max(variance, 0.0)) + plan.converter_step + _ROUNDING * first


def looks_stuck(plan, nominal, first, reading, hidden, evidence):
    """True if a cell first read at `first` [S] must have moved by now, and did not.

    hidden: hidden_change of `first` [S]. evidence: dose of a slow cell so far in this run of pulses (its sign is the
    direction). nominal: nominal parameters.
    """
    if evidence == 0.0 or abs(reading - first) > hidden:
        return False
    start = state_of(first, nominal)
    before = conductance(start, plan.read_voltage, nominal)
    change = abs(conductance(advance(start, evidence, nominal), plan.read_voltage, nominal) - before)
    # a cell of narrower range has less way to go, and may be at its end already
    if evidence > 0.0:
        room, way = plan.slow_high - first, plan.nominal_high - before
    else:
        room, way = first - plan.slow_low, before - plan.nominal_low
    change *= min(max(room, 0.0) / way, 1.0) if way > 0.0 else 0.0
    return visible_change(plan, first, hidden, change, evidence) > 2.0 * hidden


def visible_change(plan, first, hidden, change, evidence):
    """What is seen of a change [S] of a cell read at `first` [S]: a converter shows nothing beyond its ends."""
    if plan.converter_step == 0.0:
        return change
    top = (plan.converter_top + 0.5) * plan.converter_step
    if evidence > 0.0:
        return min(change, top - first)
    if first + hidden >= top:
        change -= max(plan.unseen_high - first, 0.0)
    return min(change, first - 0.5 * plan.converter_step)
