"""Outcomes of dies that were never programmed: seeded, shaped like those of a real array, for tests of what comes
after.

64x64 cells, 16 levels from 15 to 95 uS, a band of 2 uS, some ten pulses per cell with a tail, 1.5 % stuck, disturbance
small and larger along some lines, dies that differ a little from each other.
"""

from __future__ import annotations

from dataclasses import dataclass, field, replace

import numpy as np

from device_models.contract import DeviceModel
from device_models.faults import HEALTHY, STUCK_HIGH, STUCK_LOW
from programming.bias import SCHEMES
from programming.job import (
    ACCEPTED,
    GAVE_UP,
    NOT_ADDRESSED,
    STUCK,
    Cell,
    DieOutcome,
    Faults,
    Job,
    PulseTrain,
    Targets,
    Verify,
)
from programming.strategy_contract import CellStrategy

LEVELS_S = np.linspace(15e-6, 95e-6, 16)


def _unused(*_arguments: object) -> float:
    raise AssertionError("no device runs in these tests")


_MODEL = DeviceModel(
    name="none", summary="", source="", range="", set_polarity=1, Parameters=tuple, quantities={}, rate=_unused,
    advance=_unused, conductance=_unused, state_of=_unused, bounds=_unused,
)  # fmt: skip


def fake_job(rows: int = 64, columns: int = 64, **changes: object) -> Job:
    """A job of rows x columns cells and 16 levels; any field can be changed."""
    train = PulseTrain(start=0.8, step=0.02, stop=1.6, width=100e-9)
    job = Job(
        seed=7,
        rows=rows,
        columns=columns,
        temperature_K=300.0,
        cell=Cell(_MODEL, {}),
        faults=Faults(0.01, 0.005),
        verify=Verify(),
        targets=Targets("levels", 15e-6, 95e-6, LEVELS_S),
        strategy=CellStrategy("none", "", "", "", _unused),
        bias=SCHEMES["V/2"],
        order="row_by_row",
        set=train,
        reset=train,
        tolerance_S=2e-6,
        tolerance_fraction=0.0,
        max_pulses=100,
        passes=1,
        resolution=5e-3,
        stuck_false_alarm=1e-3,
    )
    return replace(job, **changes)  # type: ignore[arg-type]


def _targets(job: Job, rng: np.random.Generator) -> np.ndarray:
    cells = job.rows * job.columns
    if job.targets.matrix_S is not None:
        return job.targets.matrix_S.ravel().copy()
    if job.targets.kind == "uniform":
        return rng.uniform(job.targets.low_S, job.targets.high_S, cells)
    return rng.choice(job.targets.levels_S, cells)


def _status(pulses: np.ndarray, fault: np.ndarray, target: np.ndarray, job: Job, rng: np.random.Generator) -> np.ndarray:
    status = np.full(fault.size, ACCEPTED, dtype=np.uint8)
    status[pulses >= job.max_pulses] = GAVE_UP
    status[(fault != HEALTHY) & (rng.random(fault.size) < 0.97)] = STUCK
    status[(fault == HEALTHY) & (rng.random(fault.size) < 5e-4)] = STUCK
    status[np.isnan(target)] = NOT_ADDRESSED
    return status


def fake_outcome(job: Job, die: int, disturbance: float = 0.2e-6) -> DieOutcome:
    """One die of the job; the same for the same seed and die."""
    rng = np.random.default_rng((job.seed, die))
    cells = job.rows * job.columns
    target = _targets(job, rng)
    fault = rng.choice(np.array([HEALTHY, STUCK_LOW, STUCK_HIGH], np.uint8), cells, p=(0.985, 0.01, 0.005))
    quality = 1.0 + 0.08 * rng.standard_normal()  # dies differ
    pulses = np.minimum(6 + rng.gamma(1.6, 3.6 * quality, cells), job.max_pulses).astype(np.uint32)
    pulses[rng.random(cells) < 2e-4] = job.max_pulses
    row, column = np.divmod(np.arange(cells), job.columns)
    weak = rng.random(cells) < 0.06
    size = disturbance * rng.exponential(1.0, cells) * np.where(weak, 4.0, 0.35) * (1.3 - row / job.rows)
    share = rng.dirichlet((2.0, 2.0, 0.4), cells)
    share[size == 0.0] = 0.0
    signed = np.where(fault == HEALTHY, size * np.where(column % 2, 1.0, -0.4), 0.0)
    final = target + rng.uniform(-1.9e-6, 1.9e-6, cells) + 0.25e-6 * rng.standard_normal(cells) + signed
    final[fault == STUCK_LOW] = 10e-6
    final[fault == STUCK_HIGH] = 100e-6
    status = _status(pulses, fault, target, job, rng)
    final[status == GAVE_UP] -= 6e-6
    unaddressed = np.isnan(target)
    final[unaddressed] = 10e-6
    pulses[unaddressed] = 0
    addressed = int((~unaddressed).sum())
    per_cell = np.array([11.4, 7.9, 0.0, 0.6, 1.3, 31.0]) * 1e-12 * quality
    band = np.maximum(job.tolerance_S, job.tolerance_fraction * target)
    return DieOutcome(
        die=die,
        target_S=target,
        final_S=final,
        disturbance_S=signed,
        pulses=pulses,
        verifies=np.where(unaddressed, 0, pulses + 1).astype(np.uint32),
        status=status,
        fault=fault,
        in_band=np.abs(final - target) <= band,
        dose_share=share,
        energy_J=per_cell * addressed,
        half_select_error=3e-4,
        time_s=2.4e-6 * quality * addressed,
        stress_dominates=False,
    )


@dataclass(frozen=True)
class FakeScore:
    """A made-up score: the fraction of cells above 50 uS, in steps of 1 / samples."""

    samples: int = 797
    reference: float | None = 0.9

    def __call__(self, conductance_S: np.ndarray) -> float:
        return round(float((conductance_S > 50e-6).mean()) * self.samples) / self.samples


@dataclass(frozen=True)
class FakeScenario:
    """What the result needs to know of a scenario."""

    title: str = "Made-up oxide cells, 64x64, 16 levels, V/2"
    digest: str = "5f3a" * 16
    dies: int = 8
    sources: dict[str, str] = field(default_factory=lambda: {"v_set": "of our own invention"})
    warnings: list[str] = field(default_factory=list)
    score: FakeScore | None = None
