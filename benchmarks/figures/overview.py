"""All figures of a result on one sheet, two columns of a paper wide."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

from benchmarks.figure_style import Place
from benchmarks.figures import disturbance_map, energy_split, error_histogram, final_conductance, pulses_per_cell
from benchmarks.tally import Tally

SIZE = (10.6, 5.8)


def draw(place: Place, tally: Tally, result: Mapping[str, Any]) -> None:
    """Draw the five panels, lettered."""
    left, middle, right = place.columns(1.0, 1.0, 1.0)
    upper_middle, lower_middle = middle.rows(1.0, 1.25)
    upper_right, lower_right = right.rows(1.25, 1.0)
    # Where each letter stands: points left of and above the panel's first axes.
    for letter, spot, module, across, up in (
        ("a", left, final_conductance, 36, 8),
        ("b", upper_middle, error_histogram, 36, 12),
        ("c", lower_middle, disturbance_map, 36, 4),
        ("d", upper_right, pulses_per_cell, 36, 4),
        ("e", lower_right, energy_split, 76, 4),
    ):
        before = len(place.figure.axes)
        module.draw(spot, tally, result)
        axes = max(place.figure.axes[before:], key=lambda candidate: candidate.get_position().y1)
        axes.annotate(letter, (0, 1), (-across, up), "axes fraction", "offset points", fontsize=10, fontweight="bold")
