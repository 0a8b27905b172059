"""Plain twins of fault placement and of the converter. Import nothing from the package."""

import math
from itertools import count, islice

from tests.twins.plain_random import FAULTS, uniform


def spiral():
    """Offsets of a square spiral around (0, 0): right, down, left, up, with runs of 1, 1, 2, 2, 3, 3, ... steps."""
    row = column = 0
    yield row, column
    for run in count():
        for _ in range(run // 2 + 1):
            row += (0, 1, 0, -1)[run % 4]
            column += (1, 0, -1, 0)[run % 4]
            yield row, column


def compact(rows, columns, centre, size):
    """Cells of a cluster of that size, the array wrapped round at its edges."""
    row, column = divmod(centre, columns)
    return {(row + a) % rows * columns + (column + b) % columns for a, b in islice(spiral(), size)}


def place_faults(seed, die, rows, columns, low, high, clustered, cluster_size):
    """0 healthy, 1 stuck low, 2 stuck high, per cell."""
    fault = [0] * (rows * columns)
    if not clustered:
        for cell in range(rows * columns):
            u = uniform(seed, die, cell, FAULTS, 0, 0)
            fault[cell] = 1 if u < low else 2 if u < low + high else 0
        return fault
    going_on = 1 - 1 / cluster_size
    sizes = range(1, min(400, (2 * max(rows, columns) + 1) ** 2 + 1))
    mean = sum((1 - going_on) * going_on ** (size - 1) * len(compact(rows, columns, 0, size)) for size in sizes)
    density = -math.log(1 - low - high) / mean
    for cell in range(rows * columns):
        u = uniform(seed, die, cell, FAULTS, 0, 0)
        centres = 0
        while u > sum(math.exp(-density) * density**k / math.factorial(k) for k in range(centres + 1)):
            centres += 1
        for event in range(1, centres + 1):
            size = 1
            while going_on**size > uniform(seed, die, cell, FAULTS, event, 0):
                size += 1
            kind = 1 if uniform(seed, die, cell, FAULTS, event, 1) < low / (low + high) else 2
            for member in compact(rows, columns, cell, size):
                fault[member] = kind
    return fault


def convert(value, step, top_code):
    """The middle of the step that holds the value, or of the last one on its side."""
    code = 0
    while code < top_code and value >= (code + 1) * step:
        code += 1
    return (code + 0.5) * step
