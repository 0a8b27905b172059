"""The error axis that two figures share: in siemens where the band is one width, else in half widths of the band."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from benchmarks.engineering import prefix_exponent
from benchmarks.error_scale import BINS_PER_HALF_WIDTH, ErrorScale
from benchmarks.figure_style import unit_text

_SHOWN = 0.98
_MOST_BINS = 64  # bars on the axis
_CELLS_PER_BIN = 12  # on average, or bins are merged further


@dataclass(frozen=True)
class ErrorAxis:
    """unit: what one half width of the band measures on the axis; the rest: how axis, unit and band are written."""

    unit: float
    label: str
    short_unit: str
    band_text: str


def error_axis(scale: ErrorScale) -> ErrorAxis:
    """How errors are shown for this job."""
    if scale.band is None:
        return ErrorAxis(1.0, "final error (half widths of the band)", "", f"±{100 * scale.fraction:g} % of target")
    exponent = prefix_exponent(scale.band)
    half, unit = scale.band / 10.0**exponent, unit_text(exponent, "S")
    return ErrorAxis(half, f"final error ({unit})", unit, f"±{half:.4g} {unit}")


def merged_bins(histogram: npt.NDArray[np.int64], reach: int) -> tuple[npt.NDArray[np.float64], npt.NDArray[np.int64]]:
    """Edges (in half widths) and counts of the bins within `reach` half widths, merged to a number that can be read.

    histogram: (..., bins of ErrorScale.bin_of). The edges of the band stay edges of bins.
    """
    middle, far = histogram.shape[-1] // 2, reach * BINS_PER_HALF_WIDTH
    inner = histogram[..., middle - far : middle + far]
    typical = inner.sum(axis=-1).mean()
    merged = 2
    while merged < BINS_PER_HALF_WIDTH and (2 * far > _MOST_BINS * merged or typical * merged < 2 * far * _CELLS_PER_BIN):
        merged *= 2
    counts = inner.reshape(*inner.shape[:-1], -1, merged).sum(axis=-1)
    return np.linspace(-reach, reach, counts.shape[-1] + 1), counts


def central_span(histogram: npt.NDArray[np.int64], span: int) -> int:
    """Half widths to show on either side: at least two, and enough for 98 % of the cells."""
    middle, cells = histogram.size // 2, histogram.sum()
    for reach in range(2, span):
        far = reach * BINS_PER_HALF_WIDTH
        if histogram[middle - far : middle + far].sum() >= _SHOWN * cells:
            return reach
    return span
