"""Read noise and the converter against published formulas.

Johnson, Phys. Rev. 32:97 (1928); Nyquist, Phys. Rev. 32:110 (1928); Schottky 1918; Machlup, JAP 25:341 (1954); IEEE Std
1241 for the converter (all from memory). Numbers were computed independently from those formulas.
"""

from math import exp, log, pi, sqrt

import numpy as np
import pytest
from scipy.stats import norm

from device_models.contract import NoiseLevels
from device_models.converter import convert, lsb
from device_models.read_noise import (
    crossover_density,
    flicker_variance,
    noise_bandwidth,
    noise_coefficients,
    telegraph_averaging,
    telegraph_correlation,
    telegraph_next,
    telegraph_occupancy,
    telegraph_variance,
    thermal_density,
)
from device_models.voltage_threshold import MODEL

OHMIC, TUNNEL = NoiseLevels(), NoiseLevels(transport="tunnel")
# t0 = 3 ms low, t1 = 1 ms high; a step of 2 uS on 100 uS
TELEGRAPH = NoiseLevels(telegraph=0.02, telegraph_low_dwell=3e-3, telegraph_high_dwell=1e-3)


def approx(value, rel=1e-9):
    return pytest.approx(value, rel=rel, abs=0)


def coefficients(noise, temperature=300.0, thermal=True, shot=True, flicker=False, low=1.0, integration=100e-9):
    return noise_coefficients(0.2, integration, temperature, noise, thermal, shot, flicker, low)


@pytest.mark.parametrize(("temperature", "nanovolts"), [(300.0, 4.07035478), (298.15, 4.05778511), (290.0, 4.00194058)])
def test_johnson_voltage_of_a_kiloohm(temperature, nanovolts):
    assert sqrt(thermal_density(1e-3, temperature)) * 1e3 == approx(nanovolts * 1e-9, rel=2e-9)


def test_johnson_current_of_ten_kiloohm():
    assert sqrt(thermal_density(1e-4, 300.0)) == approx(1.28715920e-12, rel=3e-9)


def test_thermal_noise_of_a_reading():
    G = 50e-6
    assert noise_bandwidth(100e-9) == approx(5e6)
    assert sqrt(thermal_density(G, 300.0) * noise_bandwidth(100e-9)) == approx(2.03517739e-9, rel=3e-9)
    linear, square = coefficients(OHMIC)
    assert square == 0.0
    assert sqrt(linear * G) / G == approx(2.03517739e-4, rel=3e-9)


def test_shot_noise_crossover():
    assert crossover_density(10e-6, 0.2, 300.0) == approx(3.20715295e-24, rel=2e-9)
    # V -> 0 at constant conductance: 4kTG
    assert crossover_density(50e-6 * 1e-6, 1e-6, 300.0) == approx(8.283894e-25, rel=1e-6)
    assert sqrt(crossover_density(10e-6, 0.2, 0.0) * 5e6) == approx(4.00271987e-9, rel=2e-9)


def test_an_ohmic_cell_has_no_shot_noise():
    assert coefficients(OHMIC, shot=True) == coefficients(OHMIC, shot=False)
    assert coefficients(OHMIC, thermal=False, shot=True) == (0.0, 0.0)


def test_a_tunnel_gap_never_adds_thermal_and_shot_noise():
    G = 50e-6
    crossover = coefficients(TUNNEL)[0] * G * 0.2**2 / 5e6
    assert crossover == approx(3.20715295e-24, rel=2e-9)
    full_shot = coefficients(TUNNEL, thermal=False)[0]
    thermal = coefficients(TUNNEL, shot=False)[0]
    assert thermal == coefficients(OHMIC)[0]
    assert max(thermal, full_shot) < coefficients(TUNNEL)[0] < 0.9 * (thermal + full_shot)


def test_the_sign_of_the_read_voltage_does_not_matter():
    for noise in (OHMIC, TUNNEL):
        flipped = noise_coefficients(-0.2, 100e-9, 300.0, noise, True, True, True, 1.0)
        assert flipped == noise_coefficients(0.2, 100e-9, 300.0, noise, True, True, True, 1.0)


def test_flicker_band():
    assert flicker_variance(1e-6, 1.0, 1e6) == approx(1.38155106e-5, rel=4e-9)
    assert sqrt(flicker_variance(1e-6, 1.0, 1e6)) == approx(0.00371692219, rel=2e-9)
    assert sqrt(flicker_variance(1e-6, 1e-9, 1e6)) == approx(0.00587697, rel=1e-6)
    assert flicker_variance(1e-6, 1e6, 1.0) == 0.0


def test_flicker_of_a_reading_reaches_up_to_the_noise_bandwidth():
    noise = NoiseLevels(flicker=1e-6)
    linear, square = coefficients(noise, flicker=True, integration=0.5e-6)
    assert square == approx(1.38155106e-5, rel=4e-9)
    assert linear == coefficients(noise, flicker=False, integration=0.5e-6)[0]
    # ten times the time takes ln 10 off, not a factor of ten
    assert square - coefficients(noise, flicker=True, integration=5e-6)[1] == approx(1e-6 * log(10))


def test_demo_cell_has_half_a_percent_of_flicker():
    noise = MODEL.sets["demo_oxide"]().noise
    assert sqrt(coefficients(noise, flicker=True)[1]) == approx(0.005)


def test_telegraph_statistics():
    assert telegraph_occupancy(TELEGRAPH) == approx(0.25)
    assert telegraph_variance(TELEGRAPH) * (100e-6) ** 2 == approx(7.5e-13)
    assert sqrt(telegraph_variance(TELEGRAPH)) * 100e-6 == approx(0.866025404e-6)
    # tau = 0.75 ms, corner frequency 212.206591 Hz
    tau = -1e-4 / log(telegraph_correlation(TELEGRAPH, 1e-4))
    assert tau == approx(0.75e-3)
    assert 1 / (2 * pi * tau) == approx(212.206591, rel=2e-9)


@pytest.mark.parametrize(
    ("reads", "spacing", "ratio"),
    [(8, 0.1e-3, 0.726628699), (8, 1e-3, 0.199298373), (100, 0.1e-3, 0.138988826), (1, 1e-3, 1.0)],
)
def test_averaging_reads_does_not_divide_telegraph_noise_by_their_number(reads, spacing, ratio):
    assert telegraph_averaging(TELEGRAPH, reads, spacing) == approx(ratio, rel=4e-9)


@pytest.mark.parametrize(("window", "ratio"), [(0.1e-3, 0.956998392), (1e-3, 0.671546780), (10e-3, 0.138750018)])
def test_many_reads_tend_to_the_average_over_the_window(window, ratio):
    # 2 (tau/T)^2 (T/tau - 1 + exp(-T/tau))
    assert telegraph_averaging(TELEGRAPH, 100_000, window / 100_000) == approx(ratio, rel=2e-8)


def test_averaging_of_reads_much_closer_than_the_dwell_times():
    direct = (1 + 2 * sum((1 - k / 8) * exp(-k * 1e-7 / 0.75e-3) for k in range(1, 8))) / 8
    assert telegraph_averaging(TELEGRAPH, 8, 1e-7) == approx(direct, rel=1e-9)
    assert telegraph_averaging(TELEGRAPH, 8, 1e-10) == approx(1 - 1e-10 / 0.75e-3 * 63 / 24, rel=1e-12)


def test_exact_propagator():
    # dt / tau = 0.1: correlation 0.904837418 (an Euler step would give 0.9)
    rho = telegraph_correlation(TELEGRAPH, 0.075e-3)
    assert rho == approx(0.904837418)
    for high in (True, False):
        chance = 0.25 + (high - 0.25) * rho
        assert telegraph_next(high, 0.25, rho, chance * (1 - 1e-12))
        assert not telegraph_next(high, 0.25, rho, chance * (1 + 1e-12))
        assert telegraph_next(high, 0.25, 0.0, 0.2499)
        assert not telegraph_next(high, 0.25, 0.0, 0.2501)


def test_simulated_telegraph_signal():
    bursts, reads, spacing = 30_000, 8, 0.1e-3
    rho = telegraph_correlation(TELEGRAPH, spacing)
    draws = np.random.default_rng(7).random((bursts, reads))
    mean = np.zeros(bursts)
    for burst in range(bursts):
        high = telegraph_next(False, 0.25, 0.0, draws[burst, 0])
        total = int(high)
        for read in range(1, reads):
            high = telegraph_next(high, 0.25, rho, draws[burst, read])
            total += high
        mean[burst] = total / reads
    assert abs(mean.mean() - 0.25) < 4 * mean.std() / sqrt(bursts)
    square = (mean - 0.25) ** 2
    assert abs(square.mean() - 0.726628699 * 0.1875) < 4 * square.std() / sqrt(bursts)


def test_converter_step_and_quantisation_noise():
    step = lsb(100e-6, 6)
    assert step == approx(1.5625e-6, rel=1e-12)
    values = (np.arange(64_000) + 0.5) / 64_000 * 100e-6
    errors = np.array([convert(value, step, 63) - value for value in values])
    assert np.sqrt(np.mean(errors**2)) == approx(0.451054898e-6, rel=1e-6)
    assert abs(errors.mean()) < 1e-6 * step
    assert np.abs(errors).max() <= 0.5 * step * (1 + 1e-9)


@pytest.mark.parametrize(
    ("bits", "simulated", "formula", "tolerance"),
    [(6, 37.6116, 37.8845121, 0.35), (8, 49.7870, 49.9257119, 0.15), (10, 61.8970, 61.9669117, 0.08)],
)
def test_signal_to_noise_of_a_full_scale_sine(bits, simulated, formula, tolerance):
    step = lsb(2.0, bits)
    signal = np.sin(2 * pi * 0.6180339887498949 * np.arange(40_000))
    errors = np.array([convert(value + 1.0, step, 2**bits - 1) - 1.0 - value for value in signal])
    ratio = 10 * np.log10(np.mean(signal**2) / np.mean(errors**2))
    assert abs(ratio - formula) < tolerance  # end effects: 0.27, 0.14, 0.07 dB
    assert abs(ratio - simulated) < 0.03


def test_converter_clips_at_both_ends():
    step = lsb(100e-6, 8)
    assert convert(-5e-6, step, 255) == approx(0.5 * step)
    assert convert(0.0, step, 255) == approx(0.5 * step)
    assert convert(100e-6, step, 255) == convert(1.0, step, 255) == approx(100e-6 - 0.5 * step)


@pytest.mark.parametrize(("levels", "rate"), [(2, 0.00620966533), (4, 0.00931449799), (16, 0.0116431225)])
def test_misclassification_of_levels(levels, rate):
    # levels d apart, noise sd s = d/5, a converter of one code per level: 2 (1 - 1/L) Q(d / 2s)
    assert rate == approx(2 * (1 - 1 / levels) * norm.sf(2.5), rel=2e-9)
    draws = np.random.default_rng(levels)
    samples = 100_000
    true = draws.integers(levels, size=samples) + 0.5
    read = true + 0.2 * draws.standard_normal(samples)
    wrong = np.mean([convert(value, 1.0, levels - 1) != level for value, level in zip(read, true, strict=True)])
    assert abs(wrong - rate) < 4 * sqrt(rate * (1 - rate) / samples)
