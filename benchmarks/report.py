"""The folder that a run leaves behind: result.json, cells.csv, tables/ and figures/, all of it or nothing.

Everything is written into a hidden folder on the same file system and moved into place, file by file, when the `with`
block ends well. Whatever ends it otherwise (an error, a full disk, Ctrl-C) leaves the place as it was; what a killed run
could not remove, the next one to the same place does.
"""

from __future__ import annotations

import os
import shutil
import tempfile
from collections.abc import Callable, Mapping
from contextlib import suppress
from functools import partial
from pathlib import Path
from types import TracebackType
from typing import Any, BinaryIO

from filelock import FileLock, Timeout

from benchmarks.cells_csv import HEADER
from benchmarks.result import json_text
from benchmarks.tally import Tally

_HIDDEN, _UNLOCKED = ".pulsewright-", ".pulsewright-new-"
_LOCK = "in-use"
_REPLACED = "replaced-"  # files of the user's that are moved aside while a report takes their place


class ReportWriter:
    """Context manager for one report.

    with ReportWriter(directory) as report:
        report.add_die(format_cells(outcome, job))  # die by die, in order
        report.finish(result, tally)

    Entering makes sure that the folder can be written, before any work is done. Raises OSError as it comes from the
    system. Without `finish` nothing is left behind. Other files in an existing folder stay.
    """

    def __init__(self, directory: Path) -> None:
        """Nothing is touched before the `with` block is entered."""
        self._directory = directory
        self._finished = False

    def __enter__(self) -> ReportWriter:
        """Make the hidden folder: inside the report's folder if that exists, else in its nearest existing parent."""
        place = self._directory
        while not place.exists() and place != place.parent:
            place = place.parent
        _sweep(place)
        self._hidden, self._in_use = _hidden_folder(place)
        self._written = self._hidden / "report"
        try:
            self._written.mkdir()
            self._cells: BinaryIO = (self._written / "cells.csv").open("wb")
            self._cells.write(HEADER)
        except BaseException:
            self._remove_hidden()
            raise
        return self

    def add_die(self, lines: bytes) -> None:
        """Append the lines of one die to cells.csv; see cells_csv.format_cells."""
        self._cells.write(lines)

    def finish(self, result: Mapping[str, Any], tally: Tally) -> None:
        """Write everything else; it appears in its place when the `with` block ends."""
        from benchmarks.figures import write_figures
        from benchmarks.tables import write_tables

        self._cells.close()
        (self._written / "result.json").write_text(json_text(result), encoding="utf-8")
        for name, write in (("tables", write_tables), ("figures", write_figures)):
            folder = self._written / name
            folder.mkdir()
            write(folder, tally, result)
        self._finished = True

    def __exit__(self, kind: type[BaseException] | None, _value: BaseException | None, _trace: TracebackType | None) -> None:
        """Move the report into place if it is finished and nothing went wrong; remove the hidden folder in any case."""
        try:
            with suppress(OSError):  # what is left in its buffer may not fit on a full disk
                self._cells.close()
            if kind is None and self._finished:
                _publish(self._written, self._directory, self._hidden)
        finally:
            self._remove_hidden()

    def _remove_hidden(self) -> None:
        self._in_use.release()
        shutil.rmtree(self._hidden, ignore_errors=True)


def _hidden_folder(place: Path) -> tuple[Path, FileLock]:
    """A new hidden folder in `place`, and the lock that says it is in use; it bears its name only once it is locked."""
    unlocked = Path(tempfile.mkdtemp(prefix=_UNLOCKED, dir=place))
    lock = FileLock(unlocked / _LOCK)
    try:
        lock.acquire(timeout=0)
        return unlocked.rename(unlocked.with_name(unlocked.name.replace(_UNLOCKED, _HIDDEN))), lock
    except BaseException:
        lock.release()
        shutil.rmtree(unlocked, ignore_errors=True)
        raise


def _sweep(place: Path) -> None:
    """Remove what killed runs left in `place`: hidden folders that nobody holds, unless files of the user were put there."""
    for folder in place.glob(f"{_HIDDEN}*"):
        if folder.name.startswith(_UNLOCKED) or any(folder.glob(f"{_REPLACED}*")):
            continue
        with suppress(Timeout, OSError), FileLock(folder / _LOCK, timeout=0):
            shutil.rmtree(folder, ignore_errors=True)


def _publish(source: Path, directory: Path, aside: Path) -> None:
    """Move all files of `source` below `directory`, replacing those of the same name; on any error put all back."""
    undo: list[Callable[[], object]] = []
    try:
        for folder in reversed((directory, *directory.parents)):
            _make_folder(folder, undo)
        for path in sorted(source.rglob("*")):
            place = directory / path.relative_to(source)
            if path.is_dir():
                _make_folder(place, undo)
                continue
            if place.is_dir():
                raise IsADirectoryError(21, "Is a directory", str(place))
            if place.exists():
                kept = aside / f"{_REPLACED}{len(undo)}"
                os.replace(place, kept)
                undo.append(partial(os.replace, kept, place))
            os.replace(path, place)
            undo.append(place.unlink)
    except BaseException:
        for action in reversed(undo):
            action()
        raise


def _make_folder(folder: Path, undo: list[Callable[[], object]]) -> None:
    if not folder.is_dir():
        folder.mkdir()
        undo.append(folder.rmdir)
