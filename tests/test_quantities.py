"""Text with units to SI floats: exact, of the right kind, and never a bare number."""

from __future__ import annotations

import pytest

from benchmarks.quantities import QuantityError, parse_quantity, text_of

# Written out: (text, unit, the float literal it must equal bit for bit).
EXACT = [
    ("50 ns", "s", 50e-9),
    ("100ns", "s", 100e-9),
    ("1.2 V", "V", 1.2),
    ("-1.05 V", "V", -1.05),
    ("20 uS", "S", 20e-6),
    ("20 µS", "S", 20e-6),
    ("20 μS", "S", 20e-6),
    ("1.5 ohm", "ohm", 1.5),
    ("10 kΩ", "ohm", 10e3),
    ("2 %", "%", 0.02),
    ("300 ppm", "%", 300e-6),
    ("27 degC", "K", 300.15),
    ("1e-3 S", "S", 1e-3),
    (".5 mV", "V", 0.5e-3),
    ("1 h", "s", 3600.0),
    ("2 MHz", "1/s", 2e6),
    ("5 um^2/(V s)", "m^2/(V s)", 5e-12),
    ("30 %", "", 0.3),
]


@pytest.mark.parametrize(("text", "unit", "value"), EXACT)
def test_exact_values(text: str, unit: str, value: float) -> None:
    assert parse_quantity(text, unit) == value


def test_pure_numbers_need_no_unit() -> None:
    assert parse_quantity(0.3, "") == 0.3
    assert parse_quantity(3, "") == 3.0


@pytest.mark.parametrize(
    ("value", "unit", "says"),
    [
        (50, "s", "bare number 50"),
        ("50", "s", "has no unit"),
        (0.02, "%", 'such as "2 %"'),
        ("50 nS", "s", "did you mean 'ns'?"),
        ("20 us", "S", "did you mean 'uS'?"),
        ("1.5 v", "V", "did you mean 'V'?"),
        ("5 rad", "%", "pure number"),
        ("2 %", "S", "pure number"),
        ("1,5 V", "V", "not known"),
        ("2*3 ns", "s", "not known"),
        ("__import__('os') s", "s", "not a number"),
        ("nan s", "s", "finite"),
        ("-inf V", "V", "finite"),
        ("1e300 Gs", "s", "finite"),
        (True, "s", "got true"),
        (["1 s"], "s", "must be a time"),
        (float("nan"), "", "finite"),
        ("0.3", "", "without quotes"),
        ("5 mdegC", "K", "not known"),
    ],
)
def test_refusals_say_why(value: object, unit: str, says: str) -> None:
    with pytest.raises(QuantityError) as caught:
        parse_quantity(value, unit)
    assert says in str(caught.value)
    assert "\n" not in str(caught.value)


@pytest.mark.parametrize(
    ("value", "unit", "text"),
    [
        (50e-9, "s", "50 ns"),
        (1.2, "V", "1.2 V"),
        (0.02, "%", "2 %"),
        (9.999999999e-7, "S", "1 uS"),
        (0.0, "S", "0 S"),
        (300.0, "K", "300 K"),
        (-0.8, "V", "-800 mV"),
        (1e-22, "J", "0.0001 aJ"),
        (2e6, "1/s", "2e+06 1/s"),
    ],
)
def test_back_to_text(value: float, unit: str, text: str) -> None:
    assert text_of(value, unit) == text
