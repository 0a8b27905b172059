"""Print the speed table: `python -m benchmarks.speed` (about two minutes; `--quick` leaves out the largest arrays)."""

from __future__ import annotations

import sys

from rich.console import Console
from rich.progress import Progress
from rich.table import Table

from benchmarks.speed import arithmetic_floor, eager_numpy, whole_runs
from benchmarks.speed.jobs import CELLS, speed_job
from benchmarks.speed.pulse_cost import PulseCost, pulse_cost


def pulse_table(sizes: list[int], console: Console) -> dict[tuple[str, str, int], PulseCost]:
    """Measure and print the cost of a pulse for every cell, scheme and size."""
    costs = {}
    with Progress(console=console, transient=True) as progress:
        task = progress.add_task("pulses", total=len(CELLS) * 2 * len(sizes))
        for cell in CELLS:
            for scheme in ("V/2", "V/3"):
                for size in sizes:
                    costs[cell, scheme, size] = pulse_cost(speed_job(cell, size, scheme), 7 if size < 512 else 2)
                    progress.advance(task)
    table = Table(title="One pulse with its verify, one thread, in ns (in brackets: with making and scoring the die)")
    for heading in ("cell", "scheme", *(f"{n} x {n}" for n in sizes), "largest / smallest", "disturbed by", "both polarities"):
        table.add_column(heading, justify="left" if heading in ("cell", "scheme") else "right")
    for cell in CELLS:
        for scheme in ("V/2", "V/3"):
            row = [costs[cell, scheme, n] for n in sizes]
            times = [c.pulse for c in row]
            table.add_row(
                cell,
                scheme,
                *(f"{c.pulse:.0f} ({c.whole:.0f})" for c in row),
                f"{max(times) / min(times):.2f}",
                f"{row[0].stressed * 1e9:.3g} nS",
                "yes" if row[0].both else "no",
            )
    console.print(table)
    return costs


def ratio_table(costs: dict[tuple[str, str, int], PulseCost], console: Console) -> None:
    """Measure and print what the pulse costs are compared with, in the same run."""
    table = Table(title="Compared in the same run")
    for heading in ("what", "theirs", "ours", "ratio"):
        table.add_column(heading, justify="left" if heading == "what" else "right")
    for scheme, pulses in (("V/2", 4000), ("V/3", 60)):
        theirs = eager_numpy.nanoseconds_per_pulse(512, scheme == "V/3", pulses)
        ours = pulse_cost(speed_job("mild stress", 512, scheme), 2).whole
        table.add_row(f"eager NumPy loop, 512 x 512, {scheme}", f"{theirs:.0f} ns", f"{ours:.0f} ns", f"{theirs / ours:.0f} x")
    for name, kernel, cell in (
        ("arithmetic floor, demo cell", arithmetic_floor.threshold_cell, "mild stress"),
        ("arithmetic floor, exponential cell, settling included", arithmetic_floor.sinh_cell, "exponential"),
    ):
        least, ours = arithmetic_floor.nanoseconds(kernel), costs[cell, "V/2", 64].pulse
        table.add_row(name, f"{least:.0f} ns", f"{ours:.0f} ns", f"{ours / least:.2f} x")
    one, two = whole_runs.worker_times()
    table.add_row("one worker against two, 96 dies of the demo", f"{one:.2f} s", f"{two:.2f} s", f"{one / two:.2f} x")
    table.add_row("fresh process: pulsewright --help", "", f"{whole_runs.process_time(['--help']):.2f} s", "")
    demo = whole_runs.process_time(["program", "demo", "--quiet"], 3)
    table.add_row("fresh process: pulsewright program demo, 32 dies", "", f"{demo:.2f} s", "")
    for size in (64, 512):
        whole, least = whole_runs.bytes_per_cell(size)
        table.add_row(f"memory per cell in flight, {size} x {size}", "", f"{least:.0f} (+{whole - least:.0f} device) bytes", "")
    console.print(table)


def main() -> None:
    """Run all speed measurements."""
    console = Console(width=130)
    costs = pulse_table([64, 256] if "--quick" in sys.argv else [64, 256, 1024], console)
    ratio_table(costs, console)


if __name__ == "__main__":
    main()
