"""All figures of a result on one sheet, two columns of a paper wide."""

from __future__ import annotations

from collections.abc import Mapping
from typing import TYPE_CHECKING, Any

from benchmarks.figures import disturbance_map, energy_split, error_histogram, final_conductance, pulses_per_cell
from benchmarks.tally import Tally

if TYPE_CHECKING:
    from matplotlib.figure import Figure

SIZE = (10.6, 5.2)


def draw(figure: Figure, tally: Tally, result: Mapping[str, Any]) -> None:
    """Draw the five panels, lettered."""
    left, middle, right = figure.subfigures(1, 3, squeeze=False, wspace=0.04)[0]
    upper, lower = middle.subfigures(2, 1, squeeze=False, height_ratios=(1.0, 1.25), hspace=0.04)[:, 0]
    top, bottom = right.subfigures(2, 1, squeeze=False, height_ratios=(1.25, 1.0), hspace=0.04)[:, 0]
    panels = ((left, final_conductance), (upper, error_histogram), (lower, disturbance_map), (top, pulses_per_cell),
              (bottom, energy_split))  # fmt: skip
    for letter, (panel, module) in zip("abcde", panels, strict=True):
        module.draw(panel, tally, result)
        panel.text(0.005, 0.995, letter, fontsize=10, fontweight="bold", ha="left", va="top")
