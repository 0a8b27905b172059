"""Tables of a result: CSV in SI units with every digit, for programs; Markdown in engineering units, for people."""

from __future__ import annotations

import csv
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import numpy as np

from benchmarks.engineering import unit_for
from benchmarks.headline import headline
from benchmarks.tally import Tally

Cell = str | int | float | None


@dataclass(frozen=True)
class Table:
    """A table twice: header and rows of numbers in SI units, and the same as text."""

    name: str
    header: Sequence[str]
    rows: Sequence[Sequence[Cell]]
    text_header: Sequence[str]
    text_rows: Sequence[Sequence[str]]


def write_tables(folder: Path, tally: Tally, result: Mapping[str, Any]) -> list[Path]:
    """Write every table as NAME.csv and NAME.md into an existing folder. Raises OSError."""
    from tabulate import tabulate

    paths = []
    for table in (summary_table(result), level_table(result), pulse_table(tally), energy_table(result)):
        path = folder / f"{table.name}.csv"
        with path.open("w", newline="", encoding="utf-8") as file:
            csv.writer(file, lineterminator="\n").writerows([table.header, *table.rows])
        paths.append(path)
        align = ["left", *["right"] * (len(table.text_header) - 1)]
        text = tabulate(table.text_rows, table.text_header, tablefmt="pipe", disable_numparse=True, colalign=align)
        paths.append(path.with_suffix(".md"))
        paths[-1].write_text(text + "\n", encoding="utf-8")
    return paths


def summary_table(result: Mapping[str, Any]) -> Table:
    """Every quantity with its 95 % interval."""
    rows: list[list[Cell]] = []
    text = []
    for quantity in headline(result):
        name, unit, value, interval = quantity.full_name, quantity.unit, quantity.value, quantity.interval
        low, high = interval if interval is not None else (None, None)
        rows.append([name, value, low, high, "" if unit == "%" else unit])
        if value is None:
            text.append([name, "", "", ""])
            continue
        shown = unit_for(value, unit, interval)
        limits = "" if interval is None else f"{shown.number(interval[0])} to {shown.number(interval[1])}"
        text.append([name, shown.number(value), limits, shown.unit])
    header = ("quantity", "value", "ci95_low", "ci95_high", "unit")
    return Table("summary", header, rows, ("quantity", "value", "95 % interval", "unit"), text)


def level_table(result: Mapping[str, Any]) -> Table:
    """Error and fraction in band of each level."""
    levels = result["levels"]
    target_unit = unit_for(max(level["target_S"] for level in levels), "S")
    error_unit = unit_for(max(level["error"]["rms_S"] or 0.0 for level in levels), "S")
    rows: list[list[Cell]] = []
    text = []
    for level in levels:
        error, band = level["error"], level["in_band"]
        limits = [*(error["ci95"] or (None, None)), *(band["ci95"] or (None, None))]
        rows.append([level["target_S"], level["cells"], error["rms_S"], *limits[:2], error["mean_S"],
                     band["fraction"], *limits[2:]])  # fmt: skip
        errors = ["" if value is None else error_unit.number(value) for value in (error["rms_S"], error["mean_S"])]
        text.append([target_unit.number(level["target_S"]), str(level["cells"]), *errors, _percent(band["fraction"], 2)])
    header = ("target_S", "cells", "rms_error_S", "rms_ci95_low_S", "rms_ci95_high_S", "mean_error_S", "in_band",
              "in_band_ci95_low", "in_band_ci95_high")  # fmt: skip
    errors = [f"{name} error ({error_unit.unit})" for name in ("rms", "mean")]
    return Table("levels", header, rows, (f"target ({target_unit.unit})", "cells", *errors, "in band (%)"), text)


def pulse_table(tally: Tally) -> Table:
    """How many cells took how many pulses; counts that no cell took are left out."""
    cumulative = np.cumsum(tally.pulses)
    rows: list[list[Cell]] = []
    text = []
    for count in np.flatnonzero(tally.pulses).tolist():
        cells, up_to = int(tally.pulses[count]), float(cumulative[count] / tally.addressed)
        rows.append([count, cells, up_to])
        text.append([str(count), str(cells), _percent(up_to, 4)])
    return Table("pulses", ("pulses", "cells", "up_to"), rows, ("pulses", "cells", "cells up to here (%)"), text)


def energy_table(result: Mapping[str, Any]) -> Table:
    """Energy per cell by part, their sum, and the supply apart."""
    energy = result["energy_J"]
    total = energy["per_cell"]
    shown = unit_for(total, "J", energy["ci95"])
    rows: list[list[Cell]] = []
    text = []
    for part in ("selected", "half_selected", "rest", "verify", "lines", "per_cell", "supply"):
        share = None if part == "supply" or total == 0.0 else energy[part] / total
        rows.append([part, energy[part], share])
        text.append([part.replace("_", " "), shown.number(energy[part]), _percent(share, 2)])
    return Table("energy", ("part", "energy_J", "share"), rows, ("part", f"energy ({shown.unit})", "share (%)"), text)


def _percent(fraction: float | None, decimals: int) -> str:
    return "" if fraction is None else f"{100.0 * fraction:.{decimals}f}"
