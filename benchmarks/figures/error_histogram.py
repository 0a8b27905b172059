"""Histogram of the final error with the band marked; what lies below and above it is told apart and counted."""

from __future__ import annotations

from collections.abc import Mapping
from typing import TYPE_CHECKING, Any

import numpy as np

from benchmarks.error_scale import BINS_PER_HALF_WIDTH
from benchmarks.figure_style import BLUE, COLUMN, GREY, ORANGE, PALE, VERMILLION, Place
from benchmarks.figures.error_axis import central_span, error_axis, merged_bins
from benchmarks.tally import Tally

if TYPE_CHECKING:
    from matplotlib.axes import Axes

SIZE = (COLUMN, 2.5)


def draw(place: Place, tally: Tally, result: Mapping[str, Any]) -> None:
    """Draw the histogram, in per cent of all addressed cells per bin."""
    axes = place.axes()
    axis = error_axis(tally.scale)
    reach = central_span(tally.error_histogram, tally.scale.span)
    edges, counts = merged_bins(tally.error_histogram, reach)
    left, share = edges[:-1], 100.0 * counts / tally.addressed
    inside = (left >= -1.0) & (left < 1.0)
    width = float(edges[1] - edges[0]) * axis.unit
    axes.axvspan(-axis.unit, axis.unit, color=PALE, linewidth=0, zorder=0)
    for chosen, colour in ((inside, BLUE), (~inside, ORANGE)):
        axes.stairs(np.where(chosen, share, 0.0), edges * axis.unit, fill=True, color=colour, linewidth=0)
    axes.set_xlim(-reach * axis.unit, reach * axis.unit)
    axes.set_ylim(0.0, 1.06 * float(share.max()) or 1.0)
    axes.set_xlabel(axis.label)
    axes.set_ylabel(f"cells per {width:g} {axis.short_unit} (%)" if axis.short_unit else "cells per bin (%)")
    in_band = f"{100 * result['in_band']['fraction']:.2f} % in band"
    axes.text(0.5, 1.10, in_band, color=BLUE, ha="center", fontweight="bold", transform=axes.transAxes)
    axes.text(0.5, 1.03, f"({axis.band_text})", color=BLUE, ha="center", fontsize=6.5, transform=axes.transAxes)
    _label_sides(axes, tally, reach)


def _label_sides(axes: Axes, tally: Tally, reach: int) -> None:
    """Write above the axes how many cells lie below and above the band, and how many of those beyond the axis."""
    histogram, middle = tally.error_histogram, tally.error_histogram.size // 2
    percent = 100.0 / tally.addressed
    for place, side, name, half in (
        (0.0, "left", "below", histogram[:middle][::-1]),
        (1.0, "right", "above", histogram[middle:]),
    ):
        outside = percent * np.sum(half[BINS_PER_HALF_WIDTH:])
        beyond = percent * np.sum(half[reach * BINS_PER_HALF_WIDTH :])
        axes.text(place, 1.10, f"{outside:.2f} % {name}", color=VERMILLION, ha=side, transform=axes.transAxes)
        axes.text(place, 1.03, f"{beyond:.2f} % beyond axis", color=GREY, ha=side, fontsize=6.5, transform=axes.transAxes)
