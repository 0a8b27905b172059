"""The order of recent stress, for cells that both polarities disturb.

Settling treats doses of both polarities as finely interleaved. Where stress is mild that is right; where it wrecks the array,
the last few units of dose leave their order in the state. So every line keeps a ring of records (moment, dose up,
dose down), in units of what a weak cell would get, one each time `history_step` units have come together. A cell with a
large mixed debt replays the records since its last settling in order, scaled to its own doses; what is older than the
records comes first, interleaved. Own method; checked against the plain loop.
"""

from __future__ import annotations

import numpy as np

from device_models.compiled import compiled
from programming.plan import STATE
from programming.slots import advance, advance_mixed


@compiled
def close_record(open_dose, summed, moments, doses, count, line, moment, enough):
    """Turn a line's open record into a closed one, if it holds enough; the oldest makes room."""
    if open_dose[line, 0] + open_dose[line, 1] < enough:
        return
    place = count[line] % moments.shape[1]
    moments[line, place] = moment
    for column in range(open_dose.shape[1]):
        doses[line, place, column] = open_dose[line, column]
        summed[line, column] += open_dose[line, column]
        open_dose[line, column] = 0.0
    count[line] += 1


def note_pulse(plan, die, row, column, direction, bin_):
    """Add one pulse to the open records of its lines and of the array; close those that hold enough."""
    moment = die.counter[0]
    enough = plan.history_step
    line = plan.rows + column
    rest_polarity = direction if plan.rest_fraction > 0.0 else 1 - direction
    rest_dose = plan.reference_dose[2, bin_]
    die.line_open[row, direction] += plan.reference_dose[0, bin_]
    die.line_open[row, 2 + rest_polarity] += rest_dose
    die.line_open[line, direction] += plan.reference_dose[1, bin_]
    die.line_open[line, 2 + rest_polarity] += rest_dose
    die.all_open[0, rest_polarity] += rest_dose
    close_record(die.line_open, die.line_sum, die.line_moment, die.line_dose, die.line_records, row, moment, enough)
    close_record(die.line_open, die.line_sum, die.line_moment, die.line_dose, die.line_records, line, moment, enough)
    close_record(die.all_open, die.all_sum_dose, die.all_moment, die.all_dose, die.all_records, 0, moment, 0.25 * enough)


@compiled
def recent(moments, count, line, since):
    """How many records of a line are younger than the moment `since`, and whether some that were are lost."""
    kept = min(count[line], moments.shape[1])
    for records in range(kept):
        if moments[line, (count[line] - 1 - records) % moments.shape[1]] <= since:
            return records, False
    return kept, count[line] > moments.shape[1]


@compiled
def recent_dose(doses, count, line, records, column):
    """Sum of one column over the youngest `records` of a line."""
    total = 0.0
    for back in range(records):
        total += doses[line, (count[line] - 1 - back) % doses.shape[1], column]
    return total


@compiled
def own_ratio(total, reference):
    """How many times the reference dose a cell gets: from the totals of both since the start."""
    return max(total, 0.0) / reference if reference > 0.0 else 0.0


def class_ratios(die, row, line, totals, polarity):
    """The cell's own ratios for its row, its column and the rest, of one polarity (0 up, 1 down)."""
    rest = die.all_sum_dose[0, polarity] - die.line_sum[row, 2 + polarity] - die.line_sum[line, 2 + polarity]
    return (
        own_ratio(totals[polarity], die.line_sum[row, polarity]),
        own_ratio(totals[2 + polarity], die.line_sum[line, polarity]),
        own_ratio(totals[4 + polarity], rest),
    )


def in_records(die, row, line, counts, ratios, polarity):
    """The cell's dose of one polarity in the records to be replayed."""
    row_n, col_n, all_n = counts
    row_ratio, col_ratio, rest_ratio = ratios
    doses, count = die.line_dose, die.line_records
    rest = recent_dose(die.all_dose, die.all_records, 0, all_n, polarity)
    rest -= recent_dose(doses, count, row, row_n, 2 + polarity) + recent_dose(doses, count, line, col_n, 2 + polarity)
    return (
        row_ratio * recent_dose(doses, count, row, row_n, polarity)
        + col_ratio * recent_dose(doses, count, line, col_n, polarity)
        + rest_ratio * max(rest, 0.0)
    )


def next_record(die, row, line, row_n, col_n, all_n):
    """(whose, place) of the oldest record not yet walked: 0 the row's, 1 the column's, 2 the array's."""
    never = 1 << 62
    row_place = (die.line_records[row] - row_n) % die.line_moment.shape[1]
    col_place = (die.line_records[line] - col_n) % die.line_moment.shape[1]
    all_place = (die.all_records[0] - all_n) % die.all_moment.shape[1]
    row_moment = np.int64(die.line_moment[row, row_place]) if row_n > 0 else never
    col_moment = np.int64(die.line_moment[line, col_place]) if col_n > 0 else never
    all_moment = np.int64(die.all_moment[0, all_place]) if all_n > 0 else never
    if min(row_moment, col_moment) > all_moment:
        return 2, all_place
    return (0, row_place) if row_moment <= col_moment else (1, col_place)


def rest_correction(die, row, line, row_n, col_n, all_n):
    """Factors (up, down) on the rest's records, so that their sum is right although they are walked one by one.

    What a line's record takes out may exceed what the array's records have brought so far, and then stays owed at the end.
    """
    waiting_up = waiting_down = applied_up = applied_down = 0.0
    while row_n + col_n + all_n > 0:
        whose, place = next_record(die, row, line, row_n, col_n, all_n)
        if whose < 2:
            own = row if whose == 0 else line
            waiting_up -= die.line_dose[own, place, 2]
            waiting_down -= die.line_dose[own, place, 3]
            row_n, col_n = row_n - (1 - whose), col_n - whose
        else:
            waiting_up += die.all_dose[0, place, 0]
            waiting_down += die.all_dose[0, place, 1]
            applied_up += max(waiting_up, 0.0)
            applied_down += max(waiting_down, 0.0)
            waiting_up, waiting_down = min(waiting_up, 0.0), min(waiting_down, 0.0)
            all_n -= 1
    up = (applied_up + waiting_up) / applied_up if applied_up > 0.0 else 1.0
    down = (applied_down + waiting_down) / applied_down if applied_down > 0.0 else 1.0
    return max(up, 0.0), max(down, 0.0)


def replay(plan, die, p, cell, row, column, totals, up, down, noise_up, noise_down):
    """State of a cell after its unsettled doses `up` and `down`, the recent ones in order.

    A pulse on one of the cell's own lines is in the record of the array too; there it is taken out again.
    """
    since = np.int64(die.settled_at[cell])
    line = plan.rows + column
    row_n, row_lost = recent(die.line_moment, die.line_records, row, since)
    col_n, col_lost = recent(die.line_moment, die.line_records, line, since)
    all_n, all_lost = recent(die.all_moment, die.all_records, 0, since)
    lost = row_lost or col_lost or all_lost
    ups = class_ratios(die, row, line, totals, 0)
    downs = class_ratios(die, row, line, totals, 1)
    recent_up = in_records(die, row, line, (row_n, col_n, all_n), ups, 0)
    recent_down = in_records(die, row, line, (row_n, col_n, all_n), downs, 1)
    # records that reach back to the last settling hold the whole debt; rounded records may hold a little too much
    scale_up = up / recent_up if recent_up > 0.0 and (not lost or recent_up > up) else 1.0
    scale_down = down / recent_down if recent_down > 0.0 and (not lost or recent_down > down) else 1.0
    older_up, older_down = max(up - scale_up * recent_up, 0.0), max(down - scale_down * recent_down, 0.0)
    state = advance_mixed(die.cells[cell, STATE], older_up * noise_up, older_down * noise_down, p)
    scale_up *= noise_up
    scale_down *= noise_down
    rest_up, rest_down = 0.0, 0.0
    if all_n > 0:
        rest_up, rest_down = rest_correction(die, row, line, row_n, col_n, all_n)
    waiting_up = waiting_down = 0.0
    while row_n + col_n + all_n > 0:
        whose, place = next_record(die, row, line, row_n, col_n, all_n)
        if whose < 2:
            own = row if whose == 0 else line
            dose_up = (ups[0] if whose == 0 else ups[1]) * die.line_dose[own, place, 0]
            dose_down = (downs[0] if whose == 0 else downs[1]) * die.line_dose[own, place, 1]
            waiting_up -= die.line_dose[own, place, 2]
            waiting_down -= die.line_dose[own, place, 3]
            row_n, col_n = row_n - (1 - whose), col_n - whose
        else:
            waiting_up += die.all_dose[0, place, 0]
            waiting_down += die.all_dose[0, place, 1]
            dose_up = rest_up * ups[2] * max(waiting_up, 0.0)
            dose_down = rest_down * downs[2] * max(waiting_down, 0.0)
            waiting_up, waiting_down = min(waiting_up, 0.0), min(waiting_down, 0.0)
            all_n -= 1
        state = advance(state, 0.5 * scale_up * dose_up, p)
        state = advance(state, -scale_down * dose_down, p)
        state = advance(state, 0.5 * scale_up * dose_up, p)
    return state


def alternate(state, up, down, p):
    """Stand-in for a model's own advance_mixed: symmetric alternating steps, fine for the last 64 parts of the dose."""
    if down == 0.0:
        return advance(state, up, p)
    if up == 0.0:
        return advance(state, -down, p)
    for part in range(2):
        # a first coarse half forgets itself in a saturating cell; the second half is stepped finely
        steps = 16 if part == 0 else 64
        for _ in range(steps):
            state = advance(state, 0.25 * up / steps, p)
            state = advance(state, -0.5 * down / steps, p)
            state = advance(state, 0.25 * up / steps, p)
    return state
