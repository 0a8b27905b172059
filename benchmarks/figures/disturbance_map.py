"""Map of the array: mean size of each cell's disturbance over dies, with its means along word and bit lines."""

from __future__ import annotations

from collections.abc import Mapping
from typing import TYPE_CHECKING, Any

import numpy as np

from benchmarks.engineering import prefix_exponent
from benchmarks.figure_style import BLUE, COLUMN, MAP, Place, unit_text
from benchmarks.tally import Tally

if TYPE_CHECKING:
    from matplotlib.axes import Axes

SIZE = (COLUMN, 3.3)


def draw(place: Place, tally: Tally, _result: Mapping[str, Any]) -> None:
    """Draw the map, its scale and its two margins."""
    mean_S = tally.disturbance.mean_map(tally.job.rows, tally.job.columns)
    most_S = float(np.quantile(mean_S, 0.995)) or float(mean_S.max()) or 1e-9  # a few cells may lie above the scale
    exponent = min(prefix_exponent(most_S), 0)
    values, most, unit = mean_S / 10.0**exponent, most_S / 10.0**exponent, unit_text(exponent, "S")
    (upper_left, _corner), (lower_left, lower_right) = place.grid(heights=(0.18, 1), widths=(1, 0.18))
    axes = lower_left.axes()
    image = axes.imshow(values, cmap=MAP, vmin=0.0, vmax=most, aspect="auto", interpolation="nearest", rasterized=True)
    _dress(axes, empty=not values.any())
    top, right = upper_left.axes(sharex=axes), lower_right.axes(sharey=axes)
    top.plot(np.arange(values.shape[1]), values.mean(axis=0), color=BLUE, linewidth=0.8)
    right.plot(values.mean(axis=1), np.arange(values.shape[0]), color=BLUE, linewidth=0.8)
    top.tick_params(labelbottom=False)
    right.tick_params(labelleft=False)
    top.set_ylabel(unit, rotation=0, ha="right", va="center")
    right.set_xlabel(unit)
    top.set_ylim(0.0, 1.08 * float(values.mean(axis=0).max()) or most)
    right.set_xlim(0.0, 1.08 * float(values.mean(axis=1).max()) or most)
    place.figure.colorbar(image, ax=right, label=f"mean |disturbance| ({unit})", extend="max", fraction=0.5, aspect=32)


def _dress(axes: Axes, empty: bool) -> None:
    from matplotlib.ticker import MaxNLocator

    if empty:
        axes.text(0.5, 0.5, "no cell was disturbed", color="white", ha="center", va="center", transform=axes.transAxes)
    axes.set_xlabel("bit line (column)")
    axes.set_ylabel("word line (row)")
    for side in ("top", "right"):
        axes.spines[side].set_visible(True)
    for ticks in (axes.xaxis, axes.yaxis):
        ticks.set_major_locator(MaxNLocator(nbins=7, integer=True, min_n_ticks=1))
