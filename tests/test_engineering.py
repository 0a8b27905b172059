"""Numbers as engineers read them."""

import pytest

from benchmarks.engineering import engineering, prefix_exponent, unit_for


@pytest.mark.parametrize(
    ("value", "unit", "text"),
    [
        (1.2346e-8, "S", "12.35 nS"),
        (5e-8, "s", "50.00 ns"),
        (0.0, "J", "0 J"),
        (-3.2e-6, "S", "-3.200 uS"),
        (999.96e-6, "S", "1.000 mS"),
        (999.94e-6, "S", "999.9 uS"),
        (9.99996e-6, "S", "10.00 uS"),
        (4.2e-21, "J", "0.004200 aJ"),
        (7.5e13, "J", "75.00 TJ"),
        (1.0, "s", "1.000 s"),
    ],
)
def test_four_significant_digits_and_a_prefix(value, unit, text):
    assert engineering(value, unit) == text


@pytest.mark.parametrize(("value", "text"), [(9.996e-12, "10.0 pJ"), (1.234e-12, "1.23 pJ"), (1e-9, "1.00 nJ")])
def test_three_significant_digits(value, text):
    assert engineering(value, "J", 3) == text


@pytest.mark.parametrize(
    ("value", "interval", "unit", "texts"),
    [
        (1.2346e-6, (1.21e-6, 1.26e-6), "S", ("1.235 uS", "1.210", "1.260")),
        (6.1669e-6, (5.7673e-6, 6.5943e-6), "S", ("6.17 uS", "5.77", "6.59")),
        (0.98765, (0.9871, 0.9882), "%", ("98.765 %", "98.710", "98.820")),
        (11.3612, (10.9953, 11.7273), "", ("11.36", "11.00", "11.73")),
        (150e-9, (20e-9, 280e-9), "S", ("150 nS", "20", "280")),
        (5e-12, (-1e-14, 1.001e-11), "J", ("5.0 pJ", "0.0", "10.0")),
    ],
)
def test_two_digits_of_the_half_width(value, interval, unit, texts):
    shown = unit_for(value, unit, interval)
    assert (shown.text(value), shown.number(interval[0]), shown.number(interval[1])) == texts


def test_prefix_follows_the_rounded_number():
    assert [prefix_exponent(value) for value in (0.0, 1e-6, 9.9994e-7, 9.99999e-7, 1e-30, 1e30)] == [0, -6, -9, -6, -18, 12]
