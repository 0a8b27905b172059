"""Jobs for tests: the demo cell and the saturating cell on small arrays, every setting open to change."""

from typing import Any

import numpy as np

from device_models.catalog import load_device
from device_models.contract import DeviceModel, NoiseLevels
from programming.bias import SCHEMES
from programming.catalog import load_strategy
from programming.job import Cell, Faults, Job, ParameterSpread, PulseTrain, Targets, Verify


def cell_of(model: DeviceModel, set_name: str | None = None, **changes: Any) -> Cell:
    """The cell of a parameter set, with changes of Cell fields; `overrides` changes single values."""
    chosen = model.sets[set_name or model.default_set]()
    overrides = changes.pop("overrides", {})
    settings: dict[str, Any] = {
        "model": model,
        "values": {name: sourced.value for name, sourced in chosen.values.items()} | overrides,
        "spreads": {name: ParameterSpread(s.law, s.relative) for name, s in chosen.spreads.items()},
        "truncation": chosen.truncation,
        "cycle": ParameterSpread(chosen.cycle.law, chosen.cycle.relative) if chosen.cycle else None,
        "initial_S": chosen.initial_S,
        "initial_spread": chosen.initial_spread,
        "noise": chosen.noise,
    }
    return Cell(**settings | changes)


def quiet_verify(**changes: Any) -> Verify:
    """A verify without any noise or converter."""
    return Verify(**{"thermal": False, "shot": False, "flicker": False, "telegraph": False} | changes)


def job(rows: int = 16, columns: int = 16, scheme: str = "V/2", strategy: Any = "amplitude_staircase", **changes: Any) -> Job:
    """A job on the demo cell; any Job field can be changed."""
    levels = np.linspace(15e-6, 95e-6, 16)
    settings: dict[str, Any] = {
        "seed": 7,
        "rows": rows,
        "columns": columns,
        "temperature_K": 300.0,
        "cell": cell_of(load_device("voltage_threshold"), "demo_oxide"),
        "faults": Faults(),
        "verify": Verify(0.2, 100e-9),
        "targets": Targets("levels", 15e-6, 95e-6, levels),
        "strategy": load_strategy(strategy) if isinstance(strategy, str) else strategy,
        "bias": SCHEMES[scheme],
        "order": "row_by_row",
        "set": PulseTrain(0.8, 0.02, 1.6, 100e-9),
        "reset": PulseTrain(0.8, 0.02, 1.6, 100e-9),
        "tolerance_S": 2e-6,
        "tolerance_fraction": 0.0,
        "max_pulses": 200,
        "passes": 1,
        "resolution": 5e-3,
        "stuck_false_alarm": 0.0,
    }
    return Job(**settings | changes)


NO_NOISE = NoiseLevels()
