"""Linear ion drift against its closed forms and an ODE library.

Law: Strukov, Snider, Stewart, Williams, Nature 453:80 (2008), from memory. Windows: Joglekar & Wolf, Eur. J. Phys.
30:661 (2009), arXiv 0807.3994; Biolek, Biolek & Biolkova, Radioengineering 18:210 (2009), from memory; Prodromakis et
al., IEEE TED 58:3099 (2011), from memory. Closed forms under a window are derived from these laws. Numbers to ten
digits were computed independently of this program.
"""

from math import cos, log, pi, sin

import numpy as np
import pytest
from scipy.integrate import quad, solve_ivp

from device_models import windows
from device_models.linear_ion_drift import (
    MODEL,
    Parameters,
    advance,
    conductance,
    mean_conductance,
    rate,
    state_of,
    travel_in_steps,
)
from tests.twins.plain_cells import window

R_ON, R_OFF, X0 = 100.0, 16e3, 0.1
CELL = Parameters(R_on=R_ON, R_off=R_OFF, mobility=1e-14, thickness=10e-9, window=windows.NONE, window_exponent=1.0)
K = 1e4  # 1/C
DIGITS_10 = 5e-10


def approx(value, rel):
    return pytest.approx(value, rel=rel, abs=0)


def windowed(kind, exponent=1.0):
    return CELL._replace(window=kind, window_exponent=exponent)


def at_flux(flux, p=CELL, x0=X0):
    return advance(x0, rate(1.0, p) * flux, p)


def resistance(x, p=CELL):
    return 1.0 / conductance(x, 0.1, p)


def test_full_switch_charge():
    assert 1.0 / rate(1.0, CELL) == approx(1.000000e-4, rel=1e-12)


@pytest.mark.parametrize(
    ("flux", "M", "x", "q"),
    [
        (0.05, 13847.3138189, 0.135389068, 3.53890680e-6),
        (0.20, 12002.0039993, 0.251446289, 1.51446289e-5),
        (0.50, 6974.81899407, 0.567621447, 4.67621447e-5),
    ],
)
def test_square_root_law(flux, M, x, q):
    after = at_flux(flux)
    dose = rate(1.0, CELL) * flux
    assert after == approx(x, rel=1e-8)
    assert resistance(after) == approx(M, rel=DIGITS_10)
    assert resistance(after) ** 2 == approx(14410.0**2 - 2 * K * (R_OFF - R_ON) * flux, rel=1e-12)
    # the charge that passed: flux times the mean conductance
    assert flux * mean_conductance(X0, after, dose, 1.0, CELL) == approx(q, rel=1e-8)


@pytest.mark.parametrize(("x0", "time"), [(0.1, 0.652950), (0.0, 0.805000)])
def test_time_to_switch_at_one_volt(x0, time):
    assert at_flux(time * (1 + 1e-12), x0=x0) == 1.0
    assert at_flux(time * (1 - 1e-6), x0=x0) < 1.0
    assert time == approx((resistance(x0) ** 2 - R_ON**2) / (2 * K * (R_OFF - R_ON)), rel=1e-12)


def sine_current(theta, frequency):
    # any waveform of one polarity of flux: the state depends on the flux alone
    flux = (1 - cos(theta)) / (2 * pi * frequency)
    return sin(theta) * conductance(at_flux(flux), 0.1, CELL)


def test_sine_drive():
    assert sine_current(pi / 4, 1.0) == approx(5.092183e-5, rel=2e-7)
    assert sine_current(pi / 2, 1.0) == approx(7.979933e-5, rel=2e-7)
    assert sine_current(3 * pi / 4, 1.0) == approx(6.421633e-5, rel=2e-7)
    assert resistance(at_flux(1.0 / pi)) == approx(10316.2763, rel=1e-8)


def test_loop_is_odd_symmetric_and_pinched():
    for theta in np.linspace(0.1, 3.0, 7):
        assert sine_current(2 * pi - theta, 1.0) == approx(-sine_current(theta, 1.0), rel=1e-9)
    assert sine_current(0.0, 1.0) == 0.0


@pytest.mark.parametrize(
    ("frequency", "area"), [(1.0, -8.927705e-6), (2.0, -3.450833e-6), (10.0, -5.852082e-7), (100.0, -5.658805e-8)]
)
def test_lobe_area(frequency, area):
    by_quadrature = quad(lambda theta: sine_current(theta, frequency) * cos(theta), 0, pi, epsabs=0, epsrel=1e-10, limit=200)[0]
    assert by_quadrature == approx(area, rel=1e-6)


def test_lobe_area_tends_to_its_high_frequency_limit():
    frequency = 1e4
    area = quad(lambda t: sine_current(t, frequency) * cos(t), 0, pi, epsabs=0, epsrel=1e-8, limit=400)[0]
    assert area == approx(-(2 / 3) * K * (R_OFF - R_ON) / (2 * pi * frequency * 14410.0**3), rel=1e-4)


def test_energy_per_period():
    # 1 Hz: the average of v^2 G over the period
    energy = quad(lambda t: sin(t) * sine_current(t, 1.0), 0, 2 * pi, epsabs=0, epsrel=1e-10)[0] / (2 * pi)
    assert energy == approx(4.030376e-5, rel=2e-7)


def test_energy_of_a_constant_voltage_is_charge_times_voltage():
    # from x = 0.1 to 0.6: 5e-5 C, 0.52175 Vs
    after = at_flux(0.52175)
    assert after == approx(0.6, rel=1e-12)
    dose = rate(1.0, CELL) * 0.52175
    assert 0.52175 * mean_conductance(X0, after, dose, 1.0, CELL) == approx(5e-5, rel=1e-12)


def test_dropping_the_low_resistance_is_a_limit_not_the_law():
    after = at_flux(0.5)
    limit = R_OFF * (1 - after)
    assert resistance(after) == approx(limit + R_ON * after, rel=1e-12)
    assert abs(limit / resistance(after) - 1) > 0.005


# x, p, Joglekar, Biolek i > 0, Biolek i < 0, Prodromakis j = 1
WINDOW_TABLE = [
    (0.1, 1, 0.360000, 0.990000, 0.190000, 0.090000),
    (0.1, 2, 0.590400, 0.999900, 0.343900, 0.171900),
    (0.1, 10, 0.988470785, 1 - 1e-20, 0.878423345, 0.610583882),
    (0.3, 2, 0.974400, 0.991900, 0.759900, 0.375900),
    (0.5, 1, 1.0, 0.75, 0.75, 0.25),
    (0.5, 2, 1.0, 0.9375, 0.9375, 0.4375),
    (0.5, 10, 1.0, 0.999999046, 0.999999046, 0.943686485),
    (0.9, 2, 0.590400, 0.343900, 0.999900, 0.171900),
]


@pytest.mark.parametrize(("x", "p", "joglekar", "up", "down", "prodromakis"), WINDOW_TABLE)
def test_window_values(x, p, joglekar, up, down, prodromakis):
    for rising in (True, False):
        assert windows.window(windows.JOGLEKAR, p, x, rising) == approx(joglekar, rel=1e-9)
        assert windows.window(windows.PRODROMAKIS, p, x, rising) == approx(prodromakis, rel=1e-9)
    assert windows.window(windows.BIOLEK, p, x, True) == approx(up, rel=1e-9)
    assert windows.window(windows.BIOLEK, p, x, False) == approx(down, rel=1e-9)


@pytest.mark.parametrize(("p", "unity"), [(1, 4.0), (2, 2.285714), (10, 1.059674)])
def test_prodromakis_window_does_not_peak_at_one(p, unity):
    peak = max(windows.window(windows.PRODROMAKIS, p, x, True) for x in np.linspace(0, 1, 101))
    assert peak == approx(1 - 0.75**p, rel=1e-12)
    assert 1 / peak == approx(unity, rel=5e-7)


def test_windowed_closed_forms():
    q = K * 5e-5
    assert windows.flow(windows.JOGLEKAR, 1.0, 0.1, q) == approx(0.450853060379, rel=5e-12)
    assert windows.flow(windows.BIOLEK, 1.0, 0.1, q) == approx(0.537288150009, rel=5e-12)
    assert windows.flow(windows.BIOLEK, 1.0, 0.8, -q) == approx(0.393900626628, rel=5e-12)


def test_joglekar_flux_to_reach_a_state():
    # phi = [Roff ln(x/x0) + Ron ln((1-x0)/(1-x))] / (4k), derived
    p = windowed(windows.JOGLEKAR)
    after = at_flux(0.603623588552, p)
    assert after == approx(0.450853060379, rel=5e-12)
    for x0, x in ((1e-4, 0.9999), (0.3, 0.31), (0.999, 0.01)):
        flux = (R_OFF * log(x / x0) + R_ON * log((1 - x0) / (1 - x))) / (4 * K)
        assert at_flux(flux, p, x0) == approx(x, rel=1e-11)


def test_absorbing_ends_do_not_hold_a_cell():
    for kind in (windows.JOGLEKAR, windows.PRODROMAKIS):
        p = windowed(kind)
        low, high = MODEL.bounds(p)
        for end in (0.0, 1.0):
            assert windows.window(kind, 1.0, end, True) == 0.0
        assert 0.0 < state_of(0.5 * low, p) <= 1e-6
        assert 1e-10 <= 1.0 - state_of(2.0 * high, p) <= 1e-6
        assert advance(advance(0.0, 1e9, p), -1e9, p) < 0.01
        assert advance(0.0, 1e9, p) > 0.99


def ode(p, x0, dose):
    # An ODE library with its tolerances far below the state.
    def speed(_, x):
        f = window(windows.CHOICES[int(p.window)], p.window_exponent, min(max(x[0], 0.0), 1.0), dose > 0)
        return [np.sign(dose) * f / (R_ON * x[0] + R_OFF * (1 - x[0]))]

    return solve_ivp(speed, (0.0, abs(dose)), [x0], method="DOP853", rtol=1e-11, atol=1e-13).y[0, -1]


@pytest.mark.parametrize("kind", [windows.JOGLEKAR, windows.BIOLEK, windows.PRODROMAKIS, windows.DISTANCE_LEFT])
@pytest.mark.parametrize("exponent", [1.0, 2.0, 10.0])
def test_windowed_trajectories_against_an_ode_library(kind, exponent):
    p = windowed(kind, exponent)
    for x0, flux in ((0.1, 0.3), (0.1, 0.9), (0.8, -0.2), (0.95, -1.0)):
        dose = rate(1.0, p) * flux
        assert advance(x0, dose, p) == approx(ode(p, x0, dose), rel=1e-6 if exponent > 1 else 1e-9)


@pytest.mark.parametrize("kind", [windows.JOGLEKAR, windows.BIOLEK, windows.PRODROMAKIS])
def test_runge_kutta_is_of_fourth_order(kind):
    exact = windows.runge_kutta(kind, 2.0, 0.2, 0.6, 4000)
    errors = [windows.runge_kutta(kind, 2.0, 0.2, 0.6, n) - exact for n in (20, 40, 80)]
    assert errors[0] / errors[1] == approx(16, rel=0.1)
    assert errors[1] / errors[2] == approx(16, rel=0.06)


def test_stepper_along_the_flux_is_of_fourth_order():
    p = windowed(windows.JOGLEKAR, 2.0)
    dose = rate(1.0, p) * 0.3
    exact = travel_in_steps(0.1, dose, p, 0.001)[0]
    errors = [travel_in_steps(0.1, dose, p, fineness)[0] - exact for fineness in (0.4, 0.2, 0.1)]
    assert errors[0] / errors[1] == approx(16, rel=0.25)
    assert errors[1] / errors[2] == approx(16, rel=0.15)


def test_positive_voltage_is_set():
    assert MODEL.set_polarity == 1
    assert conductance(at_flux(0.1), 0.1, CELL) > conductance(X0, 0.1, CELL)
