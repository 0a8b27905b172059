"""Jobs on the cells of plugin_cells.py, which is loaded the way a user's own file is, and what comes of them."""

from dataclasses import dataclass
from math import log
from pathlib import Path

import numpy as np

from benchmarks.plugin_file import load_plugin
from device_models.contract import DeviceModel, NoiseLevels
from programming.job import Job, ParameterSpread, PulseTrain, Targets, Verify
from programming.run import program_dies
from programming.strategy_contract import CellStrategy
from tests.jobs import cell_of, job, quiet_verify

FOLDER = Path(__file__).parent
CELL = load_plugin("plugin_cells.py:CELL", FOLDER, DeviceModel, allow_code=True).object
ONE_SIDED = load_plugin("plugin_cells.py:ONE_SIDED", FOLDER, CellStrategy, allow_code=True).object
UNIT_PULSE = PulseTrain(1.0, 0.0, 1.0, 100e-9)
FLICKER_BAND = log(5e6)  # from 1 Hz to 1 / (2 * 100 ns)


@dataclass(frozen=True)
class Sample:
    """All cells of all dies, in units of the state x. overshoot: x less the target; verifies and pulses: counts."""

    overshoot: np.ndarray
    pulses: np.ndarray
    verifies: np.ndarray
    in_band: np.ndarray


def plugin_job(set_name: str = "steps", **changes) -> Job:
    """A quiet job on 64 x 64 cells under V/2, one-sided; `cell`: changes of the cell; anything else: of the job."""
    settings = {
        "rows": 64,
        "columns": 64,
        "cell": cell_of(CELL, set_name, **changes.pop("cell", {})),
        "verify": quiet_verify(),
        "strategy": ONE_SIDED,
        "set": UNIT_PULSE,
        "reset": UNIT_PULSE,
        "tolerance_S": 0.0,
        "max_pulses": 100_000,
        "resolution": 0.0,
    }
    return job(**settings | changes)


def starting_at(state: float, **changes) -> dict:
    """The `steps` cell with that x before programming."""
    values = CELL.sets["steps"]().values
    return {"initial_S": values["offset"].value + values["scale"].value * state, "initial_spread": 0.0} | changes


def step_targets(low: float, high: float) -> Targets:
    """Uniform targets between two x of the `steps` and `redraw` cells (equal ones: a single target)."""
    values = CELL.sets["steps"]().values
    ends = [values["offset"].value + values["scale"].value * x for x in (low, high)]
    return Targets("levels", ends[0], ends[1], np.array(ends[:1])) if low == high else Targets("uniform", *ends)


def read_noise(deviation: float) -> tuple[NoiseLevels, Verify]:
    """Fresh normal noise of that standard deviation (in x) for each verify, as 1/f noise of the offset conductance."""
    values = CELL.sets["steps"]().values
    relative = deviation * values["scale"].value / values["offset"].value
    return NoiseLevels(flicker=relative * relative / FLICKER_BAND), quiet_verify(flicker=True)


def relative_cycle(law: str, relative: float) -> ParameterSpread:
    """Spread of the steps over their mean."""
    return ParameterSpread(law, relative)


def sample(a_job: Job, dies: int) -> Sample:
    """Run a job and pool its cells."""
    scale = a_job.cell.values["scale"]

    def keep(outcome):
        overshoot = (outcome.final_S - outcome.target_S) / scale
        return overshoot, outcome.pulses.astype(float), outcome.verifies.copy(), outcome.in_band.copy()

    parts = list(program_dies(a_job, dies, 2, keep))
    return Sample(*(np.concatenate(part) for part in zip(*parts, strict=True)))


def final_state(a_job: Job) -> np.ndarray:
    """x of every cell of die 0 after programming."""
    values = a_job.cell.values
    return next(program_dies(a_job, 1, 1, lambda o: (o.final_S - values["offset"]) / values["scale"]))
