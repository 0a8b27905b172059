"""How slow a healthy cell may be: what the stuck test holds a cell against, from a sample of cells of the job."""

from __future__ import annotations

import math
from typing import Any

import numpy as np
import numpy.typing as npt
from scipy.special import ndtri

from programming.cell_sample import log_sigma, nominal_cell, sampled_cells
from programming.job import Job
from programming.verify_noise import verify_fields

_FEWEST, _MOST = 256, 16384  # cells sampled


def stuck_test_fields(job: Job, pulses: dict[str, Any]) -> dict[str, Any]:
    """The fields of a plan for the stuck test.

    Half the allowed false-alarm share goes to what readings hide, half to cells that are slower, or have less room, than
    assumed here. A slow cell's doses are told in those of the nominal cell that move it as far, each in its own range.
    """
    lowest, highest, unit = nominal_cell(job)
    fields = {"stuck_limit": 0.0, "slow_dose": np.zeros(pulses["bin_voltage"].size), "slow_low": lowest, "slow_high": highest}
    fields |= {"nominal_low": lowest, "nominal_high": highest, "unseen_high": highest}
    share = 0.5 * job.stuck_false_alarm
    if share <= 0.0:
        return fields
    count = int(min(max(8.0 / share, _FEWEST), _MOST))
    doses, ranges = sampled_cells(job, pulses["bin_voltage"], pulses["bin_width"], count, ranges=True)
    doses *= (unit / ranges[:, 2])[:, np.newaxis]
    slow = np.sign(doses.sum(axis=0)) * np.quantile(np.abs(doses), share, axis=0, method="lower")
    gains = verify_fields(job)["converter_gain"]
    return fields | {
        "stuck_limit": float(-ndtri(share)),
        "slow_dose": slow * _weak_pulse(job, share),
        "slow_low": float(np.quantile(ranges[:, 0], 1.0 - share, method="higher") * gains.max()),
        "slow_high": float(np.quantile(ranges[:, 1], share, method="lower") * gains.min()),
        # a cell both slow and of high range is rarer than the allowed share: here the middle of the range will do
        "unseen_high": float(np.median(ranges[:, 1]) * gains.max()),
    }


def _weak_pulse(job: Job, share: float) -> npt.NDArray[np.float64] | float:
    """Factor on a dose that all but `share` of the pulses exceed, by their cycle-to-cycle noise."""
    cycle = job.cell.cycle
    if cycle is None:
        return 1.0
    if cycle.law == "normal":
        return max(0.0, 1.0 + cycle.relative * float(ndtri(share)))
    sigma = log_sigma(cycle.relative)
    return math.exp(sigma * float(ndtri(share)) - 0.5 * sigma * sigma)
