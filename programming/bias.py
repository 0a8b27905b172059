"""Bias schemes: what the four classes of cell see while one cell is selected.

The selected word line is at V and the selected bit line at 0; the unselected word lines are held at a fraction `word`
of V, the unselected bit lines at a fraction `bit`. V/2 is (1/2, 1/2), V/3 is (1/3, 2/3), all grounded is (0, 0).
Elementary circuit laws; common practice, no source.
"""

from __future__ import annotations

from dataclasses import dataclass


@dataclass(frozen=True)
class BiasScheme:
    """Fractions of the selected voltage on the unselected word and bit lines."""

    name: str
    word: float
    bit: float

    @property
    def same_row(self) -> float:
        """Fraction of V across the cells that share the selected word line."""
        return 1.0 - self.bit

    @property
    def same_column(self) -> float:
        """Fraction of V across the cells that share the selected bit line."""
        return self.word

    @property
    def rest(self) -> float:
        """Fraction of V across all other cells (negative: reverse polarity)."""
        return self.word - self.bit

    def class_counts(self, rows: int, columns: int) -> dict[str, int]:
        """Number of cells in each class while one cell is selected."""
        return {
            "selected": 1,
            "same_row": columns - 1,
            "same_column": rows - 1,
            "rest": (rows - 1) * (columns - 1),
        }


SCHEMES = {
    "V/2": BiasScheme("V/2", 1 / 2, 1 / 2),
    "V/3": BiasScheme("V/3", 1 / 3, 2 / 3),
    "grounded": BiasScheme("grounded", 0.0, 0.0),
}
