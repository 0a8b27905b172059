"""Cells that cannot be programmed: stuck at low or at high conductance, each by itself or in clusters.

Low and high mean conductance. Uniform: every cell by itself. Clustered: centres are a Poisson process over the array,
each grows a compact cluster of a geometric number of cells, all stuck the same way; the array is wrapped round at its
edges, so that no place is special and the expected fraction of stuck cells is exactly the one asked for. Cluster
processes for defects: Neyman, Ann. Math. Stat. 10:35 (1939); the compact shape is our assumption.
"""

from __future__ import annotations

from math import exp, floor, log, log1p

import numpy as np
import numpy.typing as npt

from device_models.compiled import compiled
from device_models.random_numbers import FAULTS, uniform

HEALTHY, STUCK_LOW, STUCK_HIGH = range(3)


@compiled
def place_faults(
    seed: int,
    die: int,
    rows: int,
    columns: int,
    stuck_low: float,
    stuck_high: float,
    clustered: bool,
    cluster_size: float,
    fault: npt.NDArray[np.uint8],
) -> None:
    """Fill `fault` (uint8, rows * columns, row-major) with HEALTHY, STUCK_LOW or STUCK_HIGH for one die.

    stuck_low, stuck_high: expected fractions of cells, sum below 1. cluster_size: mean cells of a cluster, at least 1.
    A pure function of seed and die: the order of dies and the number of workers do not matter.
    """
    fault[:] = HEALTHY
    if stuck_low + stuck_high <= 0.0:
        return
    if clustered:
        _place_clusters(seed, die, rows, columns, stuck_low, stuck_high, cluster_size, fault)
        return
    for cell in range(rows * columns):
        fault[cell] = uniform_fault(seed, die, cell, stuck_low, stuck_high)


@compiled
def uniform_fault(seed, die, cell, stuck_low, stuck_high):  # type: ignore[no-untyped-def]
    """HEALTHY, STUCK_LOW or STUCK_HIGH for one cell by itself."""
    if stuck_low + stuck_high <= 0.0:
        return HEALTHY
    draw = uniform(seed, die, cell, FAULTS, 0, 0)
    if draw < stuck_low:
        return STUCK_LOW
    return STUCK_HIGH if draw < stuck_low + stuck_high else HEALTHY


@compiled
def _place_clusters(seed, die, rows, columns, stuck_low, stuck_high, cluster_size, fault):  # type: ignore[no-untyped-def]
    total = stuck_low + stuck_high
    # A cell is spared with probability exp(-density * cells per cluster): that must be 1 - total.
    density = -log1p(-total) / _mean_cells(rows, columns, cluster_size)
    for cell in range(rows * columns):
        centres = _poisson(density, uniform(seed, die, cell, FAULTS, 0, 0))
        for event in range(1, centres + 1):
            size = _geometric(cluster_size, uniform(seed, die, cell, FAULTS, event, 0))
            kind = STUCK_LOW if uniform(seed, die, cell, FAULTS, event, 1) * total < stuck_low else STUCK_HIGH
            _grow(cell, min(size, _largest(rows, columns)), rows, columns, kind, fault)


@compiled
def _poisson(mean: float, draw: float) -> int:
    count = 0
    probability = exp(-mean)
    while draw > probability and count < 1000:
        draw -= probability
        count += 1
        probability *= mean / count
    return count


@compiled
def _geometric(mean: float, draw: float) -> int:
    # P(k) = (1 - s) s^(k-1) with s = 1 - 1/mean: a cluster goes on growing with probability s.
    if mean <= 1.0:
        return 1
    return 1 + int(min(floor(log(draw) / log1p(-1.0 / mean)), 1e9))


@compiled
def _largest(rows: int, columns: int) -> int:
    # A spiral of this many cells covers the whole array, whatever its shape.
    side = 2 * max(rows, columns) + 1
    return side * side


@compiled
def _mean_cells(rows, columns, cluster_size):  # type: ignore[no-untyped-def]
    # Expected distinct cells of a cluster: below its mean size only where a big cluster wraps onto itself.
    covered = np.zeros(rows * columns, dtype=np.uint8)
    going_on = 1.0
    mean = 0.0
    row, column, run = 0, 0, 0
    for rank in range(_largest(rows, columns)):
        place = (row % rows) * columns + column % columns
        if covered[place] == 0:
            covered[place] = 1
            mean += going_on
        going_on *= 1.0 - 1.0 / cluster_size
        if going_on < 1e-16:
            break
        row, column, run = _next_on_spiral(row, column, run, rank)
    return mean


@compiled
def _grow(centre, size, rows, columns, kind, fault):  # type: ignore[no-untyped-def]
    row, column, run = centre // columns, centre % columns, 0
    for rank in range(size):
        fault[(row % rows) * columns + column % columns] = kind
        row, column, run = _next_on_spiral(row, column, run, rank)


@compiled
def _next_on_spiral(row, column, run, rank):  # type: ignore[no-untyped-def]
    # Square spiral: runs of 1, 1, 2, 2, 3, 3, ... steps, turning right after each; run r ends with step `last`.
    last = (run + 2) * (run + 2) // 4
    direction = run % 4
    if direction == 0:
        column += 1
    elif direction == 1:
        row += 1
    elif direction == 2:
        column -= 1
    else:
        row -= 1
    return row, column, run + 1 if rank + 1 == last else run
