"""Pulses per cell: the distribution of most cells, and below it the tail, on a logarithmic axis."""

from __future__ import annotations

from collections.abc import Mapping
from typing import TYPE_CHECKING, Any

import numpy as np

from benchmarks.figure_style import BLUE, COLUMN, GREY, Place, direct_label
from benchmarks.tally import Tally

if TYPE_CHECKING:
    from matplotlib.axes import Axes

SIZE = (COLUMN, 3.5)
_MOST_BARS = 60


def draw(place: Place, tally: Tally, result: Mapping[str, Any]) -> None:
    """Draw both panels; the upper one ends soon after the count that 99 % of the cells need at most."""
    from matplotlib.ticker import MaxNLocator

    pulses = result["pulses_per_cell"]
    upper, lower = (half.axes() for half in place.rows(1.0, 1.0))
    _histogram(upper, tally, min(pulses["max"], int(1.3 * pulses["p99"]) + 1))
    _tail(lower, tally)
    _mark(upper, pulses["p50"], f"half of the cells: {pulses['p50']}", 0.98)
    _mark(upper, pulses["p99"], f"99 %: {pulses['p99']}", 0.78)
    _mark(lower, pulses["p99"], f"99 %: {pulses['p99']}", 0.98)
    _mark(lower, pulses["p999"], f"99.9 %: {pulses['p999']}", 0.80)
    _mark(lower, pulses["max"], f"all: {pulses['max']}", 0.62)
    for axes in (upper, lower):
        axes.xaxis.set_major_locator(MaxNLocator(integer=True, min_n_ticks=1))
    lower.set_xlabel("pulses per cell")


def _histogram(axes: Axes, tally: Tally, last: int) -> None:
    width = -(-(last + 1) // _MOST_BARS)
    edges = np.arange(0, last + width + 1, width)
    bars = [100.0 * tally.pulses[start : start + width].sum() / tally.addressed for start in edges[:-1]]
    line = 0.25 if len(bars) > 30 else 0.5
    axes.bar(edges[:-1] - 0.5, bars, width, align="edge", color=BLUE, edgecolor="white", linewidth=line)
    axes.set_ylabel("cells (%)" if width == 1 else f"cells per {width} pulses (%)")
    axes.set_xlim(-0.5, float(edges[-1]) - 0.5)
    axes.set_ylim(0.0, 1.3 * max(bars))


def _tail(axes: Axes, tally: Tally) -> None:
    more = (tally.addressed - np.cumsum(tally.pulses)) / tally.addressed
    axes.step(np.flatnonzero(more > 0), more[more > 0], where="post", color=BLUE)
    axes.set_yscale("log")
    axes.set_ylim(0.5 / tally.addressed, 1.5)
    axes.set_xlim(-0.5, max(float(more.size - 1), 1.0) + 0.5)
    axes.set_ylabel("share of cells\nthat need more")


def _mark(axes: Axes, count: int, text: str, height: float) -> None:
    axes.axvline(count, color=GREY, linewidth=0.6, dashes=(4, 2), zorder=0)
    right = count > 0.6 * axes.get_xlim()[1]
    direct_label(
        axes,
        count,
        height,
        f"{text} " if right else f" {text}",
        transform=axes.get_xaxis_transform(),
        va="top",
        ha="right" if right else "left",
        bbox={"facecolor": "white", "edgecolor": "none", "pad": 0.4},
    )
