"""The command as a user meets it: help, lists, checks, runs, and every way a run can end."""

from __future__ import annotations

import errno
import json
import os
import signal
import subprocess
import sys
import threading
import time
from collections.abc import Iterator
from pathlib import Path

import pytest

from benchmarks.exit_status import run_guarded
from benchmarks.fault_report import FOLDER_VARIABLE
from benchmarks.report import ReportWriter
from benchmarks.scenario import load_scenario
from benchmarks.shipped_scenarios import scenario_files
from benchmarks.tally import Tally
from programming.bias import SCHEMES
from programming.catalog import strategy_names
from tests.scenario_files import command, environment, run, run_outside, tree, write_scenario

HEAVY = ("numpy", "numba", "scipy", "sklearn", "pint", "pydantic", "rich", "matplotlib", "programming.run")


def test_help_and_version() -> None:
    result = run("--help")
    assert result.exit_code == 0
    for name in ("program", "check", "list", "Exit status: 0 done"):
        assert name in result.stdout
    assert run().stdout == result.stdout
    for name in ("program", "check", "list"):
        assert run(name, "--help").exit_code == 0
    assert run("--version").stdout.startswith("pulsewright ")


@pytest.mark.parametrize("arguments", [("--help",), ("program", "--help"), ("--version",)])
def test_help_imports_nothing_heavy(arguments: tuple[str, ...]) -> None:
    """What makes help fast; the time itself depends on the machine and is measured in benchmarks/speed."""
    script = (
        "import sys\nfrom benchmarks.command_line import main\n"
        f"try:\n    main({list(arguments)!r})\nexcept SystemExit:\n    pass\n"
        f"print([name for name in {HEAVY!r} if name in sys.modules], file=sys.stderr)\n"
    )
    result = subprocess.run(
        [sys.executable, "-c", script], check=True, capture_output=True, text=True, env=environment(), timeout=60
    )
    assert result.stderr == "[]\n"


def test_list() -> None:
    text = run("list").stdout
    listed = json.loads(run("list", "--json").stdout)
    assert listed["schema"] == "pulsewright.list/1"
    names = {kind: [entry["name"] for entry in listed[kind]] for kind in ("devices", "strategies", "schemes", "scenarios")}
    assert {"linear_ion_drift", "voltage_threshold", "saturating_update"} <= set(names["devices"])
    assert names["strategies"] == strategy_names()
    assert names["schemes"][: len(SCHEMES)] == list(SCHEMES)
    assert names["scenarios"] == list(scenario_files())
    for kind, entries in names.items():
        assert all(name in text for name in entries)
        assert list(json.loads(run("list", kind, "--json").stdout)) == ["schema", kind]


def test_check_json(tmp_path: Path) -> None:
    path = write_scenario(tmp_path, ("[targets]", '[device.overrides]\nv_on = "-1.1 V"\n[targets]'))
    result = run("check", path, "--json")
    assert result.exit_code == 0
    assert result.stderr == ""
    checked = json.loads(result.stdout)
    assert checked["schema"] == "pulsewright.scenario/1"
    assert checked["scenario_digest"] == load_scenario(str(path)).digest
    assert checked["device"]["values"]["v_on"] == {"value": -1.1, "unit": "V", "source": "this scenario"}
    assert all(entry["source"] for entry in checked["device"]["values"].values())
    assert checked["programming"]["set"]["width_s"] == 100e-9
    assert checked["programming"]["tolerance_S"] == 2e-6
    cells = checked["programming"]["scheme"]["cells"]
    assert {name: cells[name]["count"] for name in cells} == {"selected": 1, "same_row": 5, "same_column": 7, "rest": 35}
    assert checked["warnings"] == []


def test_check_on_the_terminal(tmp_path: Path) -> None:
    result = run("check", write_scenario(tmp_path, ('"V/3"', '"V/2"')))
    assert result.exit_code == 0
    text = " ".join(result.stdout.split())
    for said in (
        "Small",
        "v_on -1.05 V",
        "our own invention",
        "width 100 ns",
        "same row 5 at 0.5 V per volt",
        "Warning: half-",
    ):
        assert said in text
    assert "Warning: half-select" in text


def test_program_json_is_the_same_for_any_number_of_workers(tmp_path: Path) -> None:
    path = write_scenario(tmp_path)
    one, two = (run("program", path, "--json", "--workers", workers) for workers in ("1", "2"))
    assert one.exit_code == 0
    assert one.stdout == two.stdout
    result = json.loads(one.stdout)
    assert result["schema"] == "pulsewright.result/1"
    assert (result["seed"], result["dies"], result["cells"]["addressed"]) == (3, 2, 96)
    assert result["scenario_digest"] == load_scenario(str(path)).digest
    other = json.loads(run("program", path, "--json", "--seed", "4", "--dies", "3").stdout)
    assert (other["seed"], other["dies"], other["cells"]["addressed"]) == (4, 3, 144)
    assert other["pulses_per_cell"]["mean"] != result["pulses_per_cell"]["mean"]


def test_warnings_go_to_standard_error_once(tmp_path: Path) -> None:
    path = write_scenario(tmp_path, ('"V/3"', '"V/2"'))
    result = run("program", path, "--json")
    assert result.stderr.count("pulsewright: warning: half-select above the threshold of the weakest") == 2
    assert "warning" not in run("program", path).stdout
    quiet = run("program", path, "--quiet")
    assert quiet.stderr == ""
    assert "half-select above" in " ".join(quiet.stdout.split())


def test_out_leaves_a_whole_report(tmp_path: Path) -> None:
    path, out = write_scenario(tmp_path), tmp_path / "new" / "out"
    result = run("program", path, "--json", "--out", out)
    assert result.exit_code == 0
    assert (out / "result.json").read_text() == result.stdout
    assert len((out / "cells.csv").read_text().splitlines()) == 1 + 2 * 48
    assert {"tables", "figures"} <= set(os.listdir(out))
    assert [name for name in tree(tmp_path) if name.split("/")[-1].startswith(".")] == []


# ---- how a run can end


@pytest.mark.parametrize("which", [signal.SIGINT, signal.SIGTERM])
def test_an_interrupted_run_ends_with_130_and_leaves_nothing(which: signal.Signals, tmp_path: Path) -> None:
    path = write_scenario(tmp_path)
    before = tree(tmp_path)
    arguments = command("program", path, "--dies", "1000000", "--out", tmp_path / "out", "--workers", "2")
    process = subprocess.Popen(
        arguments, stdout=subprocess.PIPE, stderr=subprocess.PIPE, text=True, env=environment(), cwd=tmp_path
    )
    try:
        _wait_for_dies(tmp_path, process)
        process.send_signal(which)
        stdout, stderr = process.communicate(timeout=60)
    finally:
        process.kill()
    assert process.returncode == 130
    assert stdout == ""
    assert stderr == "pulsewright: interrupted; nothing was left half-written\n"
    assert tree(tmp_path) == before


def _wait_for_dies(folder: Path, process: subprocess.Popen[str]) -> None:
    """Until some dies are on disk in the report's hidden folder: the run is in full swing."""
    deadline = time.monotonic() + 180
    while time.monotonic() < deadline:
        assert process.poll() is None, process.communicate()
        if any(file.stat().st_size > 1000 for file in folder.glob(".pulsewright-*/report/cells.csv")):
            return
        time.sleep(0.02)
    raise AssertionError("the run never got going")


@pytest.fixture
def full_disk(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Iterator[Path]:
    """A folder on a file system of 64 kB; for who may not mount one, a report that meets a full disk after some dies."""
    folder = tmp_path / "tiny"
    folder.mkdir()
    mounted = subprocess.run(["mount", "-t", "tmpfs", "-o", "size=64k", "tmpfs", str(folder)], check=False, capture_output=True)
    if mounted.returncode == 0:
        yield folder
        subprocess.run(["umount", str(folder)], check=True)
        return
    write = ReportWriter.add_die

    def run_full(writer: ReportWriter, lines: bytes) -> None:
        write(writer, lines)
        if b"\n20," in lines:
            raise OSError(errno.ENOSPC, os.strerror(errno.ENOSPC))

    monkeypatch.setattr(ReportWriter, "add_die", run_full)
    yield folder


def test_a_full_disk_is_told_in_one_line_and_leaves_nothing(full_disk: Path, tmp_path: Path) -> None:
    path = write_scenario(tmp_path)
    result = run("program", path, "--dies", "64", "--out", full_disk / "out")
    assert result.exit_code == 2
    assert result.stdout == ""
    assert result.stderr.count("\n") == 1
    assert "No space left on device" in result.stderr
    assert os.listdir(full_disk) == []


def test_a_full_standard_output_and_a_closed_pipe() -> None:
    with open("/dev/full", "w") as full:
        result = subprocess.run(
            command("list", "--json"), check=False, stdout=full, stderr=subprocess.PIPE, text=True, env=environment()
        )
    assert result.returncode == 2
    assert result.stderr == "pulsewright: the output: No space left on device\n"
    process = subprocess.Popen(command("list"), stdout=subprocess.PIPE, stderr=subprocess.PIPE, env=environment(), bufsize=0)
    assert process.stdout is not None
    assert process.stderr is not None
    process.stdout.close()
    assert process.wait(timeout=60) == 130
    assert process.stderr.read() == b""
    process.stderr.close()


def test_an_interrupt_that_breaks_a_lock_is_still_an_interrupt(capsys: pytest.CaptureFixture[str]) -> None:
    """What happens when the signal arrives while a lock is taken: the lock's clean-up fails over it."""

    def command() -> None:
        try:
            raise KeyboardInterrupt
        finally:
            threading.Lock().release()

    assert run_guarded(command, ["program"]) == 130
    assert capsys.readouterr().err == "pulsewright: interrupted; nothing was left half-written\n"


def test_a_fault_of_our_own_is_3_and_keeps_the_finished_dies(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    faults = tmp_path / "faults"
    monkeypatch.setenv(FOLDER_VARIABLE, str(faults))
    add = Tally.add

    def fail_on_the_third(tally: Tally, summary: object) -> None:
        if tally.dies == 2:
            raise ZeroDivisionError("a mistake\nof ours")
        add(tally, summary)  # type: ignore[arg-type]

    monkeypatch.setattr(Tally, "add", fail_on_the_third)
    result = run("program", write_scenario(tmp_path), "--dies", "5", "--out", tmp_path / "out")
    assert result.exit_code == 3
    assert result.stdout == ""
    assert result.stderr.count("\n") == 1
    assert "Traceback" not in result.stderr
    traceback_file, kept_file = (next(faults.glob(f"*.{suffix}")) for suffix in ("txt", "json"))
    for said in ("ZeroDivisionError: a mistake", "open an issue", str(traceback_file), str(kept_file)):
        assert said in result.stderr
    assert "fail_on_the_third" in traceback_file.read_text()
    assert "program" in traceback_file.read_text().splitlines()[1]
    assert json.loads(kept_file.read_text())["dies"] == 2
    assert not (tmp_path / "out").exists()


def test_a_fault_that_cannot_be_saved_is_still_told(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setenv(FOLDER_VARIABLE, "/proc/nowhere")
    monkeypatch.setattr("benchmarks.scenario.load_scenario", lambda *_, **__: 1 // 0)
    result = run("program", "demo")
    assert result.exit_code == 3
    assert result.stderr.count("\n") == 1
    assert "could not be saved" in result.stderr


@pytest.mark.parametrize(
    ("error", "status"),
    [
        (KeyboardInterrupt(), 130),
        (MemoryError(), 2),
        (PermissionError(errno.EACCES, "Permission denied", "out"), 2),
        (BrokenPipeError(), 130),
        (OSError(errno.EBADF, "Bad file descriptor"), 3),
        (RecursionError("too deep"), 3),
    ],
)
def test_every_ending_has_its_status(
    error: BaseException, status: int, tmp_path: Path, monkeypatch: pytest.MonkeyPatch, capfd: pytest.CaptureFixture[str]
) -> None:
    monkeypatch.setenv(FOLDER_VARIABLE, str(tmp_path))
    # a closed pipe makes us throw standard output away for good: give it one of its own
    with (tmp_path / "stdout").open("w") as stdout:
        monkeypatch.setattr(sys, "stdout", stdout)

        def end() -> None:
            raise error

        assert run_guarded(end, ["program", "demo"]) == status
    assert capfd.readouterr().err.count("\n") <= 1


# ---- the user's own code, in the loop

NOT_COMPILABLE = """\
from device_models.compiled import compiled
from programming.strategy_contract import CellStrategy

@compiled
def decide(target, tolerance, reading, pulses, memory, rules):
    first = {"a": target}
    return first["a"].upper(), 0.0, 0.0, 0.0

MINE = CellStrategy("mine", "", "", "", decide)
"""


def test_code_that_does_not_compile_is_the_users_to_fix(tmp_path: Path) -> None:
    (tmp_path / "mine.py").write_text(NOT_COMPILABLE)
    path = write_scenario(tmp_path, ('"amplitude_staircase"', '"mine.py:MINE"'))
    result = run("program", path, "--allow-code", "--quiet")
    assert result.exit_code == 2
    assert result.stderr.count("\n") == 1
    assert "mine.py: line 7: cannot be compiled" in result.stderr


def test_allow_code_is_needed_from_outside_too(tmp_path: Path) -> None:
    (tmp_path / "mine.py").write_text("print('I ran')\n" + NOT_COMPILABLE)
    path = write_scenario(tmp_path, ('"amplitude_staircase"', '"mine.py:MINE"'))
    result = run_outside("check", path)
    assert (result.returncode, result.stdout) == (2, "")
    assert "[programming] strategy" in result.stderr
    assert "--allow-code" in result.stderr


def test_what_a_killed_run_left_the_next_one_removes(tmp_path: Path) -> None:
    path = write_scenario(tmp_path)
    arguments = command("program", path, "--dies", "1000000", "--out", tmp_path / "out", "--workers", "1")
    killed = subprocess.Popen(arguments, stdout=subprocess.PIPE, stderr=subprocess.PIPE, env=environment(), cwd=tmp_path)
    going = subprocess.Popen(arguments, stdout=subprocess.PIPE, stderr=subprocess.PIPE, env=environment(), cwd=tmp_path)
    try:
        _wait_for_dies(tmp_path, killed)
        deadline = time.monotonic() + 60
        while len(list(tmp_path.glob(".pulsewright-*/report"))) < 2 and time.monotonic() < deadline:
            time.sleep(0.02)
        killed.kill()
        killed.communicate(timeout=60)
        assert len(list(tmp_path.glob(".pulsewright-*"))) == 2
        assert run("program", path, "--dies", "2", "--out", tmp_path / "out").exit_code == 0
        assert len(list(tmp_path.glob(".pulsewright-*"))) == 1  # that of the run that still goes on
    finally:
        killed.kill()
        going.send_signal(signal.SIGINT)
        going.communicate(timeout=60)
    assert not list(tmp_path.glob(".pulsewright-*"))
