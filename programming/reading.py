"""One verify: what the controller reads of a cell."""

from __future__ import annotations

import math

import numpy as np

from device_models.converter import convert
from device_models.random_numbers import READ, keyed_words, normal_of_word, unit_interval
from programming.plan import STATE, VERIFY
from programming.slots import conductance


def read_cell(plan, die, p, die_number, cell, row, column):  # type: ignore[no-untyped-def]
    """Reading of a cell [S]: noise, converter and average of `reads`; counts the verify, its energy and its time."""
    true = conductance(die.cells[cell, STATE], plan.read_voltage, p)
    deviation = math.sqrt(true * (plan.noise_linear + plan.noise_square * true))
    event = np.int64(die.verifies[cell])
    total = 0.0
    for read in range(plan.reads):
        word, other = keyed_words(plan.seed, die_number, cell, READ, event, read)
        reading = true + deviation * normal_of_word(word, plan.seed, die_number, cell, READ, event, read)
        if plan.telegraph > 0.0:
            high = 1.0 if unit_interval(other) < plan.telegraph_high else 0.0
            reading += plan.telegraph * true * (high - plan.telegraph_high)
        if plan.converter_step > 0.0:
            reading = convert(reading * plan.converter_gain[column], plan.converter_step, plan.converter_top)
        total += reading
    die.verifies[cell] = np.uint32(event + 1)
    # the word line at the verify voltage, every bit line at virtual ground: the whole row draws current
    row_conductance = die.row_sum[row, 0] + true
    die.energy[VERIFY] += plan.read_voltage * plan.read_voltage * row_conductance * plan.integration * plan.reads
    die.total[0] += plan.integration * plan.reads
    return total / plan.reads
