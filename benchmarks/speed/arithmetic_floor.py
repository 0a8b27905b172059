"""The least a pulse with its verify can cost: the same draws and the same transcendental calls, and nothing else.

No ledgers, no decisions, no energy, no parameters per cell: what the programming loop costs beyond this is bookkeeping.
"""

from __future__ import annotations

import math
import time

import numpy as np

from device_models.compiled import compiled
from device_models.random_numbers import CYCLE, READ, keyed_words, normal, normal_of_word, unit_interval


@compiled
def threshold_cell(pulses, seed):
    """Demo threshold cell: one cycle normal, one exp of it, the cube, one exp of the dose; one read normal and its root."""
    u, total = 0.5, 0.0
    for i in range(pulses):
        cell, event = i >> 5, i & 31
        voltage = 1.1 + 0.015 * event
        z = normal(seed, 0, cell, CYCLE, event, 0)
        over = voltage / 1.05 - 1.0
        dose = 3.9 * over * over * over * math.exp(0.198 * z - 0.0196)
        u = 1.0 - (1.0 - u) * math.exp(-dose) if cell & 1 else u * math.exp(-dose)
        total += _read(seed, cell, event, 1e-5 + 9e-5 * u)
    return total


@compiled
def sinh_cell(pulses, seed):
    """Demo exponential cell: as above, with the exponentials of its rate instead of the cube, settling included.

    A cell of the demo gets about 30 pulses and is settled three times (two passes and the score), each time with its rate
    at all 82 levels of the two staircases: eight more rates per pulse.
    """
    u, total = 0.5, 0.0
    for i in range(pulses):
        cell, event = i >> 5, i & 31
        voltage = 0.9 + 0.015 * event
        z = normal(seed, 0, cell, CYCLE, event, 0)
        dose = 0.04 * _sinh_ratio(voltage) * math.exp(0.198 * z - 0.0196)
        u = 1.0 - (1.0 - u) * math.exp(-dose) if cell & 1 else u * math.exp(-dose)
        total += _read(seed, cell, event, 5e-6 + 7.5e-5 * u)
        for level in range(8):
            total += _sinh_ratio(0.4 + 0.01 * (level + event)) * 1e-12
    return total


@compiled
def _sinh_ratio(voltage):
    grown = math.exp((voltage - 1.2) / 0.06)
    return grown - math.exp(-(voltage + 1.2) / 0.06)


@compiled
def _read(seed, cell, event, conductance):
    deviation = math.sqrt(conductance * (2e-12 + 2.5e-5 * conductance))
    word, other = keyed_words(seed, 0, cell, READ, event, 0)
    reading = conductance + deviation * normal_of_word(word, seed, 0, cell, READ, event, 0)
    reading += 0.01 * conductance * ((1.0 if unit_interval(other) < 0.5 else 0.0) - 0.5)
    return (math.floor(reading / 4.6875e-7) + 0.5) * 4.6875e-7


def nanoseconds(kernel, pulses: int = 1_000_000, repeats: int = 5) -> float:
    """Best of several runs, per pulse [ns]."""
    kernel(10, np.uint64(1))
    best = math.inf
    for _ in range(repeats):
        start = time.perf_counter()
        kernel(pulses, np.uint64(1))
        best = min(best, time.perf_counter() - start)
    return best / pulses * 1e9
