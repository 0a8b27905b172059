"""The order of recent stress, for cells that both polarities disturb.

Settling treats doses of both polarities as finely interleaved. Where stress is mild that is right; where it wrecks the array,
the last few units of dose leave their order in the state. So every line keeps a ring of records (number of the visit, dose
up, dose down), in units of what a weak cell would get, one each time `history_step` units have come together. A cell with a
large mixed debt replays the records since its last settling in order, scaled to its own doses; what is older than the
records comes first, interleaved. Own method; checked against the plain loop.
"""

from __future__ import annotations

import numpy as np

from device_models.compiled import compiled
from programming.plan import STATE
from programming.slots import advance, advance_mixed


def note_pulse(plan, die, row, column, direction, bin_):  # type: ignore[no-untyped-def]
    """Add one pulse to the open records of its lines and of the array."""
    rest_polarity = direction if plan.rest_fraction > 0.0 else 1 - direction
    die.line_open[row, direction] += plan.reference_dose[0, bin_]
    die.line_open[plan.rows + column, direction] += plan.reference_dose[1, bin_]
    die.all_open[0, rest_polarity] += plan.reference_dose[2, bin_]


@compiled
def close_record(open_dose, summed, visits, doses, count, line, visit, enough):  # type: ignore[no-untyped-def]
    """Turn a line's open record into a closed one, if it holds enough; the oldest makes room."""
    up, down = open_dose[line, 0], open_dose[line, 1]
    if up + down < enough:
        return
    place = count[line] % visits.shape[1]
    visits[line, place] = visit
    doses[line, place, 0] = up
    doses[line, place, 1] = down
    count[line] += 1
    summed[line, 0] += up
    summed[line, 1] += down
    open_dose[line, 0] = 0.0
    open_dose[line, 1] = 0.0


def close_records(plan, die, row, column):  # type: ignore[no-untyped-def]
    """After a visit: close the records of its two lines and of the array, where they hold enough."""
    visit = die.counter[0]
    enough = plan.history_step
    for line in (row, plan.rows + column):
        close_record(die.line_open, die.line_sum, die.line_visit, die.line_dose, die.line_records, line, visit, enough)
    close_record(die.all_open, die.all_reference, die.all_visit, die.all_dose, die.all_records, 0, visit, enough * 0.25)


@compiled
def recent(visits, doses, count, line, since):  # type: ignore[no-untyped-def]
    """(number of records after visit `since`, their dose up, their dose down, whether older ones were lost)."""
    records = 0
    up = down = 0.0
    kept = min(count[line], visits.shape[1])
    while records < kept:
        place = (count[line] - 1 - records) % visits.shape[1]
        if visits[line, place] <= since:
            return records, up, down, False
        up += doses[line, place, 0]
        down += doses[line, place, 1]
        records += 1
    return records, up, down, count[line] > visits.shape[1]


@compiled
def own_ratio(total, reference):  # type: ignore[no-untyped-def]
    """How many times the reference dose a cell gets: from the totals of both since the start."""
    return total / reference if reference > 0.0 else 0.0


def replay(plan, die, p, cell, row, column, totals, up, down, noise_up, noise_down):  # type: ignore[no-untyped-def]
    """State of a cell after its unsettled doses `up` and `down`, the recent ones in order."""
    row_up, row_down, column_up, column_down, rest_up, rest_down, _, _ = totals
    since = np.int64(die.last_visit[cell])
    line = plan.rows + column
    row_n, row_u, row_d, row_lost = recent(die.line_visit, die.line_dose, die.line_records, row, since)
    col_n, col_u, col_d, col_lost = recent(die.line_visit, die.line_dose, die.line_records, line, since)
    all_n, all_u, all_d, all_lost = recent(die.all_visit, die.all_dose, die.all_records, 0, since)
    row_ru, row_rd = own_ratio(row_up, die.line_sum[row, 0]), own_ratio(row_down, die.line_sum[row, 1])
    col_ru, col_rd = own_ratio(column_up, die.line_sum[line, 0]), own_ratio(column_down, die.line_sum[line, 1])
    all_ru, all_rd = own_ratio(rest_up, die.all_reference[0, 0]), own_ratio(rest_down, die.all_reference[0, 1])
    recent_up = row_ru * row_u + col_ru * col_u + all_ru * all_u
    recent_down = row_rd * row_d + col_rd * col_d + all_rd * all_d
    lost = row_lost or col_lost or all_lost
    # records that reach back to the last settling hold the whole debt; rounded records may hold a little too much
    scale_up = up / recent_up if recent_up > 0.0 and (not lost or recent_up > up) else 1.0
    scale_down = down / recent_down if recent_down > 0.0 and (not lost or recent_down > down) else 1.0
    state = advance_mixed(
        die.cells[cell, STATE],
        max(up - scale_up * recent_up, 0.0) * noise_up,
        max(down - scale_down * recent_down, 0.0) * noise_down,
        p,
    )
    scale_up *= noise_up
    scale_down *= noise_down
    never = 1 << 62
    while row_n > 0 or col_n > 0 or all_n > 0:
        row_place = (die.line_records[row] - row_n) % die.line_visit.shape[1]
        col_place = (die.line_records[line] - col_n) % die.line_visit.shape[1]
        all_place = (die.all_records[0] - all_n) % die.all_visit.shape[1]
        row_visit = die.line_visit[row, row_place] if row_n > 0 else never
        col_visit = die.line_visit[line, col_place] if col_n > 0 else never
        all_visit = die.all_visit[0, all_place] if all_n > 0 else never
        if row_visit <= col_visit and row_visit <= all_visit:
            dose_up = row_ru * die.line_dose[row, row_place, 0]
            dose_down = row_rd * die.line_dose[row, row_place, 1]
            row_n -= 1
        elif col_visit <= all_visit:
            dose_up = col_ru * die.line_dose[line, col_place, 0]
            dose_down = col_rd * die.line_dose[line, col_place, 1]
            col_n -= 1
        else:
            dose_up = all_ru * die.all_dose[0, all_place, 0]
            dose_down = all_rd * die.all_dose[0, all_place, 1]
            all_n -= 1
        state = advance(state, 0.5 * scale_up * dose_up, p)
        state = advance(state, -scale_down * dose_down, p)
        state = advance(state, 0.5 * scale_up * dose_up, p)
    return state


def alternate(state, up, down, p):  # type: ignore[no-untyped-def]
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
