"""Jobs whose speed is measured: cells without stress, with a little, with both polarities, and with exponential kinetics."""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from benchmarks.scenario import load_scenario
from device_models.catalog import load_device
from programming.bias import SCHEMES
from programming.job import Job, ParameterSpread, PulseTrain, Targets

CELLS = ("no stress", "mild stress", "both polarities", "exponential")


def speed_job(cell: str, size: int, scheme: str) -> Job:
    """The demo scenario on a size x size array under a scheme, with one of CELLS."""
    demo = load_scenario("demo", seed=1).job
    job = replace(demo, rows=size, columns=size, bias=SCHEMES[scheme])
    if cell == "exponential":
        return replace(job, cell=_exponential(job), targets=Targets("levels", 15e-6, 65e-6, np.linspace(15e-6, 65e-6, 11)))
    if cell == "mild stress":
        return job
    # thresholds all alike: no cell is reached by 0.8 V; or so spread and so hard driven that both V/2 and V/3 reach many
    spread = ParameterSpread("normal", 0.0 if cell == "no stress" else 0.15)
    widened = replace(job.cell, spreads={**job.cell.spreads, "v_on": spread, "v_off": spread})
    if cell == "no stress":
        return replace(job, cell=widened)
    train = PulseTrain(0.8, 0.025, 1.8, 100e-9, rise=job.set.rise, dead_time=job.set.dead_time)
    return replace(job, cell=widened, set=train, reset=train)


def _exponential(job: Job):  # type: ignore[no-untyped-def]
    model = load_device("saturating_update")
    chosen = model.sets["demo_analogue"]()
    return replace(
        job.cell,
        model=model,
        values={name: sourced.value for name, sourced in chosen.values.items()},
        spreads={name: ParameterSpread(s.law, s.relative) for name, s in chosen.spreads.items()},
        initial_S=chosen.initial_S,
        initial_spread=chosen.initial_spread,
        noise=chosen.noise,
    )
