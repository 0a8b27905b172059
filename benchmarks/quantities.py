"""Quantities with units: "50 ns", "1.2 V", "20 uS", "1.5 ohm", "2 %" to floats in SI units, and back to text.

Units are read by the pint library, with decimal arithmetic, so that "50 ns" is the very float 50e-9.
"""

from __future__ import annotations

import math
import re
from decimal import Decimal
from functools import lru_cache
from typing import Any

from benchmarks.errors import shown

# SI unit -> what a person calls it, and an example of how to write it. "%" stands for a fraction given in per cent.
KINDS = {
    "s": ("a time", "50 ns"),
    "V": ("a voltage", "1.2 V"),
    "S": ("a conductance", "20 uS"),
    "ohm": ("a resistance", "1.5 ohm"),
    "K": ("a temperature", "300 K"),
    "Hz": ("a frequency", "1 Hz"),
    "A": ("a current", "10 uA"),
    "m": ("a length", "3 nm"),
    "J": ("an energy", "1 pJ"),
    "F": ("a capacitance", "20 aF"),
    "C": ("a charge", "1 pC"),
    "%": ("a fraction in per cent", "2 %"),
}
_NUMBER = re.compile(r"\s*([+-]?(?:\d+(?:\.\d*)?|\.\d+)(?:[eE][+-]?\d+)?|[+-]?(?:nan|inf(?:inity)?))\s*(.*?)\s*", re.I)
_UNIT = re.compile(r"[1A-Za-zµμΩ°%‰][\w µμΩ°%‰^*/().-]*")
FRACTION_UNITS = ("%", "‰", "percent", "permille", "ppm")
_PREFIXES = {-18: "a", -15: "f", -12: "p", -9: "n", -6: "u", -3: "m", 0: "", 3: "k", 6: "M", 9: "G", 12: "T"}


class QuantityError(ValueError):
    """Text that is not a quantity of the kind asked for; the message says what was expected and what was found."""


@lru_cache(maxsize=1)
def registry() -> Any:
    """The one unit registry, made when first asked for."""
    import pint

    return pint.UnitRegistry(non_int_type=Decimal)


def parse_quantity(value: object, unit: str) -> float:
    """A quantity as a float in `unit`.

    value: what stood in the scenario: text with a unit, or, where `unit` is "" (a pure number), a number or per cent.
    unit: SI unit as text, "" for a pure number, "%" for a fraction, which must be written in per cent.
    Raises QuantityError for a bare number, a wrong dimension, an unknown unit, NaN and infinity.
    """
    if unit == "" and isinstance(value, int | float) and not isinstance(value, bool):
        return _finite(float(value), value)
    wanted = _wanted(unit)
    if isinstance(value, bool) or not isinstance(value, str | int | float):
        raise QuantityError(f"must be {wanted}, got {shown(value)}")
    if not isinstance(value, str):
        raise QuantityError(f"must be {wanted}, got the bare number {value} without a unit")
    match = _NUMBER.fullmatch(value)
    if match is None:
        raise QuantityError(f"must be {wanted}, got {shown(value)}, which is not a number followed by a unit")
    number, unit_text = match.groups()
    _finite(float(number), value)
    if unit_text == "" and unit == "":
        raise QuantityError(f"must be a number, got {shown(value)}, which is text: write it without quotes")
    if unit_text == "":
        raise QuantityError(f"must be {wanted}, got {shown(value)}, which has no unit")
    return _finite(_converted(number, unit_text, unit, value), value)


def _converted(number: str, unit_text: str, unit: str, value: str) -> float:
    given = _unit(unit_text, unit, value)
    wanted = _wanted(unit)
    if unit in ("%", ""):
        if unit_text not in FRACTION_UNITS:
            raise QuantityError(f"must be {wanted}, got {shown(value)}, {_kind_of(given)}")
        target = registry().Unit("dimensionless")
    else:
        target = registry().Unit(unit)
        if given.dimensionality != target.dimensionality or unit_text in FRACTION_UNITS:
            raise QuantityError(f"must be {wanted}, got {shown(value)}, {_kind_of(given)}{_other_case(unit_text, target)}")
    try:
        return float(registry().Quantity(Decimal(number), given).to(target).magnitude)
    except ArithmeticError as error:
        raise QuantityError(f"must be {wanted}, got {shown(value)}, which is out of all range") from error


def _unit(text: str, wanted: str, value: str) -> Any:
    unit = _unit_or_none(text)
    if unit is None:
        hint = "" if wanted in ("%", "") else _other_case(text, registry().Unit(wanted))
        raise QuantityError(f"must be {_wanted(wanted)}, got {shown(value)}, whose unit {text!r} is not known{hint}")
    return unit


def _unit_or_none(text: str) -> Any:
    """The unit that pint reads, None where it reads none."""
    import pint

    if len(text) > 40 or not _UNIT.fullmatch(text):
        return None
    try:
        return registry().Unit(text)
    except (pint.PintError, ValueError, TypeError, AssertionError, AttributeError, KeyError, ArithmeticError):
        return None


def _wanted(unit: str) -> str:
    if unit == "":
        return "a number"
    kind, example = KINDS.get(unit, (f"a quantity in {unit}", f"1 {unit}"))
    return f'{kind}, such as "{example}"' if unit == "%" else f'{kind} with its unit, such as "{example}"'


def _kind_of(given: Any) -> str:
    if given.dimensionless:
        return "which is a pure number"
    for unit, (kind, _example) in KINDS.items():
        if unit != "%" and registry().Unit(unit).dimensionality == given.dimensionality:
            return f"which is {kind}"
    return f"which is a quantity in {given:~}"


def _other_case(unit_text: str, target: Any) -> str:
    """A hint for "50 nS" where "50 ns" was meant."""
    for candidate in (unit_text[:-1] + unit_text[-1:].swapcase(), unit_text.lower(), unit_text.swapcase()):
        unit = _unit_or_none(candidate) if candidate != unit_text else None
        if unit is not None and unit.dimensionality == target.dimensionality:
            return f" (did you mean {candidate!r}?)"
    return ""


def _finite(number: float, value: object) -> float:
    if not math.isfinite(number):
        raise QuantityError(f"must be a finite number, got {shown(value)}")
    return number


def text_of(value: float, unit: str) -> str:
    """A value in SI units as a person writes it: text_of(5e-8, "s") is "50 ns", text_of(0.02, "%") is "2 %"."""
    if unit == "%":
        return f"{value * 100:.6g} %"
    if unit == "":
        return f"{value:.6g}"
    if value == 0 or not math.isfinite(value) or unit not in KINDS or unit == "K":
        return f"{value:.6g} {unit}"
    exponent = 3 * math.floor(math.log10(abs(float(f"{value:.6g}"))) / 3)
    exponent = min(max(exponent, -18), 12)
    return f"{value / 10.0**exponent:.6g} {_PREFIXES[exponent]}{unit}"
