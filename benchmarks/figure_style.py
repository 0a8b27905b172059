"""The one look of our figures: sizes, type, colours; and how a figure becomes a file with the same bytes every time.

Colours are those of Okabe & Ito (Color Universal Design, 2008), safe for colour-blind readers, picked so that
neighbours also differ in lightness; maps use cividis (Nunez, Anderton & Renslow, PLoS ONE 13:e0199239, 2018).
"""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from contextlib import contextmanager
from dataclasses import dataclass
from pathlib import Path
from threading import Lock
from typing import TYPE_CHECKING, Any, cast

from benchmarks.engineering import prefixed

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.figure import Figure
    from matplotlib.gridspec import SubplotSpec

BLACK, GREY, LIGHT, PALE = "#1a1a1a", "#6e6e6e", "#c4c4c4", "#ececec"
BLUE, SKY, GREEN, ORANGE, VERMILLION = "#0072b2", "#56b4e9", "#009e73", "#e69f00", "#d55e00"
MAP = "cividis"

COLUMN = 3.5  # width of a figure in one column of a paper [inch]
DOTS_PER_INCH = 300

_STYLE: dict[str, Any] = {
    "font.family": "DejaVu Sans",  # comes with matplotlib: the same letters on every machine
    "font.size": 7.5,
    "axes.labelsize": 7.5,
    "axes.titlesize": 7.5,
    "xtick.labelsize": 7,
    "ytick.labelsize": 7,
    "text.color": BLACK,
    "axes.labelcolor": BLACK,
    "axes.edgecolor": GREY,
    "axes.linewidth": 0.6,
    "axes.spines.top": False,
    "axes.spines.right": False,
    "axes.axisbelow": True,
    "axes.labelpad": 3,
    "xtick.color": GREY,
    "ytick.color": GREY,
    "xtick.labelcolor": BLACK,
    "ytick.labelcolor": BLACK,
    "xtick.direction": "out",
    "ytick.direction": "out",
    "xtick.major.size": 2.5,
    "ytick.major.size": 2.5,
    "xtick.minor.size": 1.5,
    "ytick.minor.size": 1.5,
    "xtick.major.width": 0.6,
    "ytick.major.width": 0.6,
    "xtick.minor.width": 0.4,
    "ytick.minor.width": 0.4,
    "lines.linewidth": 1.0,
    "figure.facecolor": "white",
    "savefig.facecolor": "white",
    "svg.fonttype": "path",
    "svg.hashsalt": "pulsewright",
    "path.simplify": False,
    "figure.constrained_layout.w_pad": 0.05,
    "figure.constrained_layout.h_pad": 0.05,
}
_lock = Lock()  # matplotlib keeps its settings in one global place


@contextmanager
def house_style() -> Iterator[None]:
    """The settings of our figures, for the time of a `with` block; one thread at a time."""
    import matplotlib as mpl

    with _lock, mpl.rc_context():
        mpl.rcdefaults()  # a reader's own matplotlibrc must not change the bytes
        cast(Any, mpl.rcParams).update(_STYLE)
        yield


@dataclass(frozen=True)
class Place:
    """A part of a figure in which something is drawn: axes, or further parts."""

    figure: Figure
    spot: SubplotSpec

    def axes(self, **shared: Any) -> Axes:
        """New axes that fill the place; sharex and sharey as matplotlib has them."""
        axes: Axes = self.figure.add_subplot(self.spot, **shared)
        return axes

    def grid(self, heights: Sequence[float], widths: Sequence[float]) -> list[list[Place]]:
        """Places in rows and columns of these relative sizes."""
        grid = self.spot.subgridspec(len(heights), len(widths), height_ratios=heights, width_ratios=widths)
        return [[Place(self.figure, grid[i, j]) for j in range(len(widths))] for i in range(len(heights))]

    def rows(self, *heights: float) -> list[Place]:
        """Places one below the other."""
        return [row[0] for row in self.grid(heights, (1.0,))]

    def columns(self, *widths: float) -> list[Place]:
        """Places side by side."""
        return self.grid((1.0,), widths)[0]


def new_figure(size: tuple[float, float]) -> Place:
    """An empty figure of that width and height [inch]; call it within house_style()."""
    from matplotlib.figure import Figure

    figure = Figure(figsize=size, layout="constrained")
    return Place(figure, figure.add_gridspec(1, 1)[0])


def save(figure: Figure, stem: Path) -> list[Path]:
    """Write stem.png and stem.svg, without dates; call it within house_style(). Returns the two paths."""
    png, svg = stem.with_suffix(".png"), stem.with_suffix(".svg")
    layout = figure.get_layout_engine()
    assert layout is not None
    layout.execute(figure)
    figure.set_layout_engine("none")
    for axes in figure.axes:
        # The last digits of the layout depend on where objects lie in memory.
        left, bottom, width, height = (round(edge, 6) for edge in axes.get_position().bounds)
        axes.set_position((left, bottom, width, height))
    figure.savefig(png, dpi=DOTS_PER_INCH, metadata={"Software": None})
    figure.savefig(svg, dpi=DOTS_PER_INCH, metadata={"Date": None, "Creator": None})
    return [png, svg]


def unit_text(exponent: int, unit: str) -> str:
    """A unit with its SI prefix as it stands on an axis, with the Greek letter for micro."""
    return prefixed(exponent, unit).replace("u", "µ")


def direct_label(axes: Axes, x: float, y: float, text: str, **changes: Any) -> None:
    """Text at a point of the data, on a white halo so that lines beneath don't cross it."""
    from matplotlib.patheffects import withStroke

    settings: dict[str, Any] = {"fontsize": 7, "color": BLACK, "zorder": 10}
    axes.text(x, y, text, **(settings | changes), path_effects=[withStroke(linewidth=2, foreground="white")])
