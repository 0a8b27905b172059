"""Bad input through the real command: exit status 2, exactly one line that names file, key and value, nothing written."""

from __future__ import annotations

import os
from pathlib import Path

import numpy as np
import pytest

from tests.scenario_files import Edits, run, run_outside, spoiled, tree, write_scenario

# What is wrong -> (texts replaced in the small scenario, what the one line must say besides the file's name)
KEYS: dict[str, tuple[Edits, tuple[str, ...]]] = {
    "broken TOML": ((("rows = 8", "rows = "),), ("not valid TOML", "line 6")),
    "a key twice": ((("rows = 8", "rows = 8\nrows = 9"),), ("not valid TOML", "line 7")),
    "unknown section": ((("[verify]", "[verfy]"),), ("verfy: unknown key", "did you mean 'verify'?")),
    "unknown key": ((("width =", "widht ="),), ("[programming.set] widht: unknown key", "did you mean 'width'?")),
    "missing section": ((("[targets]", "[verify.x]"),), ("targets: is missing",)),
    "missing key": ((("rows = 8", ""),), ("[array] rows: is missing",)),
    "a value for a section": (
        (("[array]\nrows = 8\ncolumns = 6", ""), ("dies = 2", "dies = 2\narray = 8")),
        ("array: must be a table, got 8",),
    ),
    "zero rows": ((("rows = 8", "rows = 0"),), ("[array] rows: must be at least 1, got 0",)),
    "half a row": ((("rows = 8", "rows = 8.5"),), ("[array] rows: must be a whole number, got 8.5",)),
    "rows true": ((("rows = 8", "rows = true"),), ("[array] rows: must be a whole number, got true",)),
    "too many rows": ((("rows = 8", "rows = 1000000"),), ("[array] rows: must be at most 16384",)),
    "too many cells": ((("rows = 8\ncolumns = 6", "rows = 16384\ncolumns = 16384"),), ("[array] rows: times columns",)),
    "negative seed": ((("seed = 3", "seed = -1"),), ("seed: must be at least 0, got -1",)),
    "no dies": ((("dies = 2", "dies = 0"),), ("dies: must be at least 1, got 0",)),
    "a title of numbers": ((('"Small"', "4"),), ("title: must be text in quotes, got 4",)),
    # quantities
    "bare number": ((('"100 ns"', "100"),), ("[programming.set] width", 'such as "50 ns"', "bare number 100")),
    "number without unit": ((('"100 ns"', '"100"'),), ("[programming.set] width", '"100", which has no unit')),
    "wrong dimension": ((('"100 ns"', '"100 nS"'),), ("[programming.set] width", "a conductance", "did you mean 'ns'?")),
    "resistance for conductance": ((('"15 uS"', '"60 kohm"'),), ("[targets] low", "a resistance")),
    "unknown unit": ((('"100 ns"', '"100 nx"'),), ("[programming.set] width", "unit 'nx' is not known")),
    "arithmetic": ((('"100 ns"', '"2*50 ns"'),), ("[programming.set] width", "not known")),
    "negative width": ((('"100 ns"', '"-100 ns"'),), ("[programming.set] width: must be above 0 s", '"-100 ns"')),
    "NaN": ((('"100 ns"', '"nan ns"'),), ("[programming.set] width: must be a finite number",)),
    "infinite": ((('"100 ns"', '"1e999 ns"'),), ("[programming.set] width: must be a finite number",)),
    "a list": ((('"100 ns"', '["100 ns"]'),), ("[programming.set] width: must be a time",)),
    "fraction without per cent": (
        (("[targets]", "[device.faults]\nstuck_low = 0.01\n[targets]"),),
        ("[device.faults] stuck_low", "bare number 0.01", '"2 %"'),
    ),
    "temperature in coulombs": (
        (("columns = 6", 'columns = 6\ntemperature = "25 C"'),),
        ("[array] temperature: must be a temperature", "a charge"),
    ),
    # parts that are not there
    "network wires": (
        (("columns = 6", 'columns = 6\nwires = "network"'),),
        ("[array] wires", "not available in this version"),
    ),
    "segment resistance": (
        (("columns = 6", 'columns = 6\nsegment_resistance = "2 ohm"'),),
        ("[array] segment_resistance: not available in this version",),
    ),
    "driver resistance": (
        (("columns = 6", 'columns = 6\ndriver_resistance = "2 ohm"'),),
        ("[array] driver_resistance: not available in this version",),
    ),
    "line capacitance": (
        (("columns = 6", 'columns = 6\nline_capacitance = "20 aF"'),),
        ("[array] line_capacitance: not available in this version",),
    ),
    "transistors": (
        (("columns = 6", 'columns = 6\naccess = "transistor"'),),
        ("[array] access", "not available in this version"),
    ),
    "retention": ((("[verify]", "[retention]\n[verify]"),), ("retention: not available in this version",)),
    "floating lines": ((('"V/3"', '"floating"'),), ("[programming] scheme", "not available in this version")),
    "compensation": (
        (("max_pulses = 200", "max_pulses = 200\ncompensate = true"),),
        ("[programming] compensate: not available in this version",),
    ),
    # device
    "unknown model": (
        (('"voltage_threshold"', '"voltage_treshold"'),),
        ("[device] model: unknown model", "did you mean 'voltage_threshold'?"),
    ),
    "unknown parameter set": (
        (('"demo_oxide"', '"demo_oxyde"'),),
        ("[device] parameters: unknown set", "did you mean 'demo_oxide'?"),
    ),
    "unknown parameter": (
        (("[targets]", '[device.overrides]\nv_onn = "-1 V"\n[targets]'),),
        ("[device.overrides] v_onn: no such parameter", "did you mean 'v_on'?"),
    ),
    "parameter out of range": (
        (("[targets]", '[device.overrides]\nv_on = "1 V"\n[targets]'),),
        ("[device.overrides] v_on: must be -100 V to -1 uV", '"1 V"'),
    ),
    "unknown window": (
        (("[targets]", '[device.overrides]\nwindow = "joglekaar"\n[targets]'),),
        ("[device.overrides] window: must be one of", "did you mean 'joglekar'?"),
    ),
    "range upside down": (
        (("[targets]", '[device.overrides]\nR_on = "200 kohm"\n[targets]'),),
        ("[device.overrides]", "empty range of conductance"),
    ),
    "initial state outside": (
        (("[targets]", '[device.initial]\nconductance = "5 uS"\n[targets]'),),
        ("[device.initial] conductance: must be inside the cell's range", "5 uS"),
    ),
    "spread of nothing": (
        (("[targets]", '[device.variation.cells]\nv_om = {spread = "5 %"}\n[targets]'),),
        ("[device.variation.cells] v_om: no such parameter", "'v_on'"),
    ),
    "spread through zero": (
        (("[targets]", '[device.variation.cells]\nv_on = {law = "normal", spread = "40 %"}\n[targets]'),),
        ("[device.variation.cells] v_on: 40 % times truncation 3 reaches the opposite sign",),
    ),
    "spread of a choice": (
        (("[targets]", '[device.variation.cells]\nwindow = {spread = "4 %"}\n[targets]'),),
        ("[device.variation.cells] window: selects a variant",),
    ),
    "unknown law": (
        (("[targets]", '[device.variation]\ncycle = {law = "gauss", spread = "4 %"}\n[targets]'),),
        ("[device.variation.cycle] law: must be one of 'normal', 'lognormal'",),
    ),
    "truncation at zero": (
        (("[targets]", "[device.variation]\ntruncation = 0\n[targets]"),),
        ("[device.variation] truncation: must be above 0, got 0",),
    ),
    "more than all stuck": (
        (("[targets]", '[device.faults]\nstuck_low = "60 %"\nstuck_high = "50 %"\n[targets]'),),
        ("[device.faults] stuck_high", "must not exceed 100 %"),
    ),
    "cluster size without clusters": (
        (("[targets]", "[device.faults]\ncluster_size = 5\n[targets]"),),
        ("[device.faults] cluster_size: only has a meaning with placement",),
    ),
    "unknown transport": (
        (("[targets]", '[device.noise]\ntransport = "metal"\n[targets]'),),
        ("[device.noise] transport: must be one of 'ohmic', 'tunnel'",),
    ),
    # targets
    "unknown kind of target": ((("[targets]", '[targets]\nkind = "level"'),), ("[targets] kind", "did you mean 'levels'?")),
    "targets upside down": ((('"85 uS"', '"5 uS"'),), ("[targets] low: must be below high (5 uS), got 15 uS",)),
    "target above the device": ((('"85 uS"', '"150 uS"'),), ("[targets] high: must be inside the cell's range", "150 uS")),
    "one level": ((("levels = 8", "levels = 1"),), ("[targets] levels: must be at least 2, got 1",)),
    "levels of a file": (
        (("[targets]", '[targets]\nkind = "file"\npath = "t.csv"'),),
        ("[targets] low: has no meaning with kind",),
    ),
    "classifier on a small array": (
        (("levels = 8", 'kind = "classifier"'),),
        ("[targets] kind: the classifier needs an array of 65 rows x 20 columns, got 8 x 6",),
    ),
    # programming
    "unknown strategy": (
        (('"amplitude_staircase"', '"amplitude_stairs"'),),
        ("[programming] strategy: unknown strategy", "did you mean 'amplitude_staircase'?"),
    ),
    "unknown scheme": ((('"V/3"', '"V/4"'),), ("[programming] scheme: must be one of 'V/2'", '"V/4"')),
    "scheme beyond the plane": (
        (('"V/3"', "{word = 0.3, bit = 1.5}"),),
        ("[programming.scheme] bit: must not be above 1, got 1.5",),
    ),
    "half a scheme": ((('"V/3"', "{word = 0.3}"),), ("[programming.scheme] bit: is missing",)),
    "unknown order": (
        (("max_pulses = 200", 'order = "row_by_rows"'),),
        ("[programming] order: must be one of", "did you mean 'row_by_row'?"),
    ),
    "no tolerance": ((('"2 uS"', '"0 uS"'),), ("[programming] tolerance: must be above 0", '"0 uS"')),
    "tolerance in volts": ((('"2 uS"', '"2 V"'),), ("[programming] tolerance", "per cent of the target", "a voltage")),
    "tolerance of everything": ((('"2 uS"', '"100 %"'),), ("[programming] tolerance: must be above 0 and below 100 %",)),
    "no pulses": ((("max_pulses = 200", "max_pulses = 0"),), ("[programming] max_pulses: must be at least 1, got 0",)),
    "stop below start": (
        (('stop = "1.6 V"', 'stop = "0.7 V"'),),
        ("[programming.set] stop: must not be below start (800 mV), got 700 mV",),
    ),
    "staircase without step": ((('step = "20 mV"\n', ""),), ("[programming.set] step: is missing",)),
    "staircase without end": ((('stop = "1.6 V"\n', ""),), ("[programming.set] stop: is missing",)),
    "start below the resolution": (
        (("max_pulses = 200", 'resolution = "2 V"'),),
        ("[programming.set] start: must not round to 0 V",),
    ),
    "endless staircase": (
        (('step = "20 mV"', 'step = "1 nV"'),),
        ("[programming.set] step: at most 16384 different pulses",),
    ),
    "certain false alarm": (
        (("max_pulses = 200", 'stuck_false_alarm = "60 %"'),),
        ("[programming] stuck_false_alarm: must not be above 50 %",),
    ),
    # verify
    "converter too narrow": (
        (('range = "100 uS"', 'range = "50 uS"'),),
        ("[verify] range: must cover the highest target (85 uS), got 50 uS",),
    ),
    "converter without range": ((('range = "100 uS"\n', ""),), ("[verify] range: is missing",)),
    "range without converter": ((("bits = 8\n", ""),), ("[verify] range: has no meaning without a converter",)),
    "negative bits": ((("bits = 8", "bits = -8"),), ("[verify] bits: must be at least 0, got -8",)),
    "no reads": ((("bits = 8", "bits = 8\nreads = 0"),), ("[verify] reads: must be at least 1, got 0",)),
    "switch of text": ((("bits = 8", 'bits = 8\nshot = "off"'),), ('[verify] shot: must be true or false, got "off"',)),
    "empty 1/f band": (
        (("bits = 8", 'bits = 8\nflicker_low = "1 GHz"'),),
        ("[verify] flicker_low: must be below 1 / (2 integration), 5 MHz",),
    ),
}


def assert_refused(folder: Path, *arguments: str | Path, says: tuple[str, ...]) -> None:
    """Exit status 2, one line on standard error that says all of it, nothing on standard output, nothing written."""
    before = tree(folder)
    result = run(*arguments)
    assert result.exit_code == 2, result.output
    assert result.stdout == ""
    assert result.stderr.count("\n") == 1, result.stderr
    assert result.stderr.endswith("\n")
    assert "Traceback" not in result.stderr
    for text in says:
        assert text in result.stderr, f"{text!r} is not in {result.stderr!r}"
    assert tree(folder) == before


def test_the_small_scenario_itself_is_accepted(tmp_path: Path) -> None:
    """So that each refusal below comes from what was spoiled."""
    assert run("check", write_scenario(tmp_path)).exit_code == 0


def test_there_are_at_least_thirty_kinds() -> None:
    assert len(KEYS) >= 30


@pytest.mark.parametrize("kind", KEYS)
def test_keys_and_values(kind: str, tmp_path: Path) -> None:
    edits, says = KEYS[kind]
    path = write_scenario(tmp_path, *edits)
    assert_refused(tmp_path, "program", path, "--out", tmp_path / "out", says=("small.toml", *says))


def test_several_faults_are_told_in_one_line_with_their_number(tmp_path: Path) -> None:
    path = write_scenario(tmp_path, ("rows = 8", "rows = 0"), ("levels = 8", "levels = 1"), ("bits = 8", "bits = -1"))
    assert_refused(tmp_path, "check", path, says=("[array] rows", "(and 2 more)"))


def test_a_key_with_a_line_end_in_it_stays_one_line(tmp_path: Path) -> None:
    path = write_scenario(tmp_path, ("rows = 8", 'rows = 8\n"ro\\nws" = 8'))
    assert_refused(tmp_path, "check", path, says=("[array] ro\\nws: unknown key",))


# ---- files


def test_missing_file_names_the_closest(tmp_path: Path) -> None:
    write_scenario(tmp_path)
    missing = tmp_path / "smal.toml"
    assert_refused(tmp_path, "program", missing, says=(f"{missing}: there is no such file", "small.toml"))


def test_unknown_shipped_scenario_names_the_closest(tmp_path: Path) -> None:
    assert_refused(tmp_path, "program", "demmo", says=('"demmo"', "did you mean 'demo'?"))


def test_a_name_too_long_for_any_file(tmp_path: Path) -> None:
    assert_refused(tmp_path, "program", "x" * 5000 + ".toml", says=("there is no such file",))


def test_a_folder_is_no_scenario(tmp_path: Path) -> None:
    assert_refused(tmp_path, "program", tmp_path, says=(str(tmp_path), "is a folder"))


def test_a_file_that_is_not_text(tmp_path: Path) -> None:
    path = tmp_path / "small.toml"
    path.write_bytes(b'title = "x"\nseed = \xff\xfe')
    assert_refused(tmp_path, "program", path, says=("small.toml: is not UTF-8 text (line 2)",))


def test_brackets_nested_beyond_reason(tmp_path: Path) -> None:
    path = tmp_path / "small.toml"
    path.write_text("x = " + "[" * 100_000)
    assert_refused(tmp_path, "program", path, says=("small.toml",))


def test_an_endless_file_is_not_read_to_its_end(tmp_path: Path) -> None:
    link = tmp_path / "endless.toml"
    link.symlink_to("/dev/zero")
    before = os.listdir(tmp_path)
    result = run("check", link)
    assert result.exit_code == 2
    assert "endless.toml: is larger than 4 MiB" in result.stderr
    assert os.listdir(tmp_path) == before


CSV_TARGETS: dict[str, tuple[bytes, tuple[str, ...]]] = {
    "NaN": (b"20,20,20,20,20,20\n20,20,nan,20,20,20\n" + 6 * b"20,20,20,20,20,20\n", ("row 1, column 2", '"nan"')),
    "text": (7 * b"20,20,20,20,20,20\n" + b"20,20,20,20,20,much\n", ("row 7, column 5", '"much"')),
    "negative": (7 * b"20,20,20,20,20,20\n" + b"-3,20,20,20,20,20\n", ("row 7, column 0", "above 0", "-3 uS")),
    "outside the range": (7 * b"20,20,20,20,20,20\n" + b"20,200,20,20,20,20\n", ("row 7, column 1", "range", "200 uS")),
    "wrong shape": (7 * b"20,20,20,20,20,20\n", ("must be 8 rows x 6 columns, is 7 rows x 6 columns",)),
    "ragged": (7 * b"20,20,20,20,20,20\n" + b"20,20\n", ("row 7 (counted from 0) has 2 fields",)),
    "empty": (b"", ("is empty",)),
    "nothing addressed": (8 * b",,,,,\n", ("no cell has a target",)),
    "not text": (b"\xff\xfe\x00", ("not UTF-8 text",)),
}


@pytest.mark.parametrize("kind", CSV_TARGETS)
def test_targets_in_csv(kind: str, tmp_path: Path) -> None:
    content, says = CSV_TARGETS[kind]
    (tmp_path / "t.csv").write_bytes(content)
    path = write_scenario(tmp_path, from_file("t.csv", unit="uS"))
    assert_refused(tmp_path, "program", path, says=("small.toml: [targets] path: t.csv", *says))


def from_file(name: str, unit: str | None = None) -> tuple[str, str]:
    """The edit that takes targets from a file."""
    unit_line = f'unit = "{unit}"\n' if unit else ""
    return 'low = "15 uS"\nhigh = "85 uS"\nlevels = 8\n', f'kind = "file"\npath = "{name}"\n{unit_line}'


NPY_TARGETS: dict[str, tuple[np.ndarray, tuple[str, ...]]] = {
    "wrong shape": (np.full((6, 8), 20e-6), ("must be 8 rows x 6 columns, is 6 rows x 8 columns",)),
    "three dimensions": (np.full((8, 6, 1), 20e-6), ("an array of shape (8, 6, 1)",)),
    "infinite": (np.where(np.arange(48).reshape(8, 6) == 13, np.inf, 20e-6), ("row 2, column 1", "got inf S")),
    "complex": (np.full((8, 6), 20e-6 + 1j), ("must hold real numbers, holds complex128",)),
    "words": (np.full((8, 6), "20 uS"), ("must hold real numbers",)),
    "objects": (np.full((8, 6), None), ("not an NPY file of numbers",)),
    "micro instead of plain siemens": (np.full((8, 6), 20.0), ("row 0, column 0", "must be inside the cell's range", "20 S")),
}


@pytest.mark.parametrize("kind", NPY_TARGETS)
def test_targets_in_npy(kind: str, tmp_path: Path) -> None:
    matrix, says = NPY_TARGETS[kind]
    np.save(tmp_path / "t.npy", matrix, allow_pickle=True)
    path = write_scenario(tmp_path, from_file("t.npy"))
    assert_refused(tmp_path, "program", path, says=("small.toml: [targets] path: t.npy", *says))


def test_npy_that_is_none(tmp_path: Path) -> None:
    (tmp_path / "t.npy").write_bytes(b"\x93NUMPY\x01\x00 and then nothing of the kind")
    path = write_scenario(tmp_path, from_file("t.npy"))
    assert_refused(tmp_path, "program", path, says=("small.toml: [targets] path: t.npy: not an NPY file",))


def test_target_file_that_is_not_there(tmp_path: Path) -> None:
    path = write_scenario(tmp_path, from_file("t.csv", unit="uS"))
    assert_refused(tmp_path, "program", path, says=("[targets] path: cannot read t.csv: No such file",))


def test_target_file_of_another_kind(tmp_path: Path) -> None:
    path = write_scenario(tmp_path, from_file("t.xlsx", unit="uS"))
    assert_refused(tmp_path, "program", path, says=("[targets] path: must be a .csv or a .npy file",))


def test_csv_needs_a_unit_and_a_right_one(tmp_path: Path) -> None:
    assert_refused(tmp_path, "check", write_scenario(tmp_path, from_file("t.csv")), says=("[targets] unit: is missing",))
    path = write_scenario(tmp_path, from_file("t.csv", unit="us"))
    assert_refused(tmp_path, "check", path, says=("[targets] unit: must be a unit of conductance", "did you mean 'uS'?"))


# ---- the command line itself and the folder for results


def test_unknown_command_option_and_kind(tmp_path: Path) -> None:
    assert_refused(tmp_path, "progam", "demo", says=("unknown command 'progam'", "did you mean 'program'?"))
    assert_refused(tmp_path, "program", "demo", "--jsn", says=("--jsn", "--json"))
    assert_refused(tmp_path, "list", "device", says=("'device'", "did you mean 'devices'?"))
    assert_refused(tmp_path, "program", says=("SCENARIO",))
    assert_refused(tmp_path, "program", "demo", "demo", says=("unexpected extra argument",))


@pytest.mark.parametrize("given", [("--dies", "0"), ("--dies", "few"), ("--workers", "-1"), ("--seed", "-1")])
def test_numbers_on_the_command_line(given: tuple[str, str], tmp_path: Path) -> None:
    assert_refused(tmp_path, "program", write_scenario(tmp_path), *given, says=given)


def test_out_is_a_file(tmp_path: Path) -> None:
    (tmp_path / "out").write_text("precious")
    path = write_scenario(tmp_path)
    assert_refused(tmp_path, "program", path, "--out", tmp_path / "out", says=("--out", "exists and is not a folder"))


def test_out_lies_below_a_file(tmp_path: Path) -> None:
    (tmp_path / "file").write_text("precious")
    path, out = write_scenario(tmp_path), tmp_path / "file" / "out"
    assert_refused(tmp_path, "program", path, "--out", out, says=(f"--out {out}", "is not a folder"))


def test_out_in_a_file_system_that_takes_no_files(tmp_path: Path) -> None:
    """/proc refuses new files to everyone, root included."""
    path, out = write_scenario(tmp_path), Path("/proc/pulsewright-out")
    assert_refused(tmp_path, "program", path, "--out", out, says=(f"--out {out}: cannot be written",))


def test_from_outside(tmp_path: Path) -> None:
    """The same in processes of their own, where no test runner stands between the command and the user."""
    path = write_scenario(tmp_path, ('"100 ns"', "100"))
    before = tree(tmp_path)
    for arguments, says in (
        (("program", path, "--out", tmp_path / "out"), "[programming.set] width"),
        (("check", tmp_path / "none.toml"), "there is no such file"),
        (("porgram",), "did you mean 'program'?"),
        (("program", "demo", "--workers", "two"), "must be a whole number, got 'two'"),
    ):
        result = run_outside(*arguments)
        assert result.returncode == 2
        assert result.stdout == ""
        assert result.stderr.count("\n") == 1
        assert says in result.stderr
    assert tree(tmp_path) == before


def test_spoiling_nothing_is_noticed() -> None:
    with pytest.raises(AssertionError, match="no such text"):
        spoiled(("no such text", ""))
