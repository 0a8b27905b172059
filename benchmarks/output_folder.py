"""The folder of --out, looked at before the work begins: hours of programming must not end at a missing permission."""

from __future__ import annotations

import os
import tempfile
from pathlib import Path

from benchmarks.errors import BadInputError


def check_output_folder(folder: Path) -> None:
    """Raise BadInputError unless files can be written in `folder`, or in the nearest folder above it that exists.

    Nothing is created that stays.
    """
    try:
        existing = folder.absolute()
        while not os.path.lexists(existing):
            existing = existing.parent
        if not existing.is_dir():
            what = "exists and is" if existing == folder.absolute() else f"{existing} is"
            raise BadInputError(f"--out {folder}: {what} not a folder")
        with tempfile.TemporaryFile(dir=existing) as file:
            file.write(b"x" * 4096)
            file.flush()
    except (OSError, ValueError) as error:
        reason = error.strerror if isinstance(error, OSError) else str(error)
        raise BadInputError(f"--out {folder}: cannot be written: {reason}") from error
