"""A small scenario as text, ways to spoil it, and the command run on it as a user would."""

from __future__ import annotations

import os
import subprocess
import sys
from pathlib import Path

from click.testing import CliRunner, Result

from benchmarks.command_line import main
from benchmarks.scenario import Scenario, load_scenario

SMALL = """\
title = "Small"
seed = 3
dies = 2

[array]
rows = 8
columns = 6

[device]
model = "voltage_threshold"
parameters = "demo_oxide"

[targets]
low = "15 uS"
high = "85 uS"
levels = 8

[programming]
strategy = "amplitude_staircase"
scheme = "V/3"
tolerance = "2 uS"
max_pulses = 200

[programming.set]
start = "0.8 V"
step = "20 mV"
stop = "1.6 V"
width = "100 ns"

[programming.reset]
start = "0.8 V"
step = "20 mV"
stop = "1.6 V"
width = "100 ns"

[verify]
bits = 8
range = "100 uS"
"""

Edits = tuple[tuple[str, str], ...]


def spoiled(*edits: tuple[str, str]) -> str:
    """SMALL with texts replaced, each of which must be there; "[set]" is short for "[programming.set]" and so on."""
    text = SMALL
    for old, new in edits:
        assert old in text, old
        text = text.replace(old, new, 1)
    return text


def write_scenario(folder: Path, *edits: tuple[str, str], name: str = "small.toml") -> Path:
    path = folder / name
    path.write_text(spoiled(*edits), encoding="utf-8")
    return path


def load(folder: Path, *edits: tuple[str, str], **options: object) -> Scenario:
    """The small scenario, spoiled, through the front door of a script."""
    return load_scenario(str(write_scenario(folder, *edits)), **options)  # type: ignore[arg-type]


def run(*arguments: str | Path) -> Result:
    """The command, in this process."""
    return CliRunner().invoke(main, [str(argument) for argument in arguments])


def command(*arguments: str | Path) -> list[str]:
    """The command as another process is given it."""
    return [sys.executable, "-m", "benchmarks", *(str(argument) for argument in arguments)]


def run_outside(*arguments: str | Path, **options: object) -> subprocess.CompletedProcess[str]:
    """The command in a process of its own."""
    return subprocess.run(  # type: ignore[call-overload,no-any-return]
        command(*arguments), check=False, capture_output=True, text=True, timeout=120, env=environment(), **options
    )


def environment() -> dict[str, str]:
    """The environment of a process that finds this package, wherever it runs."""
    root = str(Path(__file__).parents[1])
    return {**os.environ, "PYTHONPATH": os.pathsep.join(filter(None, (root, os.environ.get("PYTHONPATH"))))}


def tree(folder: Path) -> dict[str, bytes | None]:
    """Everything in a folder: relative name -> content, None for a folder. Plug-in caches do not count."""
    return {
        path.relative_to(folder).as_posix(): None if path.is_dir() else path.read_bytes()
        for path in sorted(folder.rglob("*"))
        if "__pycache__" not in path.parts
    }
