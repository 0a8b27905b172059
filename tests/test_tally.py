"""The tally of dies: equal to plain loops over all cells, the same digits however dies are run, bounded memory."""

from concurrent.futures import ThreadPoolExecutor
from dataclasses import fields, is_dataclass, replace

import numpy as np
import pytest

from benchmarks.die_summary import DieSummariser, summarise_die
from benchmarks.error_scale import BINS_PER_HALF_WIDTH
from benchmarks.result import result_object
from benchmarks.statistics import t_quantile
from benchmarks.tally import SAMPLED, Tally
from device_models.faults import HEALTHY
from programming.job import ENERGY_PARTS, STATUS_NAMES, Targets
from tests.fake_outcomes import FakeScenario, FakeScore, fake_job, fake_outcome
from tests.twins.plain_metrics import plain_result


def plain_die(outcome):
    return {
        "target": outcome.target_S.tolist(),
        "final": outcome.final_S.tolist(),
        "disturbance": outcome.disturbance_S.tolist(),
        "pulses": outcome.pulses.tolist(),
        "verifies": outcome.verifies.tolist(),
        "status": [STATUS_NAMES[status] for status in outcome.status],
        "stuck": (outcome.fault != HEALTHY).tolist(),
        "in_band": outcome.in_band.tolist(),
        "share": outcome.dose_share.tolist(),
        "energy": outcome.energy_J.tolist(),
        "time": outcome.time_s,
    }


def tally_of(job, outcomes, score=None):
    tally, summarise = Tally(job), DieSummariser(job, score)
    for outcome in outcomes:
        tally.add(summarise(outcome))
    return tally


def assert_equal(measured, expected, path="result"):
    """Every number of `expected` is in `measured`, to 1e-11 of its size; mean errors to 1e-11 of the rms beside them."""
    if isinstance(expected, dict):
        for key, value in expected.items():
            assert_equal(measured[key], value, f"{path}.{key}")
    elif isinstance(expected, list):
        assert len(measured) == len(expected), path
        for index, value in enumerate(expected):
            assert_equal(measured[index], value, f"{path}[{index}]")
    elif isinstance(expected, float):
        assert measured == pytest.approx(expected, rel=1e-11, abs=0), path
    else:
        assert measured == expected, path


def _matrix_with_gaps(rows, columns, values):
    matrix = np.random.default_rng(5).choice(values, (rows, columns))
    matrix[1, 2:] = np.nan
    return matrix


JOBS = {
    "levels": fake_job(24, 20),
    "fraction of the target": fake_job(16, 16, tolerance_S=0.0, tolerance_fraction=0.04),
    "matrix with cells left out": fake_job(
        9, 14, targets=Targets("matrix", 2e-5, 8e-5, matrix_S=_matrix_with_gaps(9, 14, [2e-5, 5e-5, 8e-5]))
    ),
}


@pytest.mark.parametrize("name", JOBS)
@pytest.mark.parametrize("dies", [2, 7])
def test_all_metrics_equal_plain_loops(name, dies):
    job = JOBS[name]
    outcomes = [fake_outcome(job, die) for die in range(dies)]
    tally = tally_of(job, outcomes)
    expected = plain_result([plain_die(outcome) for outcome in outcomes], tally.scale.levels_S.tolist(), t_quantile(dies))
    assert_equal(result_object(tally, FakeScenario()), expected)


def test_a_single_die_has_values_but_no_intervals():
    job = JOBS["levels"]
    outcome = fake_outcome(job, 0)
    tally = tally_of(job, [outcome])
    expected = plain_result([plain_die(outcome)], tally.scale.levels_S.tolist(), None)
    assert expected["final_error_S"]["ci95"] is None
    assert_equal(result_object(tally, FakeScenario()), expected)


def test_continuous_targets_are_summarised_in_equal_ranges():
    job = fake_job(20, 20, targets=Targets("uniform", 1e-5, 9e-5))
    outcomes = [fake_outcome(job, die) for die in range(3)]
    levels = result_object(tally_of(job, outcomes), FakeScenario())["levels"]
    width = 5e-6
    assert [level["target_S"] for level in levels] == pytest.approx(np.arange(16) * width + 1.25e-5, rel=1e-12, abs=0)
    for level in levels:
        inside = [np.abs(outcome.target_S - level["target_S"]) < width / 2 for outcome in outcomes]
        assert level["cells"] == sum(int(chosen.sum()) for chosen in inside)
        square = sum(float(((o.final_S - o.target_S)[c] ** 2).sum()) for o, c in zip(outcomes, inside, strict=True))
        assert level["error"]["rms_S"] == pytest.approx((square / level["cells"]) ** 0.5, rel=1e-11, abs=0)


def test_memory_of_the_outcome_may_be_reused_at_once():
    """The workers overwrite their arrays with the next die; the summary must not see it."""
    job = JOBS["levels"]
    kept = tally_of(job, (fake_outcome(job, die) for die in range(3)))
    reused, summarise = Tally(job), DieSummariser(job)
    for die in range(3):
        outcome = fake_outcome(job, die)
        summary = summarise(outcome)
        for field in fields(outcome):
            value = getattr(outcome, field.name)
            if isinstance(value, np.ndarray):
                value[...] = 0
        reused.add(summary)
    assert result_object(reused, FakeScenario()) == result_object(kept, FakeScenario())
    assert np.array_equal(reused.disturbance.mean_map(24, 20), kept.disturbance.mean_map(24, 20))
    assert np.array_equal(reused.sample, kept.sample)


@pytest.mark.parametrize("workers", [1, 2, 5])
def test_any_number_of_workers_gives_the_same_digits(workers):
    job = JOBS["levels"]
    expected = tally_of(job, (fake_outcome(job, die) for die in range(9)), FakeScore())
    tally, summarise = Tally(job), DieSummariser(job, FakeScore())
    with ThreadPoolExecutor(workers) as pool:
        for summary in pool.map(lambda die: summarise(fake_outcome(job, die)), range(9)):
            tally.add(summary)
    scenario = FakeScenario(score=FakeScore())
    assert result_object(tally, scenario) == result_object(expected, scenario)


def _bytes(thing):
    if isinstance(thing, np.ndarray):
        return thing.nbytes
    if hasattr(thing, "__dict__") and not is_dataclass(thing):
        return sum(_bytes(value) for value in vars(thing).values())
    return 0


def test_memory_does_not_grow_with_the_number_of_dies():
    job = fake_job(64, 64, max_pulses=30)  # so that the longest pulse count is met early
    tally, summarise = Tally(job), DieSummariser(job)
    sizes = []
    for die in range(18):
        tally.add(summarise(fake_outcome(job, die)))
        sizes.append(_bytes(tally))
    assert len(tally.sample) == SAMPLED
    assert sizes[5] == sizes[-1] > 1e5


def test_error_histogram_counts_every_cell_once():
    job = JOBS["fraction of the target"]
    outcomes = [fake_outcome(job, die) for die in range(4)]
    tally = tally_of(job, outcomes)
    scaled = np.concatenate([(o.final_S - o.target_S) / (0.04 * o.target_S) for o in outcomes])
    span = tally.scale.span
    edges = np.linspace(-span, span, 2 * span * BINS_PER_HALF_WIDTH + 1)
    expected, _ = np.histogram(scaled, np.concatenate(([-np.inf], edges, [np.inf])))
    assert np.array_equal(tally.error_histogram, expected)
    middle = tally.error_histogram.size // 2
    inside = tally.error_histogram[middle - BINS_PER_HALF_WIDTH : middle + BINS_PER_HALF_WIDTH].sum()
    assert inside == tally.all.cells_in_band
    assert tally.levels.histogram.sum() == scaled.size


def test_maps_are_means_over_dies():
    job = JOBS["levels"]
    disturbances = np.array([fake_outcome(job, die).disturbance_S for die in range(5)])
    tally = tally_of(job, (fake_outcome(job, die) for die in range(5)))
    mean, rms = np.abs(disturbances).mean(axis=0), np.sqrt((disturbances**2).mean(axis=0))
    np.testing.assert_allclose(tally.disturbance.mean_map(24, 20).ravel(), mean, rtol=1e-13, atol=0)
    np.testing.assert_allclose(tally.disturbance.rms_map(24, 20).ravel(), rms, rtol=1e-13, atol=0)


def test_dies_must_come_in_order():
    job = JOBS["levels"]
    tally = tally_of(job, [fake_outcome(job, 1)])
    with pytest.raises(ValueError, match="die 0 comes after die 1"):
        tally.add(summarise_die(fake_outcome(job, 0), job))


@pytest.mark.parametrize("name", ["final_S", "disturbance_S", "energy_J"])
def test_outcomes_that_are_not_finite_are_refused(name):
    outcome = fake_outcome(JOBS["levels"], 3)
    getattr(outcome, name)[len(ENERGY_PARTS) - 1] = np.nan
    with pytest.raises(ValueError, match=r"die 3: .* is not a finite number"):
        summarise_die(outcome, JOBS["levels"])


def test_unaddressed_cells_may_have_any_final_conductance():
    job = JOBS["matrix with cells left out"]
    outcome = fake_outcome(job, 0)
    outcome.final_S[np.isnan(outcome.target_S)] = np.inf
    assert summarise_die(outcome, job).addressed == 9 * 14 - 12


def test_a_die_without_addressed_cells_is_refused():
    outcome = fake_outcome(JOBS["levels"], 0)
    nowhere = replace(outcome, target_S=np.full(outcome.target_S.size, np.nan))
    with pytest.raises(ValueError, match="no cell is addressed"):
        summarise_die(nowhere, JOBS["levels"])


def test_the_score_sees_the_final_array():
    job = JOBS["levels"]
    outcome = fake_outcome(job, 0)
    seen = []
    summary = summarise_die(outcome, job, lambda conductance: seen.append(conductance.copy()) or 0.25)
    assert summary.score == 0.25
    assert np.array_equal(seen[0], outcome.final_S.reshape(24, 20))
    with pytest.raises(ValueError, match="the score is nan"):
        summarise_die(outcome, job, lambda _conductance: float("nan"))
