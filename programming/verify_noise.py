"""The verify of a job as numbers for the compiled loop, and what a controller may expect of a reading."""

from __future__ import annotations

import math
from typing import Any

import numpy as np

from device_models.converter import lsb
from device_models.random_numbers import CONVERTER, normal_by_inverse
from device_models.read_noise import (
    noise_coefficients,
    telegraph_averaging,
    telegraph_correlation,
    telegraph_occupancy,
    telegraph_variance,
)
from programming.job import Job


def _converter(job: Job) -> dict[str, Any]:
    bits = job.verify.bits
    gains = np.full(job.columns, 1.0 + job.verify.gain_error)
    if job.verify.gain_spread > 0.0:
        gains += [
            job.verify.gain_spread * normal_by_inverse(np.uint64(job.seed), 0, column, CONVERTER, 0, 0)
            for column in range(job.columns)
        ]
    return {
        "converter_step": lsb(job.verify.range_S, bits) if bits else 0.0,
        "converter_top": float(2**bits - 1),
        "converter_gain": gains,
    }


def read_noise_of(job: Job) -> dict[str, float]:
    """The noise fields of a plan: coefficients of the variances of one read and of one verify, and the two-level signal."""
    verify, noise = job.verify, job.cell.noise

    def coefficients(integration: float) -> tuple[float, float]:
        return noise_coefficients(
            verify.voltage_V,
            integration,
            job.temperature_K,
            noise,
            verify.thermal,
            verify.shot,
            verify.flicker,
            verify.flicker_low_Hz,
        )

    square = coefficients(verify.integration_s * verify.reads)[1]
    telegraph = telegraph_variance(noise) * telegraph_averaging(noise, verify.reads, verify.integration_s)
    return {
        "noise_linear": coefficients(verify.integration_s)[0],
        "noise_square": square,
        "verify_square": square + (telegraph if verify.telegraph else 0.0),
        "telegraph": float(noise.telegraph) if verify.telegraph else 0.0,
        "telegraph_high": telegraph_occupancy(noise),
        "telegraph_correlation": telegraph_correlation(noise, verify.integration_s),
    }


def reading_deviation(job: Job, conductance_S: float) -> float:
    """Standard deviation of a verify of a cell at that conductance [S]: all noise, the converter, averaged reads."""
    noise = read_noise_of(job)
    step = _converter(job)["converter_step"]
    variance = conductance_S * (noise["noise_linear"] / job.verify.reads + noise["verify_square"] * conductance_S)
    return math.sqrt(variance + step * step / 12.0)


def verify_fields(job: Job) -> dict[str, Any]:
    """The fields of a plan that describe the verify."""
    return {
        "read_voltage": float(job.verify.voltage_V),
        "integration": float(job.verify.integration_s),
        "reads": int(job.verify.reads),
        "verifies": int(job.strategy.verifies),
        **read_noise_of(job),
        **_converter(job),
    }
