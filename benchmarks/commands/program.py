"""`pulsewright program`: run a scenario, tell the result."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path
from typing import TYPE_CHECKING, Any

import click

from benchmarks.commands.options import WholeNumber, allow_code, as_json, scenario

if TYPE_CHECKING:
    from benchmarks.die_summary import DieSummary
    from benchmarks.report import ReportWriter
    from benchmarks.scenario import Scenario
    from programming.job import DieOutcome


@click.command("program", short_help="Program an array as a scenario says, and report what it took.")
@scenario
@as_json
@click.option("--out", type=click.Path(path_type=Path), metavar="DIR", help="Also write tables and figures there.")
@click.option("--workers", type=WholeNumber(1, 1024), metavar="N", help="Dies at a time [default: one per core].")
@click.option("--dies", type=WholeNumber(1, 1_000_000), metavar="N", help="Instead of the scenario's number of dies.")
@click.option("--seed", type=WholeNumber(0, 2**63 - 1), metavar="N", help="Instead of the scenario's seed.")
@allow_code
@click.option("--quiet", is_flag=True, help="No progress bar and no warnings on standard error.")
def command(
    scenario: str,
    as_json: bool,
    out: Path | None,
    workers: int | None,
    dies: int | None,
    seed: int | None,
    allow_code: bool,
    quiet: bool,
) -> None:
    """Program the array of SCENARIO and report what it took and what is left.

    SCENARIO is a TOML file, or the name of one that ships (see 'pulsewright list scenarios').
    """
    from benchmarks.exit_status import say
    from benchmarks.output_folder import check_output_folder
    from benchmarks.plugin_file import blaming_user_code
    from benchmarks.scenario import load_scenario

    loaded = load_scenario(scenario, allow_code=allow_code, seed=seed, dies=dies)
    if out is not None:
        check_output_folder(out)
    if not quiet:
        for warning in loaded.warnings:
            say(f"warning: {warning}")
    with blaming_user_code(loaded.user_code):
        result = _run(loaded, workers or _cores(), out, show_progress=not quiet)
    _print(result, as_json, shown_already=() if quiet else loaded.warnings)


def _run(loaded: Scenario, workers: int, out: Path | None, show_progress: bool) -> dict[str, Any]:
    """The result; with `out` also its report, which appears there whole or not at all."""
    if out is None:
        return _all_dies(loaded, workers, None, show_progress)
    from benchmarks.report import ReportWriter

    with ReportWriter(out) as writer:
        return _all_dies(loaded, workers, writer, show_progress)


def _all_dies(loaded: Scenario, workers: int, writer: ReportWriter | None, show_progress: bool) -> dict[str, Any]:
    from benchmarks.errors import came_of_interrupt
    from benchmarks.fault_report import keep_result
    from benchmarks.progress import progress_bar
    from benchmarks.result import result_object
    from benchmarks.tally import Tally
    from programming.fuse import needs_compiling
    from programming.run import program_dies

    compiling = show_progress and needs_compiling(loaded.job.cell.model, loaded.job.strategy)
    first = "compiling the loop (once for this device and strategy)" if compiling else ""
    tally = Tally(loaded.job)
    try:
        with progress_bar("dies", loaded.dies, show_progress, first) as advance:
            for summary, lines in program_dies(loaded.job, loaded.dies, workers, _reduction(loaded, writer is not None)):
                tally.add(summary)
                if writer is not None:
                    writer.add_die(lines)
                advance()
        result = result_object(tally, loaded)
        if writer is not None:
            writer.finish(result, tally)
    except Exception as error:
        if tally.dies and not isinstance(error, OSError) and not came_of_interrupt(error):
            keep_result(result_object(tally, loaded), loaded.dies, error)
        raise
    return result


def _reduction(loaded: Scenario, with_cells: bool) -> Callable[[DieOutcome], tuple[DieSummary, bytes]]:
    """What a worker keeps of a die: its summary, and with a report its lines of cells.csv."""
    from benchmarks.cells_csv import format_cells
    from benchmarks.die_summary import DieSummariser

    summarise = DieSummariser(loaded.job, loaded.score)

    def reduce(outcome: DieOutcome) -> tuple[DieSummary, bytes]:
        return summarise(outcome), format_cells(outcome, loaded.job) if with_cells else b""

    return reduce


def _print(result: dict[str, Any], as_json: bool, shown_already: Any) -> None:
    if as_json:
        from benchmarks.result import json_text

        click.echo(json_text(result), nl=False)
        return
    from benchmarks.console import PipeAwareConsole
    from benchmarks.terminal import print_summary

    warnings = [text for text in result["warnings"] if text not in shown_already]
    print_summary({**result, "warnings": warnings}, PipeAwareConsole())


def _cores() -> int:
    import os

    return len(os.sched_getaffinity(0)) if hasattr(os, "sched_getaffinity") else os.cpu_count() or 1
