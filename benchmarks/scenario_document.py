"""A scenario as plain data: every value resolved, units in the key names; and the digest that names an experiment.

Two scenario files that mean the same numbers give the same digest, however they are written; a changed target file or a
changed line in a user's own device does not.
"""

from __future__ import annotations

import hashlib
import json
from collections.abc import Mapping
from dataclasses import asdict
from typing import Any

from benchmarks.scenario_job import ResolvedScenario
from programming.job import Job, ParameterSpread, PulseTrain, Targets

Document = dict[str, Any]


def resolved_document(resolved: ResolvedScenario, dies: int) -> Document:
    """Everything the result depends on, as numbers in SI units, except the code and the numbers in files."""
    job = resolved.job
    return {
        "seed": job.seed,
        "dies": dies,
        "array": {
            "rows": job.rows,
            "columns": job.columns,
            "access": "none",
            "wires": "ideal",
            "temperature_K": job.temperature_K,
        },
        "device": _device(resolved),
        "targets": _targets(job.targets, resolved),
        "programming": _programming(job),
        "verify": asdict(job.verify),
    }


def scenario_digest(document: Document, resolved: ResolvedScenario) -> str:
    """sha256 over the document as canonical JSON, the bytes of the target file and the source of plug-in files."""
    plugins = (resolved.device.plugin, resolved.strategy_plugin)
    parts = [
        json.dumps(document, sort_keys=True, separators=(",", ":"), allow_nan=False).encode(),
        resolved.targets.content,
        *((plugin.source if plugin else "").encode() for plugin in plugins),
    ]
    digest = hashlib.sha256()
    for part in parts:  # lengths first, so that no two lists of parts read the same
        digest.update(len(part).to_bytes(8, "big"))
        digest.update(part)
    return digest.hexdigest()


def _device(resolved: ResolvedScenario) -> Document:
    device, cell = resolved.device, resolved.job.cell
    return {
        "model": cell.model.name,
        "parameters": device.parameter_set,
        "values": {name: _value(name, value, cell.model.quantities) for name, value in cell.values.items()},
        "range_S": list(device.range_S),
        "initial": {"conductance_S": cell.initial_S, "spread": cell.initial_spread},
        "variation": {
            "truncation": cell.truncation,
            "cycle": _spread(cell.cycle),
            "cells": {name: _spread(spread) for name, spread in cell.spreads.items()},
        },
        "noise": {
            "flicker": cell.noise.flicker,
            "telegraph": cell.noise.telegraph,
            "telegraph_low_dwell_s": cell.noise.telegraph_low_dwell,
            "telegraph_high_dwell_s": cell.noise.telegraph_high_dwell,
            "transport": cell.noise.transport,
        },
        "faults": asdict(device.faults),
    }


def _value(name: str, value: float, quantities: Mapping[str, Any]) -> Document:
    quantity = quantities[name]
    if quantity.choices:
        return {"value": quantity.choices[int(value)], "unit": ""}
    return {"value": value, "unit": quantity.unit}


def _spread(spread: ParameterSpread | None) -> Document | None:
    return None if spread is None else {"law": spread.law, "spread": spread.relative}


def _targets(targets: Targets, resolved: ResolvedScenario) -> Document:
    kind: str = targets.kind
    if kind == "matrix":
        kind = "file" if resolved.targets.classifier is None else "classifier"
    document: Document = {"kind": kind, "low_S": targets.low_S, "high_S": targets.high_S}
    if kind == "levels":
        document["levels_S"] = targets.levels_S.tolist()
    return document


def _programming(job: Job) -> Document:
    return {
        "strategy": job.strategy.name,
        "scheme": {
            "name": job.bias.name,
            "word": job.bias.word,
            "bit": job.bias.bit,
            "cells": {
                name: {"fraction": fraction, "count": job.bias.class_counts(job.rows, job.columns)[name]}
                for name, fraction in (
                    ("selected", 1.0),
                    ("same_row", job.bias.same_row),
                    ("same_column", job.bias.same_column),
                    ("rest", job.bias.rest),
                )
            },
        },
        "order": job.order,
        "tolerance_S": job.tolerance_S,
        "tolerance_fraction": job.tolerance_fraction,
        "max_pulses": job.max_pulses,
        "passes": job.passes,
        "resolution_V": job.resolution,
        "stuck_false_alarm": job.stuck_false_alarm,
        "set": _train(job.set),
        "reset": _train(job.reset),
    }


def _train(train: PulseTrain) -> Document:
    return {
        "start_V": train.start,
        "step_V": train.step,
        "stop_V": train.stop,
        "width_s": train.width,
        "width_step_s": train.width_step,
        "width_stop_s": train.width_stop,
        "rise_s": train.rise,
        "dead_time_s": train.dead_time,
    }
