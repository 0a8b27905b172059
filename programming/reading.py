"""One verify: what the controller reads of a cell."""

from __future__ import annotations

import math

import numpy as np

from device_models.converter import convert
from device_models.random_numbers import READ, keyed_words, normal, normal_of_word, unit_interval
from device_models.read_noise import telegraph_next
from programming.plan import STATE, VERIFY
from programming.slots import conductance

_SHARED_DRAW = 1 << 23  # sub-draw of what all reads of one verify have in common; far above those of the reads


def sub_draw(read):
    """Sub-draw of a read of a verify. A normal's second looks step by 64 (see random_numbers): they get room for 63."""
    return (read & 63) + ((read >> 6) << 12)


def read_cell(plan, die, p, die_number, cell, row, column):
    """Reading of a cell [S]: noise, converter and average of `reads`; counts the verify, its energy and its time.

    Thermal and shot noise are fresh for each read. 1/f noise moves slowly: one draw for the whole verify. The two-level
    signal starts afresh in each verify and then follows its exact propagator from read to read.
    """
    true = conductance(die.cells[cell, STATE], plan.read_voltage, p)
    event = np.int64(die.verifies[cell])
    deviation = math.sqrt(max(true, 0.0) * plan.noise_linear)
    shared = math.sqrt(plan.noise_square) * true
    if plan.reads == 1:
        deviation, shared = math.sqrt(deviation * deviation + shared * shared), 0.0
    elif shared > 0.0:
        shared *= normal(plan.seed, die_number, cell, READ, event, _SHARED_DRAW)
    total = 0.0
    high = False
    for read in range(plan.reads):
        draw = sub_draw(read)
        word, other = keyed_words(plan.seed, die_number, cell, READ, event, draw)
        reading = true + shared + deviation * normal_of_word(word, plan.seed, die_number, cell, READ, event, draw)
        if plan.telegraph > 0.0:
            correlation = plan.telegraph_correlation if read > 0 else 0.0
            high = telegraph_next(high, plan.telegraph_high, correlation, unit_interval(other))
            reading += plan.telegraph * true * ((1.0 if high else 0.0) - plan.telegraph_high)
        if plan.converter_step > 0.0:
            reading = convert(reading * plan.converter_gain[column], plan.converter_step, plan.converter_top)
        total += reading
    die.verifies[cell] = np.uint32(event + 1)
    # the word line at the verify voltage, every bit line at virtual ground: the whole row draws current
    row_conductance = die.row_sum[row, 0] + true
    die.energy[VERIFY] += plan.read_voltage * plan.read_voltage * row_conductance * plan.integration * plan.reads
    die.total[0] += plan.integration * plan.reads
    return total / plan.reads
