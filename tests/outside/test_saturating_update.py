"""Saturating pulse update against its closed forms.

Law: Fusi & Abbott, Nature Neurosci. 10:485 (2007); Frascaroli et al., Sci. Rep. 8:7178 (2018), both from memory. Input
values are illustrative. The sinh law of the voltage: Guan, Yu, Wong, IEEE EDL 33:1405 (2012), from memory.
"""

from math import cosh, exp, log, tanh

import numpy as np
import pytest
from scipy.integrate import quad, solve_ivp
from scipy.optimize import brentq

from device_models.contract_checks import parameters_of
from device_models.saturating_update import MODEL, advance, conductance, mean_conductance, rate, state_of

CELL = parameters_of(MODEL, MODEL.sets["fusi2007"]())
US = 1e-6
UP, DOWN = 1.0, -1.0  # nominal voltages: 5 % up and 8 % down in 100 ns
WIDTH = 100e-9


def approx(value, rel=1e-12):
    return pytest.approx(value, rel=rel, abs=0)


def pulses(G, voltage, n, width=WIDTH, p=CELL):
    state = state_of(G, p)
    for _ in range(n):
        state = advance(state, rate(voltage, p) * width, p)
    return conductance(state, 0.1, p)


@pytest.mark.parametrize(("n", "G"), [(1, 14.5), (10, 46.1136755), (50, 93.0749522)])
def test_up(n, G):
    assert pulses(10 * US, UP, n) == approx(G * US, rel=1e-9)
    assert pulses(10 * US, UP, n) == approx((100 - 90 * 0.95**n) * US)


@pytest.mark.parametrize(("n", "G"), [(1, 82.88), (10, 39.6605724), (50, 2.37651635)])
def test_down(n, G):
    assert pulses(90 * US, DOWN, n) == approx(G * US, rel=1e-8)
    assert pulses(90 * US, DOWN, n) == approx((1 + 89 * 0.92**n) * US)


def test_pulses_from_a_tenth_to_nine_tenths():
    # a width of 42.8364878 pulses ends at the target: linear in width
    assert pulses(10 * US, UP, 1, 42.8364878 * WIDTH) == approx(90 * US, rel=1e-9)
    assert pulses(10 * US, UP, 42) < 90 * US <= pulses(10 * US, UP, 43)


def test_symmetry_point():
    def imbalance(G):
        return (pulses(G, UP, 1) - G) - (G - pulses(G, DOWN, 1))

    assert brentq(imbalance, 2 * US, 98 * US, xtol=1e-18) == approx(39.0769231 * US, rel=1e-8)


def test_two_cycle_of_alternating_pulses():
    G = 80 * US
    for _ in range(400):
        G = pulses(pulses(G, UP, 1), DOWN, 1)
    assert approx(37.1428571 * US, rel=2e-9) == G
    assert pulses(G, UP, 1) == approx(40.2857143 * US, rel=2e-9)


def curve(a, part):
    """Normalised conductance (0..1) after a part of a run of equal pulses, the run being 1/a doses long."""
    return advance(0.0, part / a, CELL) / advance(0.0, 1 / a, CELL)


@pytest.mark.parametrize(
    ("a", "asymmetry", "deviation", "at"),
    [
        (0.25, 0.761594156, 0.417462408, 0.351194952),
        (0.5, 0.462117157, 0.237237324, 0.419280319),
        (1.0, 0.244918662, 0.123301561, 0.458675145),
    ],
)
def test_shape_of_a_run(a, asymmetry, deviation, at):
    # g(p) = (1 - exp(-p/a)) / (1 - exp(-1/a)); asymmetry at mid-scale tanh(1/(4a)), derived
    falling = advance(1.0, -0.5 / a, CELL)
    bottom = advance(1.0, -1 / a, CELL)
    assert curve(a, 0.5) - (falling - bottom) / (1 - bottom) == approx(tanh(1 / (4 * a)))
    assert tanh(1 / (4 * a)) == approx(asymmetry, rel=2e-9)
    assert curve(a, at) - at == approx(deviation, rel=5e-9)
    assert curve(a, at) - at >= max(curve(a, p) - p for p in np.linspace(0, 1, 201))


def test_a_fraction_per_pulse_sets_the_shape():
    # e = 0.05, 64 pulses: A = -1 / ln(1 - e) = 19.4957257 pulses, a = A / 64
    assert 1 / (rate(UP, CELL) * WIDTH) == approx(19.4957257, rel=3e-9)
    assert 1 / (rate(UP, CELL) * WIDTH) / 64 == approx(0.304620715, rel=3e-9)


@pytest.mark.parametrize(("voltage", "half", "third"), [(1.0, 656.524319, 5707.01742), (2.0, 4.31022181e5, 3.25586338e7)])
def test_half_select_ratios_of_sinh_kinetics(voltage, half, third):
    # t(V/2)/t(V) = 2 cosh(A V/2), t(V/3)/t(V) = 1 + 2 cosh(2 A V/3), derived
    A = 1 / CELL.set_scale
    assert approx(12.9739148, rel=4e-9) == A
    for sign in (1.0, -1.0):
        assert rate(sign * voltage, CELL) / rate(sign * voltage / 2, CELL) == approx(half, rel=2e-9)
        assert rate(sign * voltage, CELL) / rate(sign * voltage / 3, CELL) == approx(third, rel=2e-9)
    assert 2 * cosh(A * voltage / 2) == approx(half, rel=2e-9)


def test_steepness_in_decades_per_volt():
    # gamma a0 q / (L k T) at 298.15 K: 5.63449962 decades per volt where sinh is an exponential
    assert log(rate(2.5, CELL) / rate(1.5, CELL)) / log(10) == approx(5.63449962, rel=1e-8)


def test_rate_neither_overflows_nor_leaks():
    steep = CELL._replace(set_scale=1e-3, reset_scale=1e-3, set_voltage=1.2, reset_voltage=1.2)
    assert 0.0 < rate(1.0, steep) < rate(1.2, steep) < rate(5.0, steep) < float("inf")
    assert rate(1.2, steep) == approx(CELL.set_rate)
    assert rate(0.0, steep) == 0.0
    for tiny in (1e-6, 1e-12, 1e-18):
        assert rate(-tiny, CELL) <= 0.0 <= rate(tiny, CELL)
    # the linear foot of sinh
    assert rate(1e-6, CELL) == approx(CELL.set_rate * 1e-6 / CELL.set_scale / np.sinh(1 / CELL.set_scale), rel=1e-9)


@pytest.mark.parametrize("voltage", [1.05, -0.95])
def test_trajectory_and_energy_against_libraries(voltage):
    A, width, start = 1 / CELL.set_scale, 700e-9, 40 * US
    speed = np.sign(voltage) * np.sinh(A * abs(voltage)) / np.sinh(A)
    speed *= -log(0.95) / WIDTH if voltage > 0 else -log(0.92) / WIDTH
    goal = 100 * US if voltage > 0 else 1 * US
    flow = solve_ivp(lambda _, G: abs(speed) * (goal - G), (0, width), [start], rtol=1e-11, atol=1e-11 * start)
    assert pulses(start, voltage, 1, width) == approx(flow.y[0, -1], rel=1e-9)
    before = state_of(start, CELL)
    dose = rate(voltage, CELL) * width
    mean = mean_conductance(before, advance(before, dose, CELL), dose, voltage, CELL)
    by_hand = quad(lambda t: goal + (start - goal) * exp(-abs(speed) * t), 0, width, epsabs=0, epsrel=1e-12)[0] / width
    assert mean == approx(by_hand, rel=1e-9)
