"""Targets from a file: a matrix of conductances as CSV or NPY.

CSV: one line per word line, one field per bit line, an empty field for a cell that is not to be programmed. NPY: an
array of numbers (rows, columns), NaN for a cell that is not to be programmed. Every complaint names row and column,
counted from 0 as in cells.csv.
"""

from __future__ import annotations

import csv
import io
from pathlib import Path

import numpy as np
import numpy.typing as npt

from benchmarks.errors import BadInputError, shown

Matrix = npt.NDArray[np.float64]


def read_targets(content: bytes, path: Path, shape: tuple[int, int], scale_S: float) -> Matrix:
    """Target conductances [S], (rows, columns), NaN where a cell is not addressed.

    content: the bytes of the file. scale_S: what a 1 in the file means [S].
    Raises BadInputError, naming the file, for anything but a matrix of that shape of positive finite numbers.
    """
    matrix = _from_csv(content, path) if path.suffix.lower() == ".csv" else _from_npy(content, path)
    if matrix.shape != shape:
        raise BadInputError(f"{path}: must be {shape[0]} rows x {shape[1]} columns, is {_size(matrix.shape)}")
    matrix = matrix * scale_S
    if np.isnan(matrix).all():
        raise BadInputError(f"{path}: no cell has a target")
    _refuse(matrix, ~np.isnan(matrix) & ~(matrix > 0.0), path, "must be above 0")
    _refuse(matrix, np.isinf(matrix), path, "must be finite")
    return matrix


def check_inside(matrix_S: Matrix, low_S: float, high_S: float, path: Path, of_what: str) -> None:
    """Raise BadInputError for the first target outside low_S..high_S, the range of `of_what`."""
    from benchmarks.quantities import text_of

    rule = f"must be inside {of_what} ({text_of(low_S, 'S')} to {text_of(high_S, 'S')})"
    _refuse(matrix_S, (matrix_S < low_S) | (matrix_S > high_S), path, rule)


def _refuse(matrix: Matrix, wrong: npt.NDArray[np.bool_], path: Path, rule: str) -> None:
    if wrong.any():
        from benchmarks.quantities import text_of

        row, column = np.argwhere(wrong)[0]
        place = f"row {row}, column {column} (counted from 0)"
        raise BadInputError(f"{path}: {place}: target {rule}, got {text_of(float(matrix[row, column]), 'S')}")


def _from_csv(content: bytes, path: Path) -> Matrix:
    try:
        text = content.decode("utf-8-sig")
        lines = list(csv.reader(io.StringIO(text, newline=""), strict=True))
    except UnicodeDecodeError as error:
        raise BadInputError(f"{path}: not UTF-8 text") from error
    except csv.Error as error:
        raise BadInputError(f"{path}: not valid CSV: {error}") from error
    while lines and not lines[-1]:  # empty lines at the end
        lines.pop()
    if not lines:
        raise BadInputError(f"{path}: is empty")
    for row, fields in enumerate(lines):
        if len(fields) != len(lines[0]):
            got = f"row {row} (counted from 0) has {len(fields)} fields, row 0 has {len(lines[0])}"
            raise BadInputError(f"{path}: all rows must be of one length: {got}")
    values = [[_number(field, path, row, column) for column, field in enumerate(line)] for row, line in enumerate(lines)]
    return np.array(values, dtype=np.float64)


def _number(field: str, path: Path, row: int, column: int) -> float:
    if not field.strip():
        return float("nan")
    try:
        value = float(field)
    except ValueError:
        value = float("nan")
    if not np.isfinite(value):
        place = f"row {row}, column {column} (counted from 0)"
        raise BadInputError(f"{path}: {place}: must be a finite number, or empty for no target, got {shown(field)}")
    return value


def _from_npy(content: bytes, path: Path) -> Matrix:
    try:
        array = np.load(io.BytesIO(content), allow_pickle=False)
    except (ValueError, EOFError, OSError, MemoryError, SyntaxError, TypeError) as error:
        raise BadInputError(f"{path}: not an NPY file of numbers: {str(error).splitlines()[0]}") from error
    if not isinstance(array, np.ndarray) or array.dtype.kind not in "fiu":
        kind = array.dtype if isinstance(array, np.ndarray) else "an archive"
        raise BadInputError(f"{path}: must hold real numbers, holds {kind}")
    return array.astype(np.float64)


def _size(shape: tuple[int, ...]) -> str:
    return f"{shape[0]} rows x {shape[1]} columns" if len(shape) == 2 else f"an array of shape {shape}"
