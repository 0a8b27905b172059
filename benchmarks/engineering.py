"""Numbers as engineers read them: an SI prefix, and no more digits than the interval around them supports.

For people only: every decision is taken on the numbers themselves.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass

_PREFIXES = ("a", "f", "p", "n", "u", "m", "", "k", "M", "G", "T")
_SMALLEST = -18
_DIGITS = 4  # significant digits of a number without an interval


@dataclass(frozen=True)
class Prefixed:
    """A number in units of 10**exponent of its SI unit, to some decimals, with the unit's text."""

    exponent: int
    decimals: int
    unit: str

    def number(self, value: float) -> str:
        """The value (in SI units) in this unit, without the unit's text."""
        text = f"{value / 10.0**self.exponent:.{self.decimals}f}"
        return text.removeprefix("-") if float(text) == 0.0 else text

    def text(self, value: float) -> str:
        """The value with its unit."""
        return f"{self.number(value)} {self.unit}".rstrip()


def prefix_exponent(value: float, digits: int = _DIGITS) -> int:
    """Exponent of the SI prefix that puts a value between 1 and 1000 (of the nearest prefix there is)."""
    if value == 0.0 or not math.isfinite(value):
        return 0
    # The text is rounded first: 999.99 uS is shown as 1.000 mS.
    exponent = 3 * math.floor(math.log10(float(f"{abs(value):.{digits - 1}e}")) / 3)
    return int(min(max(exponent, _SMALLEST), _SMALLEST + 3 * (len(_PREFIXES) - 1)))


def prefixed(exponent: int, unit: str) -> str:
    """A unit with the SI prefix of that power of ten: prefixed(-6, "S") is "uS"."""
    return _PREFIXES[(exponent - _SMALLEST) // 3] + unit


def unit_for(value: float, unit: str, interval: Sequence[float] | None = None) -> Prefixed:
    """How to show a value with its interval: prefix from the value, two significant digits of the interval's half
    width.

    unit: "S", "J", "s", "" for a pure number (no prefix), "%" for a fraction shown in per cent.
    """
    if unit == "%":
        exponent, text = -2, "%"
    elif unit == "":
        exponent, text = 0, ""
    else:
        exponent = prefix_exponent(value)
        text = prefixed(exponent, unit)
    return Prefixed(exponent, _decimals(value, interval, exponent), text)


def _decimals(value: float, interval: Sequence[float] | None, exponent: int) -> int:
    half = 0.5 * (interval[1] - interval[0]) if interval is not None else 0.0
    if half > 0.0:
        digits = 1 - math.floor(math.log10(half / 10.0**exponent))
    else:
        digits = _significant(value, exponent, _DIGITS)
    return min(max(digits, 0), 6)


def _significant(value: float, exponent: int, digits: int) -> int:
    """Decimals that show so many significant digits of a value in units of 10**exponent, at most 6."""
    if value == 0.0:
        return 0
    rounded = float(f"{abs(value):.{digits - 1}e}")
    return min(max(digits - 1 - math.floor(math.log10(rounded / 10.0**exponent)), 0), 6)


def engineering(value: float, unit: str, digits: int = _DIGITS) -> str:
    """A value with its unit, to that many significant digits: engineering(1.2346e-8, "S") is "12.35 nS"."""
    exponent = prefix_exponent(value, digits)
    return Prefixed(exponent, _significant(value, exponent, digits), prefixed(exponent, unit)).text(value)
