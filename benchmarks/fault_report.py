"""A fault of our own: the traceback goes to a file, the finished dies are kept, the user is told how to report it."""

from __future__ import annotations

import json
import os
import platform
import shlex
import tempfile
import traceback
from collections.abc import Sequence
from pathlib import Path
from typing import Any

from benchmarks.version import version

FOLDER_VARIABLE = "PULSEWRIGHT_FAULT_DIR"


def save_fault(error: BaseException, arguments: Sequence[str]) -> str:
    """Save the traceback of an error of ours; the line to tell the user."""
    what = f"{type(error).__name__}: {error}".splitlines()[0]
    text = "\n".join(
        (
            f"pulsewright {version()}, Python {platform.python_version()}, {platform.platform()}",
            f"command: pulsewright {shlex.join(arguments)}",
            "",
            "".join(traceback.format_exception(error)),
        )
    )
    kept = [f"; {note}" for note in getattr(error, "__notes__", [])]
    told = f"fault of the program, not of your input ({what}){''.join(kept)}"
    try:
        path = _write(text, ".txt")
    except OSError:
        return f"{told}; its traceback could not be saved; please report it with the command you gave"
    return f"{told}; please open an issue for the project with your scenario and the traceback in {path}"


def keep_result(result: dict[str, Any], dies_asked: int, error: BaseException) -> None:
    """Save the result of the dies finished before `error`, and note on the error where it is."""
    try:
        path = _write(json.dumps(result, indent=2, allow_nan=False), ".json")
    except (OSError, ValueError):
        return
    error.add_note(f"the result of the {result['dies']} dies finished out of {dies_asked} is kept in {path}")


def _write(text: str, suffix: str) -> Path:
    """The text in a new file in the user's log folder, or failing that among the temporary files."""
    for folder in _folders():
        try:
            folder.mkdir(parents=True, exist_ok=True)
            handle, name = tempfile.mkstemp(suffix, "pulsewright-fault-", folder)
            with os.fdopen(handle, "w", encoding="utf-8", errors="backslashreplace") as file:
                file.write(text)
        except OSError:
            continue
        return Path(name)
    raise OSError("no folder to write to")


def _folders() -> list[Path]:
    import platformdirs

    chosen = os.environ.get(FOLDER_VARIABLE)
    return [Path(chosen)] if chosen else [Path(platformdirs.user_log_dir("pulsewright")), Path(tempfile.gettempdir())]
