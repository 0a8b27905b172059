"""The [targets] section resolved: levels, a range, a matrix from a file, or a trained classifier as a matrix."""

from __future__ import annotations

from dataclasses import dataclass
from pathlib import Path

import numpy as np

from benchmarks.classifier import COLUMNS, ROWS, Classifier, train
from benchmarks.errors import BadInputError, closest, shown
from benchmarks.quantities import QuantityError, parse_quantity, text_of
from benchmarks.scenario_schema import ArraySection, TargetsSection
from benchmarks.targets import check_inside, read_targets
from programming.job import Targets

MOST_BYTES = 2**30


@dataclass(frozen=True)
class ResolvedTargets:
    """Targets for a job; the classifier they come from, if any; the bytes of the file they come from, if any."""

    targets: Targets
    classifier: Classifier | None = None
    content: bytes = b""


def resolve_targets(
    section: TargetsSection, array: ArraySection, folder: Path, range_S: tuple[float, float]
) -> ResolvedTargets:
    """Targets, all inside range_S, what the nominal cell can reach [S].

    Raises BadInputError, with section and key, if they are not, if a file is not what it should be, or if the array is
    too small for the classifier.
    """
    if section.kind == "file":
        return _from_file(section, array, folder, range_S)
    assert section.low is not None
    assert section.high is not None
    _check_range(section.low, section.high, range_S)
    if section.kind == "levels":
        levels = np.linspace(section.low, section.high, section.levels)
        return ResolvedTargets(Targets("levels", section.low, section.high, levels))
    if section.kind == "uniform":
        return ResolvedTargets(Targets("uniform", section.low, section.high))
    if array.rows < ROWS or array.columns < COLUMNS:
        got = f"got {array.rows} x {array.columns}"
        raise BadInputError(f"[targets] kind: the classifier needs an array of {ROWS} rows x {COLUMNS} columns, {got}")
    classifier = train(section.low, section.high)
    matrix = classifier.target_matrix(array.rows, array.columns)
    return ResolvedTargets(Targets("matrix", section.low, section.high, matrix_S=matrix), classifier)


def _check_range(low: float, high: float, range_S: tuple[float, float]) -> None:
    slack = 1e-9 * range_S[1]
    allowed = f"must be inside the cell's range ({text_of(range_S[0], 'S')} to {text_of(range_S[1], 'S')})"
    for key, value in (("low", low), ("high", high)):
        if not range_S[0] - slack <= value <= range_S[1] + slack:
            raise BadInputError(f"[targets] {key}: {allowed}, got {text_of(value, 'S')}")


def _from_file(section: TargetsSection, array: ArraySection, folder: Path, range_S: tuple[float, float]) -> ResolvedTargets:
    assert section.path is not None
    path = Path(section.path)
    suffix = path.suffix.lower()
    if suffix not in (".csv", ".npy"):
        raise BadInputError(f"[targets] path: must be a .csv or a .npy file, got {shown(section.path)}")
    scale = _scale(section, suffix)
    content = _read(folder / path, section.path)
    try:
        matrix = read_targets(content, path, (array.rows, array.columns), scale)
        slack = 1e-9 * range_S[1]
        check_inside(matrix, range_S[0] - slack, range_S[1] + slack, path, "the cell's range")
    except BadInputError as error:
        raise BadInputError(f"[targets] path: {error}") from error
    low, high = float(np.nanmin(matrix)), float(np.nanmax(matrix))
    return ResolvedTargets(Targets("matrix", low, high, matrix_S=matrix), content=content)


def _scale(section: TargetsSection, suffix: str) -> float:
    """What a 1 in the file means [S]; NPY without a unit is in siemens."""
    if section.unit is None:
        if suffix == ".csv":
            raise BadInputError('[targets] unit: is missing (the unit of the numbers in a CSV file, such as "uS")')
        return 1.0
    try:
        return parse_quantity(f"1 {section.unit}", "S")
    except QuantityError:
        hint = closest(section.unit, ("S", "mS", "uS", "nS"))
        raise BadInputError(
            f'[targets] unit: must be a unit of conductance such as "uS", got {shown(section.unit)}{hint}'
        ) from None


def _read(path: Path, name: str) -> bytes:
    try:
        if path.is_file() and path.stat().st_size > MOST_BYTES:
            raise BadInputError(f"[targets] path: {name} is larger than 1 GiB")
        return path.read_bytes()
    except (OSError, ValueError) as error:
        reason = error.strerror if isinstance(error, OSError) else str(error)
        raise BadInputError(f"[targets] path: cannot read {name}: {reason}") from error
