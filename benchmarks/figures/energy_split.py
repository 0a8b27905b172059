"""Where the energy of a write goes: the parts of what is dissipated per cell, their sum, and what the supply gives."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

from benchmarks.engineering import engineering, unit_for
from benchmarks.figure_style import BLACK, BLUE, COLUMN, GREY, Place, unit_text
from benchmarks.tally import Tally

SIZE = (COLUMN, 2.4)
_PARTS = {
    "selected": "selected cell",
    "half_selected": "half-selected cells",
    "rest": "rest of the array",
    "verify": "verify reads",
    "lines": "line charging",
}


def draw(place: Place, _tally: Tally, result: Mapping[str, Any]) -> None:
    """Draw one bar per part with its value and share, then the sum with its interval, and the supply."""
    axes = place.axes()
    energy = result["energy_J"]
    total, interval = energy["per_cell"], energy["ci95"]
    shown = unit_for(total, "J", interval)
    unit, scale = unit_text(shown.exponent, "J"), 10.0**-shown.exponent
    rows = [(name, energy[part], BLUE, BLUE) for part, name in _PARTS.items()]
    rows += [("dissipated in all", total, GREY, GREY), ("drawn from supply", energy["supply"], "white", GREY)]
    positions = [0.0, 1.0, 2.0, 3.0, 4.0, 5.3, 6.3]
    for position, (_name, value, fill, edge) in zip(positions, rows, strict=True):
        axes.barh(position, scale * value, 0.62, color=fill, edgecolor=edge, linewidth=0.8)
        text, end = engineering(value, "J", 3).replace("u", "µ"), scale * value
        if total and position < positions[5]:
            text += f"   {100 * value / total:.1f} %"
        if position == positions[5] and interval is not None:
            axes.plot([scale * limit for limit in interval], [position, position], color=BLACK, linewidth=1.2)
            text, end = (
                f"{shown.number(value)} {unit}   ({shown.number(interval[0])}–{shown.number(interval[1])})",
                scale * interval[1],
            )
        axes.annotate(text, (end, position), (3, 0), textcoords="offset points", va="center", fontsize=7)
    axes.set_yticks(positions, [name for name, *_rest in rows])
    axes.tick_params(axis="y", length=0)
    axes.invert_yaxis()
    longest = 1.25 * scale * max(value for _name, value, *_rest in rows)
    with_interval = 2.0 * scale * (interval[1] if interval is not None else 0.0)
    axes.set_xlim(0.0, max(longest, with_interval) or 1.0)
    axes.set_xlabel(f"energy per cell ({unit})")
