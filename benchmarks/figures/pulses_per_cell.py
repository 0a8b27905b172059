"""Pulses per cell: the distribution, and below it the share of cells that need more, on a logarithmic axis."""

from __future__ import annotations

from collections.abc import Mapping
from typing import TYPE_CHECKING, Any

import numpy as np

from benchmarks.figure_style import BLUE, COLUMN, GREY, direct_label
from benchmarks.tally import Tally

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.figure import FigureBase

SIZE = (COLUMN, 3.3)


def draw(figure: FigureBase, tally: Tally, result: Mapping[str, Any]) -> None:
    """Draw both panels."""
    from matplotlib.ticker import MaxNLocator

    upper, lower = figure.subplots(2, 1, sharex=True)
    share = tally.pulses / tally.addressed
    count = np.arange(share.size)
    upper.bar(count, 100.0 * share, 1.0, color=BLUE, edgecolor="white", linewidth=0.25)
    upper.set_ylabel("cells (%)")
    upper.set_ylim(0.0, 125.0 * float(share.max()))
    more = 1.0 - np.cumsum(tally.pulses) / tally.addressed
    lower.step(count[more > 0], more[more > 0], where="post", color=BLUE)
    lower.set_yscale("log")
    lower.set_ylim(0.6 / tally.addressed, 1.4)
    lower.set_ylabel("share of cells\nthat need more")
    lower.set_xlabel("pulses per cell")
    lower.xaxis.set_major_locator(MaxNLocator(integer=True, min_n_ticks=1))
    lower.set_xlim(-0.5, max(float(count[-1]), 1.0) + 0.5)
    _marks(upper, lower, result["pulses_per_cell"])


def _marks(upper: Axes, lower: Axes, pulses: Mapping[str, Any]) -> None:
    place = 0.98
    for name, text in (("p50", "half of the cells"), ("p99", "99 %"), ("p999", "99.9 %"), ("max", "all")):
        for axes in (upper, lower):
            axes.axvline(pulses[name], color=GREY, linewidth=0.6, dashes=(4, 2), zorder=0)
        right = pulses[name] > 0.7 * pulses["max"]
        direct_label(upper, pulses[name], place, f"{text}: {pulses[name]} " if right else f" {text}: {pulses[name]}",
                     transform=upper.get_xaxis_transform(), va="top", ha="right" if right else "left",
                     bbox={"facecolor": "white", "edgecolor": "none", "pad": 0.4})  # fmt: skip
        place -= 0.15
