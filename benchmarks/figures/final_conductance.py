"""Where the cells ended: final against target conductance, and below it how the error spreads at each level."""

from __future__ import annotations

from collections.abc import Mapping
from typing import TYPE_CHECKING, Any

import numpy as np
import numpy.typing as npt

from benchmarks.engineering import prefix_exponent
from benchmarks.error_scale import LEVEL_SPAN
from benchmarks.figure_style import BLACK, BLUE, COLUMN, GREY, LIGHT, PALE, VERMILLION, Place, unit_text
from benchmarks.figures.error_axis import central_span, error_axis, merged_bins
from benchmarks.tally import Tally

if TYPE_CHECKING:
    from matplotlib.axes import Axes

SIZE = (COLUMN, 4.2)
_GOLDEN = 0.6180339887498949  # multiples of it, modulo 1, fill an interval evenly


def draw(place: Place, tally: Tally, _result: Mapping[str, Any]) -> None:
    """Draw both panels."""
    above, below = place.rows(1.7, 1.0)
    upper = above.axes()
    lower = below.axes(sharex=upper)
    upper.tick_params(labelbottom=False)
    exponent = prefix_exponent(float(tally.scale.levels_S[-1]))
    per_siemens, unit = 10.0**-exponent, unit_text(exponent, "S")
    _scatter(upper, tally, per_siemens)
    _distributions(lower, tally, per_siemens)
    upper.set_ylabel(f"final conductance ({unit})")
    lower.set_xlabel(f"target conductance ({unit})")


def _spacing(levels: npt.NDArray[np.float64]) -> float:
    """Room that a level has on the axis."""
    return float(np.min(np.diff(levels))) if levels.size > 1 else 0.05 * float(levels[0]) or 1.0


def _scatter(axes: Axes, tally: Tally, per_siemens: float) -> None:
    target, final, stuck = tally.sample.T
    outside = np.abs(final - target) > tally.scale.half_width(target)
    # Cells of one level would lie on top of each other: spread them sideways, far less than levels are apart.
    width = 0.6 * _spacing(per_siemens * tally.scale.levels_S) if tally.scale.discrete else 0.0
    x = per_siemens * target + width * (np.arange(target.size) * _GOLDEN % 1.0 - 0.5)
    ends = per_siemens * np.array([target.min(), target.max()])
    size = min(max(4000.0 / target.size, 1.0), 8.0)
    axes.plot(ends, ends, color=LIGHT, linewidth=0.8, zorder=0)
    groups = (
        (0.0, "in band", ~outside & (stuck == 0), BLUE, "o", size),
        (0.17, "out of band", outside & (stuck == 0), VERMILLION, "D", 2.0 * size),
        (0.43, "stuck", stuck == 1, BLACK, "_", 5.0 * size),
    )
    for place, name, chosen, colour, marker, area in groups:
        axes.scatter(
            x[chosen], per_siemens * final[chosen], s=area, color=colour, marker=marker,
            linewidths=0.6 if marker == "_" else 0, rasterized=True, zorder=2,
        )  # fmt: skip
        axes.text(place, 1.03, name, color=colour, transform=axes.transAxes, fontweight="bold", fontsize=7)
    shown = f"{target.size:,} cells shown".replace(",", " ")
    axes.text(1.0, 1.03, shown, color=GREY, ha="right", fontsize=6.5, transform=axes.transAxes)
    axes.set_ylim(bottom=0.0)


def _distributions(axes: Axes, tally: Tally, per_siemens: float) -> None:
    levels = per_siemens * tally.scale.levels_S
    axis = error_axis(tally.scale)
    reach = central_span(tally.levels.histogram.sum(axis=0), LEVEL_SPAN)
    edges, counts = merged_bins(tally.levels.histogram, reach)
    edges = edges * axis.unit
    axes.axhspan(-axis.unit, axis.unit, color=PALE, linewidth=0, zorder=0)
    axes.axhline(0.0, color=LIGHT, linewidth=0.6, zorder=1)
    middles, spacing = 0.5 * (edges[1:] + edges[:-1]), _spacing(levels)
    for level, cells in zip(levels, counts, strict=True):
        if cells.sum() == 0:
            continue
        width = 0.44 * spacing * cells / cells.max()
        axes.fill_betweenx(middles, level - width, level + width, color=BLUE, linewidth=0, zorder=2)
        median = np.interp(0.5, np.cumsum(cells) / cells.sum(), edges[1:])
        ends = (level - 0.3 * spacing, level + 0.3 * spacing)
        axes.plot(ends, (median, median), color="white", linewidth=0.9, zorder=3)
    axes.set_ylim(-reach * axis.unit, reach * axis.unit)
    axes.set_ylabel(axis.label)
    note = f"shaded: band {axis.band_text}; white: median"
    axes.text(0.0, 1.03, note, color=GREY, fontsize=6.5, transform=axes.transAxes)
