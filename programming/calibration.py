"""What the plan must know of a cell before any die is made: its range, its unit of dose, how cells of its kind scatter.

Compiled together with the programming loop, so that a model's functions are never compiled one by one.
"""

from __future__ import annotations

import math

import numpy as np

from device_models.random_numbers import CALIBRATION, truncated_normal
from programming.slots import advance, bounds, conductance, rate, record, state_of

_SEED = np.uint64(0x5EED)


def spread_factor(law, size, z):
    """Factor on a parameter for a standard normal z: law 0 normal (size relative), 1 lognormal with mean 1."""
    return 1.0 + size * z if law == 0 else math.exp(size * z - 0.5 * size * size)


def sample_doses(base_values, varied, law, size, truncation, voltages, widths, out):
    """Fill out[cells, pulses] with the signed doses of sampled healthy cells; the sample is not part of any die."""
    values = base_values.copy()
    for cell in range(out.shape[0]):
        for place in range(varied.shape[0]):
            which = varied[place]
            z = truncated_normal(_SEED, 0, cell, CALIBRATION, which, 0, truncation)
            values[which] = base_values[which] * spread_factor(law[place], size[place], z)
        p = record(values)
        for pulse in range(out.shape[1]):
            out[cell, pulse] = rate(voltages[pulse], p) * widths[pulse]


def half_way_dose(p, voltage, sign):
    """Size of the dose that moves a cell from mid-range by 1 - 1/e of the way to an end; bisection on a log scale."""
    lowest, highest = bounds(p)
    middle = state_of(0.5 * (lowest + highest), p)
    start = conductance(middle, voltage, p)
    wanted = (1.0 - math.exp(-1.0)) * 0.5 * (highest - lowest)
    small, large = 1e-30, 1e30
    while large > small * (1.0 + 1e-9):
        guess = math.sqrt(small * large)
        if abs(conductance(advance(middle, sign * guess, p), voltage, p) - start) > wanted:
            large = guess
        else:
            small = guess
    return small


def nominal_cell(base_values, voltage):
    """(lowest conductance [S], highest [S], unit dose) of the nominal cell, seen at a voltage [V]."""
    p = record(base_values)
    lowest, highest = bounds(p)
    return lowest, highest, min(half_way_dose(p, voltage, 1.0), half_way_dose(p, voltage, -1.0))
