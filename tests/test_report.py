"""The report folder: complete or not there at all, cells.csv as exact as the numbers, the same bytes every time."""

import csv
import io
import os
import resource
import signal
import subprocess
import sys
import threading

import numpy as np
import pytest

from benchmarks import report as report_module
from benchmarks.cells_csv import HEADER, format_cells
from benchmarks.die_summary import DieSummariser
from benchmarks.figures import FIGURES
from benchmarks.report import ReportWriter
from benchmarks.result import result_object
from benchmarks.tally import Tally
from programming.job import STATUS_NAMES, Targets
from tests.fake_outcomes import FakeScenario, fake_job, fake_outcome

JOB = fake_job(6, 5)
FILES = {
    "cells.csv",
    "result.json",
    *(f"tables/{name}.{kind}" for name in ("summary", "levels", "pulses", "energy") for kind in ("csv", "md")),
    *(f"figures/{name}.{kind}" for name in FIGURES for kind in ("png", "svg")),
}


@pytest.fixture
def no_figures(monkeypatch):
    """Most tests are about files as such: one tiny figure stands for all."""

    def write_one(folder, _tally, _result):
        (folder / "one.svg").write_text("<svg/>")

    monkeypatch.setattr("benchmarks.figures.write_figures", write_one)


def write_report(directory, dies=2, before_end=lambda: None):
    tally, summarise = Tally(JOB), DieSummariser(JOB)
    with ReportWriter(directory) as report:
        for die in range(dies):
            outcome = fake_outcome(JOB, die)
            tally.add(summarise(outcome))
            report.add_die(format_cells(outcome, JOB))
        report.finish(result_object(tally, FakeScenario()), tally)
        before_end()


def tree(folder):
    """Every path below a folder with its bytes (None for folders), hidden ones too."""
    return {str(path.relative_to(folder)): path.read_bytes() if path.is_file() else None for path in folder.rglob("*")}


def test_everything_is_there_and_the_same_bytes_every_time(tmp_path):
    write_report(tmp_path / "one")
    write_report(tmp_path / "two")
    files = {name: content for name, content in tree(tmp_path / "one").items() if content is not None}
    assert set(files) == FILES
    assert min(len(content) for content in files.values()) > 50
    assert tree(tmp_path / "two") == tree(tmp_path / "one")
    assert {path.name for path in tmp_path.iterdir()} == {"one", "two"}


@pytest.mark.usefixtures("no_figures")
def test_missing_folders_are_made(tmp_path):
    write_report(tmp_path / "a" / "b" / "c")
    assert (tmp_path / "a" / "b" / "c" / "result.json").is_file()
    assert tree(tmp_path).keys() >= {"a/b/c/cells.csv", "a/b/c/tables/summary.md"}
    assert not [name for name in tree(tmp_path) if ".pulsewright-" in name]


@pytest.mark.usefixtures("no_figures")
def test_files_can_be_read_by_whom_the_umask_allows(tmp_path):
    write_report(tmp_path / "new")
    (tmp_path / "usual").mkdir()
    assert (tmp_path / "new").stat().st_mode == (tmp_path / "usual").stat().st_mode


@pytest.mark.usefixtures("no_figures")
def test_an_existing_folder_keeps_its_other_files(tmp_path):
    (tmp_path / "figures").mkdir()
    (tmp_path / "figures" / "mine.txt").write_text("mine")
    (tmp_path / "result.json").write_text("old")
    write_report(tmp_path)
    after = tree(tmp_path)
    assert after["figures/mine.txt"] == b"mine"
    assert after["result.json"].startswith(b'{\n  "schema"')
    assert not [name for name in after if ".pulsewright-" in name]


def lines_of(outcome, job):
    return list(csv.reader(io.StringIO((HEADER + format_cells(outcome, job)).decode())))


def test_cells_read_back_as_the_very_numbers():
    outcome = fake_outcome(JOB, 3)
    header, *rows = lines_of(outcome, JOB)
    assert header == ["die", "row", "column", "target_S", "final_S", "pulses", "verifies", "status", "disturbance_S"]
    assert len(rows) == 30
    for cell, row in enumerate(rows):
        assert [int(text) for text in row[:3]] == [3, *divmod(cell, 5)]
        assert float(row[3]) == outcome.target_S[cell]
        assert float(row[4]) == outcome.final_S[cell]
        assert [int(row[5]), int(row[6])] == [outcome.pulses[cell], outcome.verifies[cell]]
        assert row[7] == STATUS_NAMES[outcome.status[cell]]
        assert float(row[8]) == outcome.disturbance_S[cell]


def test_every_magnitude_reads_back():
    outcome = fake_outcome(fake_job(100, 100), 0)
    rng = np.random.default_rng(8)
    outcome.final_S[:] = rng.uniform(1, 10, 10_000) * 10.0 ** rng.integers(-300, 300, 10_000)
    outcome.final_S[:3] = 0.0, 5e-324, 1.7976931348623157e308
    _header, *rows = lines_of(outcome, fake_job(100, 100))
    assert [float(row[4]) for row in rows] == outcome.final_S.tolist()


def test_only_addressed_cells_are_listed():
    matrix = np.full((6, 5), 5e-5)
    matrix[2] = np.nan
    matrix[0, 4] = np.nan
    job = fake_job(6, 5, targets=Targets("matrix", 5e-5, 5e-5, matrix_S=matrix))
    _header, *rows = lines_of(fake_outcome(job, 0), job)
    assert [(int(row[1]), int(row[2])) for row in rows] == list(zip(*np.nonzero(~np.isnan(matrix)), strict=True))


def test_a_conductance_that_is_not_finite_is_refused():
    outcome = fake_outcome(JOB, 0)
    outcome.final_S[4] = np.nan
    with pytest.raises(ValueError, match="die 0"):
        format_cells(outcome, JOB)


# Failures: the place is left as it was.


class FailureError(Exception):
    pass


def fail(error):
    raise error


@pytest.mark.usefixtures("no_figures")
@pytest.mark.parametrize("error", [FailureError(), KeyboardInterrupt(), OSError(28, "No space left on device")])
@pytest.mark.parametrize("existing", [False, True])
def test_nothing_is_left_of_a_run_that_fails(tmp_path, error, existing):
    if existing:
        write_report(tmp_path / "out", dies=1)
    before = tree(tmp_path)
    with pytest.raises(type(error)):
        write_report(tmp_path / "out", before_end=lambda: fail(error))
    assert tree(tmp_path) == before


@pytest.mark.usefixtures("no_figures")
@pytest.mark.parametrize("moves", [0, 1, 4, 9])
def test_nothing_changes_when_moving_into_place_fails_half_way(tmp_path, monkeypatch, moves):
    write_report(tmp_path / "out", dies=1)
    (tmp_path / "out" / "result.json").unlink()
    before = tree(tmp_path)
    real, done = os.replace, []

    def fail_once(source, target):
        done.append(target)
        if len(done) == moves + 1:
            raise OSError(28, "No space left on device")
        real(source, target)

    monkeypatch.setattr(report_module.os, "replace", fail_once)
    with pytest.raises(OSError, match="No space left"):
        write_report(tmp_path / "out", dies=2)
    assert len(done) > moves
    assert tree(tmp_path) == before


@pytest.mark.usefixtures("no_figures")
def test_folders_made_on_the_way_are_removed_again(tmp_path, monkeypatch):
    monkeypatch.setattr(report_module.os, "replace", lambda *_paths: fail(OSError(5, "Input/output error")))
    with pytest.raises(OSError, match="Input/output"):
        write_report(tmp_path / "a" / "b")
    assert tree(tmp_path) == {}


def test_a_report_that_was_not_finished_is_not_published(tmp_path):
    with ReportWriter(tmp_path / "out") as report:
        report.add_die(b"0,0,0,1,1,1,1,accepted,0\n")
    assert tree(tmp_path) == {}


@pytest.mark.usefixtures("no_figures")
@pytest.mark.parametrize("name", ["result.json", "tables"])
def test_a_folder_in_the_place_of_a_file_or_a_file_in_that_of_a_folder(tmp_path, name):
    if name == "tables":
        (tmp_path / "tables").write_text("mine")
    else:
        (tmp_path / "result.json").mkdir()
        (tmp_path / "result.json" / "mine.txt").write_text("mine")
    before = tree(tmp_path)
    with pytest.raises(OSError, match=r"exists|Is a directory"):
        write_report(tmp_path)
    assert tree(tmp_path) == before


def test_a_place_that_cannot_be_written_is_refused_at_once(tmp_path):
    (tmp_path / "file").write_text("x")
    for place in (tmp_path / "file", tmp_path / "file" / "out"):
        with pytest.raises(NotADirectoryError), ReportWriter(place):
            pytest.fail("must not get here")
    with pytest.raises(OSError, match="proc"), ReportWriter(report_module.Path("/proc/pulsewright/out")):
        pytest.fail("must not get here")
    assert set(tree(tmp_path)) == {"file"}


def test_a_disk_that_fills_up(tmp_path):
    """A real write error: the system refuses files above a size."""
    soft, hard = resource.getrlimit(resource.RLIMIT_FSIZE)
    handler = signal.signal(signal.SIGXFSZ, signal.SIG_IGN)
    resource.setrlimit(resource.RLIMIT_FSIZE, (100_000, hard))
    try:
        with pytest.raises(OSError, match="File too large"):
            write_report(tmp_path / "out", dies=200)
    finally:
        resource.setrlimit(resource.RLIMIT_FSIZE, (soft, hard))
        signal.signal(signal.SIGXFSZ, handler)
    assert tree(tmp_path) == {}


def test_two_threads_may_write_reports_at_the_same_time(tmp_path, monkeypatch):
    """Their bytes are those of one written alone."""
    few = {name: FIGURES[name] for name in ("final_conductance", "energy_split")}
    monkeypatch.setattr("benchmarks.figures.FIGURES", few)
    write_report(tmp_path / "alone")
    threads = [threading.Thread(target=write_report, args=(tmp_path / name,)) for name in ("one", "two")]
    for thread in threads:
        thread.start()
    for thread in threads:
        thread.join()
    assert tree(tmp_path / "one") == tree(tmp_path / "two") == tree(tmp_path / "alone")


def test_importing_the_writer_loads_no_plotting():
    code = "import sys, benchmarks.report, benchmarks.terminal, benchmarks.figures, benchmarks.figures.energy_split;"
    code += "sys.exit(any(name in sys.modules for name in ('matplotlib', 'scipy.special', 'rich', 'tabulate', 'orjson')))"
    assert subprocess.run([sys.executable, "-c", code], check=False).returncode == 0
