"""The result of a run as one JSON object, schema "pulsewright.result/1".

Keys come in this order. Units are in the key names; counts are over all dies; every `ci95` is [low, high] with the die
as unit, null with a single die; a value without any cell behind it is null. Nothing depends on the time of day, the
machine's speed or the number of workers.

    schema, title, scenario_digest, seed, dies
    cells              addressed, accepted (the controller believes it), in_band (the truth), gave_up, stuck (called
                       so), stuck_missed (truly stuck, not called so), stuck_false (healthy, called stuck)
    pulses_per_cell    mean, ci95, p50, p99, p999, max (smallest count that suffices for this part of all cells)
    verifies_per_cell  mean, ci95
    final_error_S      rms, ci95, mean, max (largest size) of final less target, over all addressed cells
    in_band            fraction, ci95
    responding         final_error_S and in_band again, without the truly stuck cells
    levels             a list, one per level: target_S, cells, error {rms_S, ci95, mean_S}, in_band {fraction, ci95};
                       for continuous targets 16 equal ranges, target_S being the centre of each
    disturbance_S      rms, ci95, max (largest size), then the rms of its shares by class same_row, same_column, rest;
                       over all cells of the array
    energy_J           per addressed cell: per_cell, ci95, and its parts selected, half_selected, rest, verify, lines,
                       which sum to it; apart: supply, and half_select_error, the bound on the relative error of
                       half_selected and rest
    time_s             per_cell, ci95 (one cell after another), array (per die)
    accuracy           only with a classifier: mean, ci95, reference (in software)
    warnings           a list of text
    provenance         version, sources (of each device value)
"""

from __future__ import annotations

import json
import math
from collections.abc import Mapping, Sequence
from typing import Any, Protocol

import numpy as np
import numpy.typing as npt

from benchmarks.statistics import (
    DieMoments,
    Interval,
    RatioEstimate,
    count_quantile,
    fraction_interval,
    mean_interval,
    rms_interval,
    score_interval,
)
from benchmarks.tally import ErrorTally, Tally
from benchmarks.version import version
from programming.job import ACCEPTED, ENERGY_PARTS, GAVE_UP, STUCK

SCHEMA = "pulsewright.result/1"
STALE_LIMIT = 0.01  # above this bound on the half-select energies' error the result carries a warning


class ArrayScore(Protocol):
    """A score of the programmed array between 0 and 1, such as the accuracy of a classifier.

    samples: how many samples a score averages over. reference: what the same gives in software, None if not known.
    """

    @property
    def samples(self) -> int:
        """Number of samples behind each score."""

    @property
    def reference(self) -> float | None:
        """The score in software."""

    def __call__(self, conductance_S: npt.NDArray[np.float64]) -> float:
        """Score of the final conductances (rows, columns) [S]."""


class ScenarioLike(Protocol):
    """What a result tells of its scenario. sources: where each device value comes from."""

    @property
    def title(self) -> str:
        """One line for a person."""

    @property
    def digest(self) -> str:
        """Over resolved values, target files and plug-in code."""

    @property
    def dies(self) -> int:
        """Number of dies asked for."""

    @property
    def sources(self) -> Mapping[str, str]:
        """Parameter -> where its value comes from."""

    @property
    def warnings(self) -> Sequence[str]:
        """What a designer would want to know of the scenario itself."""

    @property
    def score(self) -> ArrayScore | None:
        """How the programmed array is scored, None for most."""


def result_object(tally: Tally, scenario: ScenarioLike) -> dict[str, Any]:
    """The result of all dies in the tally. Raises ValueError if there is none."""
    if tally.dies == 0:
        raise ValueError("no die was programmed")
    result: dict[str, Any] = {
        "schema": SCHEMA,
        "title": scenario.title,
        "scenario_digest": scenario.digest,
        "seed": tally.job.seed,
        "dies": tally.dies,
        "cells": _cells(tally),
        "pulses_per_cell": _pulses(tally),
        "verifies_per_cell": _mean(tally.verify_moments),
        "final_error_S": _error(tally.all),
        "in_band": _fraction(tally.all.in_band.estimate()),
        "responding": {
            "final_error_S": _error(tally.responding),
            "in_band": _fraction(tally.responding.in_band.estimate()),
        },
        "levels": [_level(tally, index) for index in range(tally.scale.levels_S.size)],
        "disturbance_S": _disturbance(tally),
        "energy_J": _energy(tally),
        "time_s": {
            "per_cell": tally.time.estimate().value,
            "ci95": _listed(mean_interval(tally.time.estimate())),
            "array": float(tally.time.total),
        },
    }
    if scenario.score is not None:
        estimate = tally.score.estimate()
        result["accuracy"] = {
            "mean": estimate.value,
            "ci95": _listed(score_interval(estimate, scenario.score.samples)),
            "reference": scenario.score.reference,
        }
    result["warnings"] = [*scenario.warnings, *_warnings(tally)]
    result["provenance"] = {"version": version(), "sources": dict(scenario.sources)}
    return result


def json_text(result: Mapping[str, Any]) -> str:
    """The result as JSON text, one key per line. Raises ValueError if a number in it is not finite."""
    return json.dumps(result, indent=2, allow_nan=False, ensure_ascii=False) + "\n"


def _cells(tally: Tally) -> dict[str, int]:
    return {
        "addressed": tally.addressed,
        "accepted": int(tally.status[ACCEPTED]),
        "in_band": tally.all.cells_in_band,
        "gave_up": int(tally.status[GAVE_UP]),
        "stuck": int(tally.status[STUCK]),
        "stuck_missed": tally.stuck_missed,
        "stuck_false": tally.stuck_false,
    }


def _pulses(tally: Tally) -> dict[str, Any]:
    return {
        **_mean(tally.pulse_moments),
        "p50": count_quantile(tally.pulses, 1, 2),
        "p99": count_quantile(tally.pulses, 99, 100),
        "p999": count_quantile(tally.pulses, 999, 1000),
        "max": count_quantile(tally.pulses, 1, 1),
    }


def _mean(moments: DieMoments) -> dict[str, Any]:
    estimate = moments.estimate()
    return {"mean": estimate.value, "ci95": _listed(mean_interval(estimate))}


def _fraction(estimate: RatioEstimate) -> dict[str, Any]:
    return {"fraction": estimate.value, "ci95": _listed(fraction_interval(estimate))}


def _error(error: ErrorTally) -> dict[str, Any]:
    square, mean = error.square.estimate(), error.mean.estimate()
    return {
        "rms": _root(square.value),
        "ci95": _listed(rms_interval(square)),
        "mean": mean.value,
        "max": error.largest if mean.value is not None else None,
    }


def _level(tally: Tally, index: int) -> dict[str, Any]:
    square = tally.levels.square.estimate(index)
    return {
        "target_S": float(tally.scale.levels_S[index]),
        "cells": int(tally.levels.cells[index]),
        "error": {
            "rms_S": _root(square.value),
            "ci95": _listed(rms_interval(square)),
            "mean_S": tally.levels.mean.estimate(index).value,
        },
        "in_band": _fraction(tally.levels.in_band.estimate(index)),
    }


def _disturbance(tally: Tally) -> dict[str, Any]:
    disturbance = tally.disturbance
    square = disturbance.square.estimate()
    classes = [_root(disturbance.class_square.estimate(index).value) for index in range(3)]
    return {
        "rms": _root(square.value),
        "ci95": _listed(rms_interval(square)),
        "max": disturbance.largest,
        "same_row": classes[0],
        "same_column": classes[1],
        "rest": classes[2],
    }


def _energy(tally: Tally) -> dict[str, Any]:
    parts = {name: tally.energy.estimate(index).value for index, name in enumerate(ENERGY_PARTS)}
    supply = parts.pop("supply")
    return {
        "per_cell": math.fsum(value for value in parts.values() if value is not None),
        "ci95": _listed(mean_interval(tally.dissipated.estimate())),
        **parts,
        "supply": supply,
        "half_select_error": tally.half_select_error,
    }


def _warnings(tally: Tally) -> list[str]:
    warnings = []
    if tally.stress_dominates:
        dies = "on every die" if tally.stress_dominates == tally.dies else f"on {tally.stress_dominates} of {tally.dies} dies"
        warnings.append(
            f"disturbance dominates {dies}: pulses meant for other cells pushed more than a tenth of the cells out of "
            "their band; where stress of both polarities mixes, the numbers are then good to a few per cent only"
        )
    if tally.half_select_error > STALE_LIMIT:
        warnings.append(
            "the energies of half-selected and resting cells may be off by up to "
            f"{100 * tally.half_select_error:.2g} %, since the stress on those cells is settled late"
        )
    return warnings


def _root(square: float | None) -> float | None:
    return None if square is None else math.sqrt(square)


def _listed(interval: Interval | None) -> list[float] | None:
    return None if interval is None else list(interval)
