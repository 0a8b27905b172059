"""The compiled loop against its plain twin, which steps every cell at every pulse."""

import dataclasses
import math

import numpy as np
import pytest

from device_models.catalog import load_device
from programming.job import PulseTrain, Targets
from programming.orders import ORDERS
from programming.run import program_dies
from programming.verify_noise import read_noise_of
from tests.jobs import cell_of, job
from tests.twins import plain_random as draws
from tests.twins.plain_programming import Bench, SinhCell, ThresholdCell


def copied(outcome):
    """All of an outcome, copied: the arrays belong to the worker's next die."""
    return dataclasses.replace(
        outcome,
        **{f.name: np.array(v) for f in dataclasses.fields(outcome) if isinstance(v := getattr(outcome, f.name), np.ndarray)},
    )


def run(a_job, dies=1):
    return list(program_dies(a_job, dies, 1, copied))


def drawn_values(a_job):
    """Parameters of every cell of die 0, drawn by the twin's own generator."""
    cell = a_job.cell
    count = a_job.rows * a_job.columns
    fields = cell.model.Parameters._fields
    values = {name: np.full(count, float(cell.values[name])) for name in fields}
    for name, spread in cell.spreads.items():
        for c in range(count):
            z = draws.truncated_normal(a_job.seed, 0, c, draws.DEVICE_SPREAD, fields.index(name), 0, cell.truncation)
            sigma = math.sqrt(math.log1p(spread.relative**2))
            factor = 1 + spread.relative * z if spread.law == "normal" else math.exp(sigma * z - sigma**2 / 2)
            values[name][c] *= factor
    return values


def drawn_start(a_job, low, high):
    z = [draws.truncated_normal(a_job.seed, 0, c, draws.INITIAL, 0, 0, a_job.cell.truncation) for c in range(low.size)]
    return np.clip(a_job.cell.initial_S * (1 + a_job.cell.initial_spread * np.array(z)), low, high)


def drawn_targets(a_job):
    u = np.array([draws.uniform(a_job.seed, 0, c, draws.TARGETS, 0, 0) for c in range(a_job.rows * a_job.columns)])
    return a_job.targets.levels_S[(u * a_job.targets.levels_S.size).astype(int)]


def twin_cell(a_job):
    v = drawn_values(a_job)
    if a_job.cell.model.name == "voltage_threshold":
        return ThresholdCell(v)
    r_set = v["set_rate"] / np.sinh(v["set_voltage"] / v["set_scale"])
    r_reset = v["reset_rate"] / np.sinh(v["reset_voltage"] / v["reset_scale"])
    return SinhCell(v["G_min"], v["G_max"], r_set, r_reset, v["set_scale"], v["reset_scale"])


def twin_of(a_job, stress_rng=None):
    cell = twin_cell(a_job)
    noise = read_noise_of(a_job)
    settings = {
        "seed": a_job.seed,
        "rows": a_job.rows,
        "columns": a_job.columns,
        "word": a_job.bias.word,
        "bit": a_job.bias.bit,
        "read_voltage": a_job.verify.voltage_V,
        "integration": a_job.verify.integration_s,
        "noise_linear": noise["noise_linear"],
        "noise_square": noise["noise_square"],
        "cycle": a_job.cell.cycle.relative if a_job.cell.cycle else 0.0,
        "max_pulses": a_job.max_pulses,
        "tolerance": a_job.tolerance_S,
        "resolution": a_job.resolution,
        "set": dataclasses.asdict(a_job.set),
        "reset": dataclasses.asdict(a_job.reset),
    }
    start = drawn_start(a_job, *cell.ends())
    bench = Bench(cell, settings, start, drawn_targets(a_job), stress_rng=stress_rng)
    return bench.run(ORDERS[a_job.order](a_job.rows, a_job.columns, a_job.seed, 0), a_job.passes)


def no_telegraph(cell):
    return dataclasses.replace(cell, noise=dataclasses.replace(cell.noise, telegraph=0.0))


def one_polarity(scheme, **changes):
    """A scenario with SET pulses only: start low, a band wide enough never to be overshot."""
    cell = no_telegraph(cell_of(load_device("voltage_threshold"), "demo_oxide"))
    return job(
        scheme=scheme,
        cell=cell,
        targets=Targets("levels", 40e-6, 80e-6, np.array([40e-6, 60e-6, 80e-6])),
        tolerance_S=12e-6,
        stress_noise=False,
        **changes,
    )


@pytest.mark.parametrize("scheme", ["V/2", "V/3"])
@pytest.mark.parametrize("order", ["row_by_row", "interleaved"])
def test_one_polarity_is_exact(scheme, order):
    a_job = one_polarity(scheme, order=order, passes=2)
    twin, outcome = twin_of(a_job), run(a_job)[0]
    assert twin.pulses.sum() > 500
    assert np.array_equal(outcome.pulses, twin.pulses)
    assert np.array_equal(outcome.verifies, twin.reads)
    assert np.array_equal(outcome.status, twin.status)
    np.testing.assert_allclose(outcome.final_S, twin.conductance(), rtol=1e-12, atol=0)
    own = twin.low + (twin.high - twin.low) * twin.own
    scale = np.abs(outcome.disturbance_S).max()
    np.testing.assert_allclose(outcome.disturbance_S, twin.conductance() - own, rtol=0, atol=1e-12 * max(scale, 1e-5))
    if scheme == "V/2":
        assert scale > 1e-8  # something was disturbed: the agreement is not about zeros


def test_energy_agrees_with_the_twin():
    a_job = one_polarity("V/3")
    twin, outcome = twin_of(a_job), run(a_job)[0]
    parts = dict(zip(("selected", "half_selected", "rest", "verify"), outcome.energy_J[:4], strict=True))
    # the twin integrates each pulse by 2000 midpoints, hence 1e-6
    assert parts["selected"] == pytest.approx(twin.energy["selected"], rel=1e-6, abs=0)
    bound = outcome.half_select_error + 1e-9
    for name in ("half_selected", "rest", "verify"):
        assert parts[name] == pytest.approx(twin.energy[name], rel=bound, abs=0)


def rms(values):
    return math.sqrt(np.mean(np.square(values)))


def compare(a_job, pulses_within, rms_within):
    twin, outcome = twin_of(a_job), run(a_job)[0]
    assert twin.energy["selected"] > 0
    assert outcome.pulses.mean() == pytest.approx(twin.pulses.mean(), rel=pulses_within, abs=0)
    error, twin_error = outcome.final_S - outcome.target_S, twin.conductance() - twin.target
    assert rms(error) == pytest.approx(rms(twin_error), rel=rms_within, abs=0)
    return outcome


@pytest.mark.parametrize("scheme", ["V/2", "V/3"])
def test_mild_stress_of_both_polarities(scheme):
    cell = no_telegraph(cell_of(load_device("voltage_threshold"), "demo_oxide"))
    outcome = compare(job(24, 24, scheme, cell=cell, stress_noise=False), 0.005, 0.005)
    assert not outcome.stress_dominates


def sinh_job(scheme, scale, rows=24, **changes):
    """The saturating cell without dead zone; a larger voltage scale means more half-select stress."""
    model = load_device("saturating_update")
    cell = cell_of(model, "demo_analogue", overrides={"set_scale": scale, "reset_scale": scale})
    settings = {
        "cell": no_telegraph(cell),
        "targets": Targets("levels", 15e-6, 65e-6, np.linspace(15e-6, 65e-6, 11)),
        "set": PulseTrain(0.5, 0.02, 1.4, 100e-9),
        "reset": PulseTrain(0.5, 0.02, 1.4, 100e-9),
        "stress_noise": False,
    }
    return job(rows, rows, scheme, **settings | changes)


@pytest.mark.parametrize(("scheme", "scale"), [("V/2", 0.06), ("V/3", 0.08)])
def test_exponential_kinetics_mild(scheme, scale):
    outcome = compare(sinh_job(scheme, scale), 0.005, 0.005)
    assert not outcome.stress_dominates


@pytest.mark.parametrize("scheme", ["V/2", "V/3"])
@pytest.mark.parametrize("rows", [24, 48])
def test_a_scheme_that_wrecks_its_array(scheme, rows):
    outcome = compare(sinh_job(scheme, 0.2, rows), 0.03, 0.05)
    assert outcome.stress_dominates
