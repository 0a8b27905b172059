"""The cell of a job as arrays for the compiled loop, its nominal numbers, and samples of cells like it."""

from __future__ import annotations

import math
from typing import Any

import numpy as np
import numpy.typing as npt

from programming.fuse import fuse
from programming.job import Job, ParameterSpread

Floats = npt.NDArray[np.float64]
_LAWS = {"normal": 0, "lognormal": 1}


def log_sigma(relative: float) -> float:
    """Sigma of the logarithm of a lognormal with that relative standard deviation."""
    return math.sqrt(math.log1p(relative * relative))


def spread_size(spread: ParameterSpread) -> float:
    """What the compiled loop multiplies a standard normal with: relative, or sigma of the logarithm."""
    return spread.relative if spread.law == "normal" else log_sigma(spread.relative)


def base_values(job: Job) -> Floats:
    """Nominal parameters in the order of the model's record."""
    return np.array([float(job.cell.values[name]) for name in job.cell.model.Parameters._fields])


def spread_arrays(job: Job) -> tuple[npt.NDArray[np.int64], npt.NDArray[np.int64], Floats]:
    """Which parameters vary (their place in the record), by which law (0 normal, 1 lognormal), and by how much."""
    fields = job.cell.model.Parameters._fields
    return (
        np.array([fields.index(name) for name in job.cell.spreads], dtype=np.int64),
        np.array([_LAWS[spread.law] for spread in job.cell.spreads.values()], dtype=np.int64),
        np.array([spread_size(spread) for spread in job.cell.spreads.values()], dtype=np.float64),
    )


def sampled_cells(job: Job, voltages: Floats, widths: Floats, count: int, ranges: bool = False) -> tuple[Floats, Floats]:
    """What `count` healthy cells drawn from the job's spreads are like: (count, pulses) signed doses, and their ranges.

    voltages: signed, across the cell [V]; widths [s]. The ranges are (count, 3): lowest and highest conductance [S] and unit
    dose (see nominal_cell), or empty if not asked for. The sample belongs to no die.
    """
    return _sample(job, spread_arrays(job), voltages, widths, count, count if ranges else 0)


def nominal_cell(job: Job) -> tuple[float, float, float]:
    """(lowest conductance [S], highest [S], unit dose) of the nominal cell.

    The unit dose moves it from mid-range by 1 - 1/e of the way to an end, the smaller of both directions.
    """
    none = np.empty(0)
    lowest, highest, unit = _sample(job, (none.astype(np.int64), none.astype(np.int64), none), none, none, 1, 1)[1][0]
    return float(lowest), float(highest), float(unit)


def _sample(job: Job, spreads: Any, voltages: Floats, widths: Floats, count: int, ranges: int) -> tuple[Floats, Floats]:
    out = np.empty((count, len(voltages))), np.empty((ranges, 3))
    fuse(job.cell.model, job.strategy).sample_cells(
        base_values(job),
        *spreads,
        float(job.cell.truncation),
        np.ascontiguousarray(voltages, dtype=np.float64),
        np.ascontiguousarray(widths, dtype=np.float64),
        out[0],
        float(job.verify.voltage_V),
        out[1],
    )
    return out


def device_fields(job: Job) -> dict[str, Any]:
    """The fields of a plan that describe the cell: values, spreads, cycle noise, start, faults."""
    varied, law, size = spread_arrays(job)
    cycle = job.cell.cycle
    return {
        "base_values": base_values(job),
        "varied": varied,
        "spread_law": law,
        "spread_size": size,
        "truncation": float(job.cell.truncation),
        "cycle_law": 0 if cycle is None or cycle.relative == 0.0 else 1 + _LAWS[cycle.law],
        "cycle_spread": float(cycle.relative) if cycle else 0.0,
        "cycle_sigma": log_sigma(cycle.relative) if cycle else 0.0,
        "stress_noise": int(job.stress_noise),
        "initial_S": float(job.cell.initial_S),
        "initial_spread": float(job.cell.initial_spread),
        "stuck_low": float(job.faults.stuck_low),
        "stuck_high": float(job.faults.stuck_high),
        "clustered": int(job.faults.placement == "clustered"),
        "cluster_size": float(job.faults.cluster_size),
    }
