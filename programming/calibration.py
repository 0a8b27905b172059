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


def half_way_dose(p, voltage, sign):
    """Size of the dose that moves a cell from mid-range by 1 - 1/e of the way to an end; bisection on a log scale."""
    lowest, highest = bounds(p)
    middle = state_of(0.5 * (lowest + highest), p)
    start = conductance(middle, voltage, p)
    wanted = (1.0 - math.exp(-1.0)) * 0.5 * (highest - lowest)
    small, large = 1e-30, 1e30
    while large > small * (1.0 + 1e-6):
        guess = math.sqrt(small * large)
        if abs(conductance(advance(middle, sign * guess, p), voltage, p) - start) > wanted:
            large = guess
        else:
            small = guess
    return small


def sample_cells(base_values, varied, law, size, truncation, voltages, widths, doses, read_voltage, ranges):
    """What sampled healthy cells are like; the sample is not part of any die.

    Fills doses[cells, pulses] with the signed dose of each pulse, and the first rows of ranges[cells, 3] with the lowest
    and the highest conductance [S] and the unit dose: that which moves the cell from mid-range by 1 - 1/e of the way to an
    end, seen at read_voltage [V], the smaller of both directions. No varied parameters: the nominal cell.
    """
    values = base_values.copy()
    for cell in range(doses.shape[0]):
        for place in range(varied.shape[0]):
            which = varied[place]
            z = truncated_normal(_SEED, 0, cell, CALIBRATION, which, 0, truncation)
            values[which] = base_values[which] * spread_factor(law[place], size[place], z)
        p = record(values)
        for pulse in range(doses.shape[1]):
            doses[cell, pulse] = rate(voltages[pulse], p) * widths[pulse]
        if cell < ranges.shape[0]:
            ranges[cell, 0], ranges[cell, 1] = bounds(p)
            ranges[cell, 2] = min(half_way_dose(p, read_voltage, 1.0), half_way_dose(p, read_voltage, -1.0))
