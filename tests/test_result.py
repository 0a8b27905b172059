"""The result object: keys and their order, sums, JSON, warnings."""

import json
import math
from dataclasses import replace

import pytest

from benchmarks.die_summary import DieSummariser
from benchmarks.result import json_text, result_object
from benchmarks.tally import Tally
from tests.fake_outcomes import FakeScenario, FakeScore, fake_job, fake_outcome

JOB = fake_job(16, 12)

KEYS = {
    "schema": None,
    "title": None,
    "scenario_digest": None,
    "seed": None,
    "dies": None,
    "cells": ["addressed", "accepted", "in_band", "gave_up", "stuck", "stuck_missed", "stuck_false"],
    "pulses_per_cell": ["mean", "ci95", "p50", "p99", "p999", "max"],
    "verifies_per_cell": ["mean", "ci95"],
    "final_error_S": ["rms", "ci95", "mean", "max"],
    "in_band": ["fraction", "ci95"],
    "responding": ["final_error_S", "in_band"],
    "levels": None,
    "disturbance_S": ["rms", "ci95", "max", "same_row", "same_column", "rest"],
    "energy_J": ["per_cell", "ci95", "selected", "half_selected", "rest", "verify", "lines", "supply",
                 "half_select_error"],
    "time_s": ["per_cell", "ci95", "array"],
    "accuracy": ["mean", "ci95", "reference"],
    "warnings": None,
    "provenance": ["version", "sources"],
}  # fmt: skip


def tally_of(dies=3, score=None, **changes):
    tally, summarise = Tally(JOB), DieSummariser(JOB, score)
    for die in range(dies):
        tally.add(summarise(replace(fake_outcome(JOB, die), **changes)))
    return tally


def test_keys_and_their_order():
    result = result_object(tally_of(score=FakeScore()), FakeScenario(score=FakeScore()))
    assert list(result) == list(KEYS)
    for key, inner in KEYS.items():
        if inner is not None:
            assert list(result[key]) == inner, key
    assert list(result["responding"]["final_error_S"]) == KEYS["final_error_S"]
    assert list(result["responding"]["in_band"]) == KEYS["in_band"]
    assert len(result["levels"]) == 16
    for level in result["levels"]:
        assert list(level) == ["target_S", "cells", "error", "in_band"]
        assert list(level["error"]) == ["rms_S", "ci95", "mean_S"]


def test_accuracy_only_with_a_score():
    assert "accuracy" not in result_object(tally_of(), FakeScenario())


def test_what_comes_from_the_scenario():
    scenario = FakeScenario(warnings=["half-select above threshold"])
    result = result_object(tally_of(), scenario)
    assert result["schema"] == "pulsewright.result/1"
    assert (result["title"], result["scenario_digest"]) == (scenario.title, scenario.digest)
    assert (result["seed"], result["dies"]) == (JOB.seed, 3)
    assert result["warnings"] == ["half-select above threshold"]
    assert result["provenance"]["sources"] == scenario.sources


def test_counts_are_over_all_dies_and_add_up():
    cells = result_object(tally_of(dies=5), FakeScenario())["cells"]
    assert cells["addressed"] == 5 * 16 * 12
    assert cells["accepted"] + cells["gave_up"] + cells["stuck"] == cells["addressed"]


def test_energy_parts_sum_to_the_total():
    energy = result_object(tally_of(dies=5), FakeScenario())["energy_J"]
    parts = [energy[name] for name in ("selected", "half_selected", "rest", "verify", "lines")]
    assert min(parts[0], parts[1], parts[3], parts[4], energy["supply"]) > 0.0
    assert energy["per_cell"] == math.fsum(parts)
    low, high = energy["ci95"]
    assert low < energy["per_cell"] < high


def test_time_of_the_array_is_that_of_its_cells():
    time = result_object(tally_of(dies=5), FakeScenario())["time_s"]
    assert time["array"] == pytest.approx(time["per_cell"] * 16 * 12, rel=1e-12, abs=0)


def test_json_reads_back_as_the_same_object():
    result = result_object(tally_of(score=FakeScore()), FakeScenario(score=FakeScore()))
    text = json_text(result)
    assert json.loads(text, parse_constant=lambda name: pytest.fail(f"{name} in JSON")) == result
    assert text.endswith("}\n")


def test_numbers_that_are_not_finite_never_reach_json():
    result = result_object(tally_of(), FakeScenario())
    result["energy_J"]["rest"] = math.inf
    with pytest.raises(ValueError, match="not JSON compliant"):
        json_text(result)


def test_a_single_die_has_null_intervals():
    result = result_object(tally_of(dies=1, score=FakeScore()), FakeScenario(score=FakeScore()))

    def intervals(thing):
        own = [thing["ci95"]] if isinstance(thing, dict) and "ci95" in thing else []
        inner = thing.values() if isinstance(thing, dict) else thing if isinstance(thing, list) else ()
        return own + [interval for part in inner for interval in intervals(part)]

    found = intervals(result)
    assert len(found) == 10 + 2 * 16
    assert set(found) == {None}


def test_levels_without_a_cell_are_null():
    job = fake_job(2, 2)
    tally = Tally(job)
    for die in range(2):
        tally.add(DieSummariser(job)(fake_outcome(job, die)))
    levels = result_object(tally, FakeScenario())["levels"]
    empty = [level for level in levels if level["cells"] == 0]
    assert len(empty) >= 16 - 8
    for level in empty:
        assert level["error"] == {"rms_S": None, "ci95": None, "mean_S": None}
        assert level["in_band"] == {"fraction": None, "ci95": None}


def test_warning_when_disturbance_dominates():
    result = result_object(tally_of(stress_dominates=True), FakeScenario())
    assert [text.split(":")[0] for text in result["warnings"]] == ["disturbance dominates on every die"]
    tally = Tally(JOB)
    for die in range(3):
        tally.add(DieSummariser(JOB)(replace(fake_outcome(JOB, die), stress_dominates=die == 1)))
    warnings = result_object(tally, FakeScenario())["warnings"]
    assert [text.split(":")[0] for text in warnings] == ["disturbance dominates on 1 of 3 dies"]


def test_warning_when_energies_may_be_off():
    result = result_object(tally_of(half_select_error=0.034), FakeScenario())
    assert result["energy_J"]["half_select_error"] == 0.034
    assert len(result["warnings"]) == 1
    assert "3.4 %" in result["warnings"][0]


def test_no_die_no_result():
    with pytest.raises(ValueError, match="no die was programmed"):
        result_object(Tally(JOB), FakeScenario())
