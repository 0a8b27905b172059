"""The order in which cells are visited: the simplest array plans.

Each order is a function (rows, columns, seed, die) -> int32 array of all rows * columns cell numbers (row-major), each once.
"""

from __future__ import annotations

import math
from collections.abc import Callable

import numpy as np
import numpy.typing as npt

from device_models.random_numbers import ORDER

CellNumbers = npt.NDArray[np.int32]


def row_by_row(rows: int, columns: int, seed: int, die: int) -> CellNumbers:
    """Along each word line in turn."""
    return np.arange(rows * columns, dtype=np.int32)


def column_by_column(rows: int, columns: int, seed: int, die: int) -> CellNumbers:
    """Along each bit line in turn."""
    return np.ascontiguousarray(np.arange(rows * columns, dtype=np.int32).reshape(rows, columns).T).ravel()


def random(rows: int, columns: int, seed: int, die: int) -> CellNumbers:
    """A fresh shuffle for every die, the same for every strategy with that seed."""
    generator = np.random.Generator(np.random.Philox(key=(seed << 64) | (die << 8) | int(ORDER)))
    return generator.permutation(rows * columns).astype(np.int32)


def interleaved(rows: int, columns: int, seed: int, die: int) -> CellNumbers:
    """Along wrapped diagonals: consecutive cells share no line (possible from 2 x 3 on; with one line it is not)."""
    count = np.arange(rows * columns)
    shift = count // math.lcm(rows, columns)
    row, column = count % rows, (count + shift) % columns
    return (row * columns + column).astype(np.int32)


ORDERS: dict[str, Callable[[int, int, int, int], CellNumbers]] = {
    "row_by_row": row_by_row,
    "column_by_column": column_by_column,
    "random": random,
    "interleaved": interleaved,
}
