"""The figures of a result: one file each, and the list of them."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from importlib import import_module
from pathlib import Path
from typing import Any

from benchmarks.figure_style import house_style, new_figure, save
from benchmarks.tally import Tally

# File name -> module with SIZE (width, height in inches) and draw(place, tally, result).
FIGURES = {
    "final_conductance": "benchmarks.figures.final_conductance",
    "error_histogram": "benchmarks.figures.error_histogram",
    "pulses_per_cell": "benchmarks.figures.pulses_per_cell",
    "disturbance_map": "benchmarks.figures.disturbance_map",
    "energy_split": "benchmarks.figures.energy_split",
    "overview": "benchmarks.figures.overview",
}


def write_figures(folder: Path, tally: Tally, result: Mapping[str, Any]) -> list[Path]:
    """Write every figure as PNG and SVG into an existing folder; the same bytes for the same result. Raises OSError."""
    paths: list[Path] = []
    with house_style():
        for name, module_name in FIGURES.items():
            module = import_module(module_name)
            draw: Callable[..., None] = module.draw
            place = new_figure(module.SIZE)
            draw(place, tally, result)
            paths += save(place.figure, folder / name)
    return paths
