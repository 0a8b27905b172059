"""The summary on the terminal: each quantity with its 95 % interval, where the energy went, what to beware of."""

from __future__ import annotations

from collections.abc import Mapping
from typing import TYPE_CHECKING, Any

from benchmarks.engineering import engineering, unit_for
from benchmarks.headline import headline

if TYPE_CHECKING:
    from rich.console import Console
    from rich.table import Table

_PARTS = ("selected", "half_selected", "rest", "verify", "lines")
_BAR = 28  # characters of a full bar


def print_summary(result: Mapping[str, Any], console: Console) -> None:
    """Print the summary of a result object: readable at 80 columns, without colour, and in plain ASCII if need be."""
    from rich.padding import Padding
    from rich.text import Text

    dies = result["dies"]
    console.print()
    console.print(Text(result["title"], style="bold"))
    console.print(
        Text(f"{_count(result['cells']['addressed'])} cells programmed on {dies} {'die' if dies == 1 else 'dies'}", "dim")
    )
    for block in (
        _quantities(result, console),
        _disturbance_split(result["disturbance_S"]),
        _energy_split(result, console),
        _status(result["cells"]),
    ):
        console.print()
        console.print(Padding(block, (0, 0, 0, 1)))
    if result["warnings"]:
        console.print()
        for warning in result["warnings"]:
            console.print(_warning(warning))
    console.print()


def _quantities(result: Mapping[str, Any], console: Console) -> Table:
    from rich.table import Table

    dash = "-" if console.options.ascii_only else "–"
    table = Table(box=None, padding=(0, 2, 0, 0), header_style="dim", pad_edge=False)
    table.add_column("")
    table.add_column("", justify="right", style="bold", no_wrap=True)
    table.add_column("", no_wrap=True)
    table.add_column("95 % interval", no_wrap=True, justify="right")
    table.add_column("", style="dim")
    notes = _notes(result)
    for quantity in headline(result):
        value, interval = quantity.value, quantity.interval
        name, note = ("  without stuck cells", "") if quantity.healthy else (quantity.name, notes.get(quantity.name, ""))
        if value is None:
            table.add_row(name, "none", "", "", note)
            continue
        shown = unit_for(value, quantity.unit, interval)
        limits = f"{shown.number(interval[0])} {dash} {shown.number(interval[1])}" if interval else "one die"
        table.add_row(name, shown.number(value), shown.unit, limits, note)
    return table


def _notes(result: Mapping[str, Any]) -> dict[str, str]:
    """What stands beside a quantity, by its name."""
    pulses = result["pulses_per_cell"]
    notes = {
        "Pulses per cell": f"p50 {pulses['p50']}, p99 {pulses['p99']}, max {pulses['max']}",
        "Final error, rms": f"max {engineering(result['final_error_S']['max'], 'S')}",
        "Disturbance, rms": f"max {engineering(result['disturbance_S']['max'], 'S')}",
        "Energy per cell": f"supply {engineering(result['energy_J']['supply'], 'J')}",
        "Time per cell": f"array {engineering(result['time_s']['array'], 's')}",
    }
    reference = result.get("accuracy", {}).get("reference")
    if reference is not None:
        notes["Accuracy"] = f"software {100 * reference:.2f} %"
    return notes


def _disturbance_split(disturbance: Mapping[str, Any]) -> Table:
    from rich.table import Table

    table = Table(box=None, padding=(0, 2, 0, 0), show_header=False, pad_edge=False)
    table.add_column(min_width=21)
    shown = unit_for(disturbance["rms"], "S", disturbance["ci95"])
    parts = [f"{name.replace('_', ' ')} {shown.text(disturbance[name])}" for name in ("same_row", "same_column", "rest")]
    table.add_row("Disturbance by class", ",  ".join(parts))
    return table


def _energy_split(result: Mapping[str, Any], console: Console) -> Table:
    from rich.table import Table
    from rich.text import Text

    energy = result["energy_J"]
    table = Table(box=None, padding=(0, 2, 0, 0), show_header=False, pad_edge=False)
    table.add_column(min_width=21)
    table.add_column(justify="right", no_wrap=True)
    table.add_column(justify="right", no_wrap=True)
    table.add_column(no_wrap=True)
    mark = "#" if console.options.ascii_only else "━"
    for index, part in enumerate(_PARTS):
        share = energy[part] / energy["per_cell"] if energy["per_cell"] else 0.0
        name = ("Energy: " if index == 0 else "        ") + part.replace("_", "-")
        table.add_row(
            name,
            engineering(energy[part], "J", 3),
            f"{100 * share:.1f} %",
            Text(mark * round(_BAR * share), style="cyan"),
        )
    return table


def _status(cells: Mapping[str, int]) -> Table:
    from rich.table import Table

    table = Table(box=None, padding=(0, 2, 0, 0), show_header=False, pad_edge=False)
    table.add_column(min_width=21)
    table.add_column(justify="right", no_wrap=True)
    table.add_column(style="dim")
    share = 100 / cells["addressed"]
    table.add_row("Cells: accepted", _count(cells["accepted"]), f"{share * cells['accepted']:.2f} %")
    table.add_row("       gave up", _count(cells["gave_up"]), f"{share * cells['gave_up']:.2f} %")
    errors = f"{_count(cells['stuck_false'])} of them healthy, {_count(cells['stuck_missed'])} missed"
    table.add_row("       called stuck", _count(cells["stuck"]), f"{share * cells['stuck']:.2f} %; {errors}")
    return table


def _warning(text: str) -> Any:
    from rich.table import Table
    from rich.text import Text

    line = Table.grid(padding=(0, 1, 0, 0))
    line.add_row(Text("warning:", style="bold yellow"), Text(text))
    return line


def _count(number: int) -> str:
    """A count with its thousands apart."""
    return f"{number:,}".replace(",", " ")
