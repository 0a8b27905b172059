"""The cache of compiled loops never serves stale code, and a second process compiles nothing."""

import json
import subprocess
import sys
from pathlib import Path

import pytest

from tests.jobs import job
from tests.scenario_files import environment
from tests.test_loop_against_twin import run

HERE = Path(__file__).parent

HELPER = """\
import numpy as np
from device_models.compiled import compiled

FACTOR = 1.0
GAIN = 1.0
TABLE = np.array([5.0, 1.0])

@compiled
def softened(x):
    return x
"""
CELL = """\
from typing import NamedTuple
import helper as h
from device_models.compiled import compiled
from device_models.contract import DeviceModel
from helper import GAIN, TABLE, softened

class Parameters(NamedTuple):
    speed: float = 1.0
    floor: float = 1.0

NOMINAL = Parameters()

@compiled
def rate(voltage, p):
    rest = 1e1 * GAIN + 1e2 * softened(p.speed) + 1e3 * TABLE[1] + 1e4 * NOMINAL.floor
    return voltage * (h.FACTOR + rest)

@compiled
def advance(state, dose, p):
    return state + dose

@compiled
def conductance(state, voltage, p):
    return state

@compiled
def state_of(conductance, p):
    return conductance

@compiled
def bounds(p):
    return 0.0, 1.0

MODEL = DeviceModel("mine", "", "", "", 1, Parameters, {}, rate, advance, conductance, state_of, bounds)
"""
PLAN = """\
from device_models.compiled import compiled
from programming.strategy_contract import CellStrategy

@compiled
def decide(target, tolerance, reading, pulses, memory, rules):
    return 0, 3.0, 0.0, 0.0

STRATEGY = CellStrategy("mine", "", "", "", decide)
"""


@pytest.fixture
def folder(tmp_path):
    for name, text in (("helper.py", HELPER), ("cell.py", CELL), ("plan.py", PLAN)):
        (tmp_path / name).write_text(text)
    return tmp_path


def edit(path, old, new):
    text = path.read_text()
    assert old in text
    path.write_text(text.replace(old, new, 1))


def probe(folder, **variables):
    """What a fresh process makes of the user's files. Without bytecode files: those of the helper are Python's own affair."""
    settings = {"PULSEWRIGHT_CACHE_DIR": str(folder / "cache"), "PYTHONDONTWRITEBYTECODE": "1"} | variables
    done = subprocess.run(
        [sys.executable, str(HERE / "cache_probe.py"), str(folder)],
        env=environment() | settings,
        capture_output=True,
        text=True,
        timeout=120,
        check=False,
    )
    assert done.returncode == 0, done.stderr
    return json.loads(done.stdout)


def test_every_edit_is_seen_by_the_next_process(folder):
    first = probe(folder)
    assert (first["rate"], first["amplitude"]) == (11111.0, 3.0)
    assert first["compiled"] > 0
    again = probe(folder)
    assert again == first | {"compiled": 0}
    edits = (
        ("cell.py", "voltage * (", "2.0 * voltage * (", 22222.0, 3.0),  # the user's device
        ("plan.py", "3.0", "4.0", 22222.0, 4.0),  # the user's strategy
        ("helper.py", "return x", "return 2.0 * x", 22422.0, 4.0),  # a helper
        ("helper.py", "GAIN = 1.0", "GAIN = 2.0", 22442.0, 4.0),  # an imported constant
        ("helper.py", "FACTOR = 1.0", "FACTOR = 2.0", 22444.0, 4.0),  # a constant reached through its module
        ("helper.py", "[5.0, 1.0]", "[5.0, 2.0]", 24444.0, 4.0),  # a constant array
        ("cell.py", "floor: float = 1.0", "floor: float = 2.0", 44444.0, 4.0),  # a default of the record
    )
    for file, old, new, rate, amplitude in edits:
        edit(folder / file, old, new)
        seen = probe(folder)
        assert (seen["rate"], seen["amplitude"]) == (rate, amplitude), f"after {old!r} -> {new!r}"
    (folder / "cell.py").write_text(CELL)
    (folder / "helper.py").write_text(HELPER)
    (folder / "plan.py").write_text(PLAN)
    assert probe(folder) == again  # back to the first: its code is still there


def test_a_cache_that_cannot_be_written_is_done_without(folder):
    (folder / "file").write_text("not a folder")
    nowhere = str(folder / "file" / "cache")
    seen = probe(folder, PULSEWRIGHT_CACHE_DIR=nowhere, HOME=nowhere, XDG_CACHE_HOME=nowhere)
    assert seen["rate"] == 11111.0
    assert (folder / "file").read_text() == "not a folder"


@pytest.mark.parametrize("suffix", ["nbi", "nbc"])
def test_a_damaged_cache_is_compiled_anew(folder, suffix):
    probe(folder)
    damaged = [path for path in (folder / "cache").rglob("*") if path.name.endswith(suffix)]
    assert damaged
    for path in damaged:
        path.write_bytes(path.read_bytes()[:40])
    assert probe(folder)["compiled"] > 0
    assert probe(folder)["compiled"] == 0


def test_a_second_process_loads_the_real_loop_and_compiles_nothing():
    a_job = job(4, 4)
    expected = run(a_job)[0]
    script = (
        "from numba.core.event import install_recorder\n"
        "with install_recorder('numba:compile') as compiled:\n"
        "    from tests.jobs import job\n"
        "    from tests.test_loop_against_twin import run\n"
        "    outcome = run(job(4, 4))[0]\n"
        "print(len(compiled.buffer), outcome.pulses.sum())\n"
    )
    done = subprocess.run(
        [sys.executable, "-c", script], env=environment(), capture_output=True, text=True, timeout=120, check=False
    )
    assert done.stdout.split() == ["0", str(expected.pulses.sum())], done.stderr
