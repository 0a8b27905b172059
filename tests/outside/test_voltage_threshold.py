"""Voltage-threshold model against its closed forms and an ODE library.

Law: Kvatinsky, Ramadan, Friedman, Kolodny, IEEE TCAS-II 62:786 (2015), doi 10.1109/TCSII.2015.2433536 (abstract seen;
equations from memory). Energies are derived by integration. Input values are illustrative.
"""

from math import exp, log

import numpy as np
import pytest
from scipy.integrate import quad, solve_ivp

from device_models import windows
from device_models.contract_checks import parameters_of
from device_models.resistance_laws import EXPONENTIAL_RESISTANCE, LINEAR_CONDUCTANCE, LINEAR_RESISTANCE
from device_models.voltage_threshold import MODEL, advance, conductance, mean_conductance, rate, state_of
from tests.twins.plain_cells import window

CELL = parameters_of(MODEL, MODEL.sets["kvatinsky2015"]())
V, T = 0.9, 100e-9
R_ON, R_OFF, X_OFF = 1e3, 1e5, 3e-9


def approx(value, rel):
    return pytest.approx(value, rel=rel, abs=0)


def pulse(x, voltage, width, p=CELL):
    return advance(x, rate(voltage, p) * width, p)


def resistance(x, p=CELL):
    return 1 / conductance(x, 0.1, p)


def energy(x, voltage, width, p):
    dose = rate(voltage, p) * width
    return voltage**2 * width * mean_conductance(x, advance(x, dose, p), dose, voltage, p)


def test_speed_and_switching_time():
    # the dose counts towards x_on, so RESET is negative
    assert rate(V, CELL) == approx(-1.024000e-2, rel=1e-12)
    assert X_OFF / -rate(V, CELL) == approx(2.929688e-7, rel=2e-7)
    assert pulse(0.0, V, 2.929688e-7 * (1 + 1e-6)) == X_OFF
    assert pulse(0.0, V, 2.929688e-7 * (1 - 1e-6)) < X_OFF


def test_state_and_resistance_after_a_pulse():
    assert pulse(0.0, V, T) == approx(1.024000e-9, rel=1e-12)
    assert resistance(pulse(0.0, V, T)) == approx(34792.000, rel=1e-12)
    exponential = CELL._replace(law=EXPONENTIAL_RESISTANCE)
    assert resistance(pulse(0.0, V, T, exponential), exponential) == approx(4815.780309, rel=1e-9)


def test_energy_of_a_pulse():
    # E = V^2 / (s xdot) ln(R1/R0), and V^2 (w / (R_on lam xdot)) (1 - exp(-lam xdot t / w)); picojoules: relative only
    assert energy(0.0, V, T, CELL) == approx(8.507942279e-12, rel=1e-9)
    slope = (R_OFF - R_ON) / X_OFF
    assert energy(0.0, V, T, CELL) == approx(V**2 / (slope * 1.024e-2) * log(34.792), rel=1e-12)
    exponential = CELL._replace(law=EXPONENTIAL_RESISTANCE)
    assert energy(0.0, V, T, exponential) == approx(4.082980714e-11, rel=1e-9)
    lam = log(R_OFF / R_ON)
    closed = V**2 * X_OFF / (R_ON * lam * 1.024e-2) * (1 - exp(-lam * 1.024e-2 * T / X_OFF))
    assert energy(0.0, V, T, exponential) == approx(closed, rel=1e-12)


@pytest.mark.parametrize("law", [LINEAR_RESISTANCE, EXPONENTIAL_RESISTANCE, LINEAR_CONDUCTANCE])
def test_energy_goes_on_at_the_bound(law):
    p = CELL._replace(law=law)
    reached = X_OFF / 1.024e-2
    assert energy(0.0, V, 3 * reached, p) == approx(energy(0.0, V, reached, p) + V**2 * 2 * reached / R_OFF, rel=1e-12)


def test_logistic_window():
    # window 1 - (2u - 1)^2, u0 = 0.1, 300 ns
    p = CELL._replace(window=windows.JOGLEKAR)
    assert pulse(0.1 * X_OFF, V, 3e-7, p) == approx(2.6092585946e-9, rel=1e-10)


def test_dead_zone_is_exactly_zero():
    for voltage in (0.0, -0.0, 0.5, -0.5, 0.499999999999, -0.1, 5e-324):
        assert rate(voltage, CELL) == 0.0
        for x in (1e-10, 1.7e-9, 2.9e-9):
            assert advance(x, rate(voltage, CELL) * 1e9, CELL) == approx(x, rel=3e-16)
    assert rate(np.nextafter(0.5, 1.0), CELL) < 0.0 < rate(np.nextafter(-0.5, -1.0), CELL)


def test_positive_voltage_is_reset():
    assert MODEL.set_polarity == -1
    middle = 0.5 * X_OFF
    assert resistance(pulse(middle, V, 1e-8)) > resistance(middle) > resistance(pulse(middle, -V, 1e-8))


def test_both_directions_of_an_unequal_cell():
    # Talati et al., IEEE TNANO 15:635 (2016), from memory: thresholds -1.5 V and 0.3 V, speeds -216.2 and 0.091 m/s
    p = parameters_of(MODEL, MODEL.sets["talati2016"]())
    assert rate(-2.1, p) == approx(216.2 * 0.4**4, rel=1e-12)
    assert rate(0.9, p) == approx(-0.091 * 2.0**4, rel=1e-12)
    assert rate(-1.4, p) == 0.0


@pytest.mark.parametrize("kind", range(5))
@pytest.mark.parametrize("exponent", [1.0, 3.0])
@pytest.mark.parametrize("voltage", [0.9, -0.85])
def test_trajectory_against_an_ode_library(kind, exponent, voltage):
    p = CELL._replace(window=float(kind), window_exponent=exponent)
    start, width = 1.1e-9, 110e-9
    over = (abs(voltage) / 0.5 - 1) ** 3

    def speed(_, x):
        u = min(max(x[0] / X_OFF, 0.0), 1.0)
        return [np.sign(voltage) * 0.02 * over * window(windows.CHOICES[kind], exponent, u, voltage > 0)]

    # x is in metres: an absolute tolerance of the library's default 1e-6 would be no error control at all
    end = solve_ivp(speed, (0.0, width), [start], method="DOP853", rtol=1e-11, atol=1e-11 * X_OFF).y[0, -1]
    ours = pulse(start, voltage, width, p)
    assert ours == approx(end, rel=1e-9 if exponent == 1 else 1e-6)
    assert abs(ours - start) > 0.02 * X_OFF


@pytest.mark.parametrize("law", [LINEAR_RESISTANCE, EXPONENTIAL_RESISTANCE, LINEAR_CONDUCTANCE])
def test_energy_under_a_saturating_window_against_quadrature(law):
    p = CELL._replace(window=windows.DISTANCE_LEFT, law=law)
    for voltage in (0.9, -0.9):
        dissipated = quad(lambda t, v=voltage: v**2 * conductance(pulse(1e-9, v, t, p), v, p), 0, 5e-7, epsabs=0, epsrel=1e-11)[
            0
        ]
        assert energy(1e-9, voltage, 5e-7, p) == approx(dissipated, rel=1e-6)


def test_demo_cell_does_what_its_sheet_says():
    p = parameters_of(MODEL, MODEL.sets["demo_oxide"]())
    low, high = MODEL.bounds(p)
    assert (low, high) == (approx(10e-6, rel=1e-12), approx(100e-6, rel=1e-12))
    start = state_of(30e-6, p)
    up = conductance(pulse(start, -1.3 * 1.05, 100e-9, p), 0.2, p)
    down = conductance(pulse(start, 1.3 * 1.05, 100e-9, p), 0.2, p)
    assert (up - 30e-6) / (high - 30e-6) == approx(0.1, rel=0.01)
    assert (30e-6 - down) / (30e-6 - low) == approx(0.1, rel=0.01)
    assert rate(0.8, p) == rate(-0.8, p) == 0.0
