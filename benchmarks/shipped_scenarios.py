"""The scenarios that come with the program, found by name."""

from __future__ import annotations

import tomllib
from collections.abc import Callable
from pathlib import Path

from benchmarks.errors import BadInputError, closest, shown

FOLDER = Path(__file__).parent / "scenarios"


def scenario_files() -> dict[str, Path]:
    """Name -> file of every shipped scenario, in alphabetical order."""
    return {path.relative_to(FOLDER).with_suffix("").as_posix(): path for path in sorted(FOLDER.rglob("*.toml"))}


def scenario_title(path: Path) -> str:
    """The title that stands in a shipped scenario."""
    with path.open("rb") as file:
        return str(tomllib.load(file)["title"])


def find_scenario(reference: str) -> Path:
    """The file of a scenario given as a path or as the name of one that ships.

    What ends in .toml, has a folder in it, or is no shipped name but a file all the same, is a path. Raises
    BadInputError if there is no such file.
    """
    path = Path(reference)
    shipped = scenario_files()
    is_path = path.suffix == ".toml" or len(path.parts) > 1
    if not is_path and reference in shipped:
        return shipped[reference]
    if _is(path.is_dir):
        raise BadInputError(f"{reference}: is a folder, not a scenario file")
    if _is(path.exists):
        return path
    if is_path and reference not in shipped:
        raise BadInputError(f"{reference}: there is no such file{closest(reference, _neighbours(path))}")
    if reference in shipped:
        return shipped[reference]
    hint = closest(reference, shipped)
    raise BadInputError(f"{shown(reference)}: neither a file nor a scenario that ships{hint}; see 'pulsewright list'")


def _is(question: Callable[[], bool]) -> bool:
    try:
        return question()
    except (OSError, ValueError):  # a name too long for the file system, or with a zero byte
        return False


def _neighbours(path: Path) -> list[str]:
    """Scenario files in the same folder, as they would be written."""
    try:
        return [str(other) for other in sorted(path.parent.glob("*.toml"))]
    except (OSError, ValueError):
        return []
