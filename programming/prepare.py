"""From a job to what the compiled loop reads: the plan, and the rules for the controller."""

from __future__ import annotations

from typing import Any

import numpy as np
import numpy.typing as npt

from programming.cell_sample import device_fields, nominal_cell, sampled_cells
from programming.job import Job
from programming.plan import Plan
from programming.pulse_grid import pulse_fields
from programming.strategy_contract import Rules
from programming.stuck_limits import stuck_test_fields
from programming.verify_noise import reading_deviation, verify_fields

Floats = npt.NDArray[np.float64]
_TARGET_KINDS = {"levels": 0, "uniform": 1, "matrix": 2}
_ENERGY_NODES = 33
_WEAK_CELL = 0.995  # quantile of the cells' stress doses that sets the scale of the record of mixed stress
_RECORD_STEP = 0.08  # unit doses of such a cell in one record
_SAMPLE = 1024


def _reference_doses(job: Job, pulses: dict[str, Any]) -> tuple[Floats, bool]:
    """(3, bins) size of a weak cell's dose per pulse by class, and whether stress of both signs occurs."""
    fractions = (job.bias.same_row, job.bias.same_column, job.bias.rest)
    drawn = np.array([sampled_cells(job, f * pulses["bin_voltage"], pulses["bin_width"], _SAMPLE)[0] for f in fractions])
    both = bool((drawn > 0.0).any() and (drawn < 0.0).any())
    return np.quantile(np.abs(drawn), _WEAK_CELL, axis=1), both


def _node_voltages(job: Job, pulses: dict[str, Any]) -> Floats:
    """The verify voltage; for cells that are not ohmic also an even grid over what unselected cells can see."""
    if job.cell.model.ohmic:
        return np.array([job.verify.voltage_V])
    largest = float(np.abs(pulses["bin_voltage"]).max()) * max(job.bias.same_row, job.bias.same_column, abs(job.bias.rest))
    return np.concatenate([[job.verify.voltage_V], np.linspace(-largest, largest, _ENERGY_NODES)])


def _stress_fields(job: Job, pulses: dict[str, Any]) -> dict[str, Any]:
    reference, both_signs = _reference_doses(job, pulses)
    unit = nominal_cell(job)[2]
    return {
        "unit_dose": unit,
        "node_voltages": _node_voltages(job, pulses),
        "history": int(both_signs),
        "reference_dose": reference,
        "history_step": _RECORD_STEP * unit,
    }


def _controller_fields(job: Job) -> dict[str, Any]:
    targets = job.targets
    matrix = np.empty(0) if targets.matrix_S is None else targets.matrix_S
    return {
        "target_kind": _TARGET_KINDS[targets.kind],
        "levels": np.ascontiguousarray(targets.levels_S, dtype=np.float64),
        "low": float(targets.low_S),
        "high": float(targets.high_S),
        "matrix": np.ascontiguousarray(matrix, dtype=np.float64).ravel(),
        "tolerance_S": float(job.tolerance_S),
        "tolerance_fraction": float(job.tolerance_fraction),
        "max_pulses": int(job.max_pulses),
        "passes": int(job.passes),
    }


def make_plan(job: Job) -> Plan:
    """The plan of a job. Costs a few thousand evaluations of the model, for the stuck test and the stress record."""
    pulses = pulse_fields(job)
    fields = {
        "seed": np.uint64(job.seed),
        "rows": job.rows,
        "columns": job.columns,
        **pulses,
        **device_fields(job),
        **verify_fields(job),
        **_stress_fields(job, pulses),
        **_controller_fields(job),
        **stuck_test_fields(job, pulses),
    }
    return Plan(**{name: fields[name] for name in Plan._fields})


def make_rules(job: Job) -> Rules:
    """What the controller is told."""
    return Rules(
        float(job.set.start),
        float(job.set.step),
        float(job.set.stop),
        float(job.set.width),
        float(job.set.width_step),
        float(job.set.width_stop or job.set.width),
        float(job.reset.start),
        float(job.reset.step),
        float(job.reset.stop),
        float(job.reset.width),
        float(job.reset.width_step),
        float(job.reset.width_stop or job.reset.width),
        float(job.targets.low_S),
        float(job.targets.high_S),
        float(job.max_pulses),
        reading_deviation(job, 0.5 * (job.targets.low_S + job.targets.high_S)),
    )
