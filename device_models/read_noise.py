"""Noise of a read: thermal, shot, 1/f and two-level (telegraph) noise of the current through a cell at a read voltage.

All spectral densities are one-sided. A read that integrates for a time t passes the noise bandwidth 1/(2t).

Sources: Johnson, Phys. Rev. 32:97 (1928) and Nyquist, Phys. Rev. 32:110 (1928), thermal noise 4kTG; Schottky 1918, shot
noise 2qI; Machlup, J. Appl. Phys. 25:341 (1954), the two-level signal (all cited from memory). An ohmic, diffusive
filament has thermal noise only; a tunnel gap has 2qI coth(qV/2kT), which contains the thermal noise as its limit at
V = 0: the two are never added.
"""

from __future__ import annotations

from math import exp, expm1, log, tanh

from device_models.compiled import compiled
from device_models.constants import BOLTZMANN, ELEMENTARY_CHARGE
from device_models.contract import NoiseLevels


def noise_bandwidth(integration: float) -> float:
    """Noise bandwidth [Hz] of a boxcar average over `integration` [s]."""
    return 1.0 / (2.0 * integration)


def thermal_density(conductance: float, temperature: float) -> float:
    """Current noise 4kTG [A^2/Hz] of a conductance [S] at a temperature [K]."""
    return 4.0 * BOLTZMANN * temperature * conductance


def crossover_density(current: float, voltage: float, temperature: float) -> float:
    """Current noise 2qI coth(qV/2kT) [A^2/Hz] of a tunnel gap: shot noise at high, thermal noise at low voltage.

    current [A] and voltage [V] as magnitudes; at temperature 0 K this is 2qI.
    """
    if temperature == 0.0:
        return 2.0 * ELEMENTARY_CHARGE * current
    return 2.0 * ELEMENTARY_CHARGE * current / tanh(ELEMENTARY_CHARGE * voltage / (2.0 * BOLTZMANN * temperature))


def flicker_variance(level: float, low: float, high: float) -> float:
    """Variance of G over G squared of 1/f noise of that level K between two frequencies [Hz]: K ln(high / low).

    0.0 where the band is empty (high below low).
    """
    return level * log(high / low) if high > low else 0.0


def noise_coefficients(
    voltage: float,
    integration: float,
    temperature: float,
    noise: NoiseLevels,
    thermal: bool,
    shot: bool,
    flicker: bool,
    flicker_low_Hz: float,
) -> tuple[float, float]:
    """Coefficients (c1 [S], c2 [1]) of the variance c1 G + c2 G^2 [S^2] of one reading of a conductance G.

    voltage: read voltage [V], not 0; integration: time of one read [s]; temperature [K]. thermal, shot, flicker: what
    is switched on. Thermal noise of an ohmic cell is 4kTG; shot noise exists in a tunnel gap only, where the crossover
    law takes the place of the thermal noise (with thermal noise off: its limit at 0 K, 2qI). The upper corner of the
    1/f band is the noise bandwidth. Telegraph noise is no part of this.
    """
    read = abs(voltage)
    bandwidth = noise_bandwidth(integration)
    density_per_siemens = 0.0  # A^2/Hz for 1 S: both laws are proportional to the conductance
    if shot and noise.transport == "tunnel":
        density_per_siemens = crossover_density(read, read, temperature if thermal else 0.0)
    elif thermal:
        density_per_siemens = thermal_density(1.0, temperature)
    relative = flicker_variance(noise.flicker, flicker_low_Hz, bandwidth) if flicker else 0.0
    return density_per_siemens * bandwidth / (read * read), relative


def telegraph_occupancy(noise: NoiseLevels) -> float:
    """Fraction of time in the high level."""
    return noise.telegraph_high_dwell / (noise.telegraph_low_dwell + noise.telegraph_high_dwell)


def telegraph_correlation(noise: NoiseLevels, spacing: float) -> float:
    """Correlation of the two-level signal with itself after `spacing` [s]: exp(-spacing / tau)."""
    return exp(-spacing * (1.0 / noise.telegraph_low_dwell + 1.0 / noise.telegraph_high_dwell))


def telegraph_variance(noise: NoiseLevels) -> float:
    """Variance of G over G squared of a single read: step^2 p (1 - p)."""
    occupancy = telegraph_occupancy(noise)
    return noise.telegraph * noise.telegraph * occupancy * (1.0 - occupancy)


def telegraph_averaging(noise: NoiseLevels, reads: int, spacing: float) -> float:
    """Variance of the mean of `reads` reads `spacing` [s] apart, over that of one read.

    [1 + 2 sum (1 - k/n) rho^k] / n, summed in closed form: 1 for reads much closer than the dwell times, 1/n only for
    reads much further apart.
    """
    log_rho = -spacing * (1.0 / noise.telegraph_low_dwell + 1.0 / noise.telegraph_high_dwell)
    rho = exp(log_rho)
    if reads == 1 or -log_rho * reads < 1e-5:
        return 1.0 + log_rho * (reads * reads - 1.0) / (3.0 * reads)
    complement = -expm1(log_rho)
    return (1.0 + rho) / complement / reads + 2.0 * rho * expm1(reads * log_rho) / (complement * reads) ** 2


@compiled
def telegraph_next(high: bool, occupancy: float, correlation: float, draw: float) -> bool:
    """Level at the next read (True: high) from the level at the last one and a uniform draw, by the exact propagator.

    P(high | s) = p + (s - p) correlation. With correlation 0.0 the last level does not matter: a fresh start.
    """
    last = 1.0 if high else 0.0
    return draw < occupancy + (last - occupancy) * correlation
