"""A user's own cell or strategy: loaded with permission only, and every mistake in it told with file and line."""

from __future__ import annotations

import hashlib
import json
import sys
from pathlib import Path

import pytest

from benchmarks.available import available
from benchmarks.errors import BadInputError
from benchmarks.plugin_file import blaming_user_code
from benchmarks.scenario import Scenario
from programming.fuse import fuse
from tests.scenario_files import load

CELL = """\
from typing import NamedTuple
from device_models.compiled import compiled
from device_models.contract import DeviceModel, Quantity

class Parameters(NamedTuple):
    speed: float

@compiled
def rate(voltage, p):
    return p.speed * voltage

@compiled
def advance(state, dose, p):
    return min(max(state + dose, 0.0), 1.0)

@compiled
def conductance(state, voltage, p):
    return 1e-6 + 99e-6 * state

@compiled
def state_of(conductance, p):
    return min(max((conductance - 1e-6) / 99e-6, 0.0), 1.0)

@compiled
def bounds(p):
    return 1e-6, 100e-6

MODEL = DeviceModel(
    name="mine", summary="", source="", range="", set_polarity=1, Parameters=Parameters,
    quantities={"speed": Quantity("1/(V s)", 0.0, 1e9, "speed")},
    rate=rate, advance=advance, conductance=conductance, state_of=state_of, bounds=bounds,
)
"""
OWN = (
    ('model = "voltage_threshold"\nparameters = "demo_oxide"', 'model = "cell.py:MODEL"\noverrides = {speed = "1e5 1/(V s)"}'),
)


def load_own(folder: Path, source: str = CELL, allow_code: bool = True) -> Scenario:
    (folder / "cell.py").write_text(source)
    return load(folder, *OWN, allow_code=allow_code)


def test_a_cell_of_ones_own(tmp_path: Path) -> None:
    scenario = load_own(tmp_path)
    assert scenario.job.cell.model.name == "mine"
    assert scenario.job.cell.values == {"speed": 1e5}
    assert list(scenario.user_code) == [tmp_path / "cell.py"]


def test_a_changed_line_changes_digest_and_cell(tmp_path: Path) -> None:
    first = load_own(tmp_path)
    second = load_own(tmp_path, CELL.replace("return 1e-6, 100e-6", "return 1e-6, 101e-6"))
    assert first.digest != second.digest
    assert second.document["device"]["range_S"] == [1e-6, 101e-6]
    assert first.document["device"]["range_S"] == [1e-6, 100e-6]


def test_a_helper_beside_the_file_is_found_and_counts(tmp_path: Path) -> None:
    name = f"helper_{tmp_path.name}"  # modules are kept by name for as long as the process lives
    source = CELL.replace("from typing", f"from {name} import highest\nfrom typing").replace("1e-6, 100e-6", "1e-6, highest")
    digests = set()
    for highest in ("100e-6", "101e-6"):
        (tmp_path / f"{name}.py").write_text(f"highest = {highest}\n")
        scenario = load_own(tmp_path, source)
        digests.add(scenario.digest)
        assert scenario.document["device"]["range_S"] == [1e-6, float(highest)]
        for module in [name, *(m for m in sys.modules if m.startswith("pulsewright_plugin_"))]:
            del sys.modules[module]  # what a fresh process begins without
    assert len(digests) == 2
    assert not list(tmp_path.glob("__pycache__"))


def test_a_helper_that_calls_itself(tmp_path: Path) -> None:
    helper = "@compiled\ndef halved(x, n):\n    if n == 0:\n        return x\n    return halved(0.5 * x, n - 1)\n\n"
    source = CELL.replace("@compiled\ndef rate", f"{helper}@compiled\ndef rate").replace("p.speed *", "halved(p.speed, 3) *")
    job = load_own(tmp_path, source).job
    assert fuse(job.cell.model, job.strategy)


def test_a_strategy_of_ones_own(tmp_path: Path) -> None:
    (tmp_path / "mine.py").write_text(
        "from programming.strategies.identical_pulses import decide\n"
        "from programming.strategy_contract import CellStrategy\n"
        'MINE = CellStrategy("mine", "", "", "", decide)\n'
    )
    scenario = load(tmp_path, ('"amplitude_staircase"', '"mine.py:MINE"'), allow_code=True)
    assert scenario.job.strategy.name == "mine"


def test_code_needs_permission_and_does_not_run_without(tmp_path: Path) -> None:
    source = f"open({str(tmp_path / 'ran')!r}, 'w').close()\n{CELL}"
    with pytest.raises(BadInputError, match=r"small\.toml: \[device\] model: .*only with --allow-code"):
        load_own(tmp_path, source, allow_code=False)
    assert not (tmp_path / "ran").exists()


BROKEN_CODE = {
    "syntax error": (CELL.replace("return 1e-6, 100e-6", "return 1e-6,, 100e-6"), "cell.py, line 26: SyntaxError"),
    "error at import": (CELL.replace("class Parameters", "1 / 0\nclass Parameters"), "cell.py, line 5: ZeroDivisionError"),
    "leaves the program": ("import sys\nsys.exit(0)\n", "cell.py, line 2: SystemExit"),
    "missing name": (CELL.replace("MODEL =", "MODELL ="), "cell.py has no 'MODEL' (did you mean 'MODELL'?)"),
    "wrong type": (CELL + "\nMODEL = 3\n", "'MODEL' in cell.py must be a DeviceModel, is a int"),
    "not compiled": (CELL.replace("@compiled\ndef rate", "def rate"), "rate must be a function decorated with @compiled"),
    "arguments": (CELL.replace("def bounds(p)", "def bounds(p, q)"), "bounds must take 1 arguments, takes 2"),
    "quantity": (CELL.replace('{"speed":', '{"sped":'), "quantities has no Quantity for 'speed'"),
    "polarity": (CELL.replace("set_polarity=1", "set_polarity=0"), "set_polarity must be 1 or -1, is 0"),
    "record": (CELL.replace("Parameters=Parameters", "Parameters=dict"), "Parameters must be a NamedTuple"),
    "wrong name inside": (CELL.replace("return p.speed *", "return p.sped *"), "cell.py, line 10: AttributeError"),
}


@pytest.mark.parametrize("kind", BROKEN_CODE)
def test_broken_code_is_told_with_file_and_line(kind: str, tmp_path: Path) -> None:
    source, says = BROKEN_CODE[kind]
    with pytest.raises(BadInputError) as caught:
        load_own(tmp_path, source)
    assert says in str(caught.value)
    assert "small.toml" in str(caught.value)


def test_code_that_the_cache_cannot_pin_is_bad_input(tmp_path: Path) -> None:
    source = CELL.replace("return p.speed *", 'return TABLE["k"] *').replace("class Par", 'TABLE = {"k": 1.0}\nclass Par')
    scenario = load_own(tmp_path, source)
    with pytest.raises(BadInputError) as caught, blaming_user_code(scenario.user_code):
        fuse(scenario.job.cell.model, scenario.job.strategy)
    says = "cell.py: TABLE: compiled code reaches a dict, whose value cannot be pinned for the code cache"
    assert str(caught.value) == says


def test_digest_by_hand(tmp_path: Path) -> None:
    """sha256 over length and content of the canonical JSON, the target bytes and the two plug-in sources."""
    scenario = load_own(tmp_path)
    parts = [json.dumps(dict(scenario.document), sort_keys=True, separators=(",", ":")).encode(), b"", CELL.encode(), b""]
    joined = b"".join(len(part).to_bytes(8, "big") + part for part in parts)
    assert scenario.digest == hashlib.sha256(joined).hexdigest()


# ---- installed packages


def test_an_installed_package_adds_a_model_and_a_broken_one_is_told(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """Two distributions as pip would leave them: metadata with an entry point each, one of which leads nowhere."""
    (tmp_path / "theirs.py").write_text(CELL)
    for name, target in (("theirs", "theirs:MODEL"), ("broken", "nowhere_to_be_found:MODEL")):
        folder = tmp_path / f"{name}-1.0.dist-info"
        folder.mkdir()
        (folder / "METADATA").write_text(f"Metadata-Version: 2.1\nName: {name}\nVersion: 1.0\n")
        (folder / "entry_points.txt").write_text(f"[pulsewright.devices]\n{name} = {target}\n")
    monkeypatch.syspath_prepend(str(tmp_path))
    entries = {entry["name"]: entry["summary"] for entry in available("devices")}
    assert "theirs" in entries
    assert entries["broken"].startswith("cannot be loaded: ModuleNotFoundError")
    own = ('model = "voltage_threshold"\nparameters = "demo_oxide"', 'model = "theirs"\noverrides = {speed = "1e5 1/(V s)"}')
    assert load(tmp_path, own).job.cell.model.name == "mine"
    with pytest.raises(BadInputError, match=r"\[device\] model: \"broken\" cannot be loaded: ModuleNotFoundError"):
        load(tmp_path, ('"voltage_threshold"', '"broken"'))
