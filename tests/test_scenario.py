"""Scenario files resolved: every key arrives in the job, defaults are what is documented, the digest names what counts."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest

from benchmarks.scenario import load_scenario
from benchmarks.shipped_scenarios import scenario_files
from device_models.voltage_threshold import MODEL
from programming.bias import SCHEMES
from programming.job import Faults, ParameterSpread, PulseTrain, Verify
from tests.scenario_files import Edits, load, write_scenario


def test_every_section_arrives_in_the_job(tmp_path: Path) -> None:
    everything = """
[device.overrides]
v_on = "-1.1 V"
window = "none"
[device.initial]
conductance = "14 uS"
spread = "5 %"
[device.variation]
truncation = 2.5
cycle = {law = "normal", spread = "25 %"}
[device.variation.cells]
v_on = {spread = "4 %"}
k_on = {spread = "0 %"}
[device.noise]
flicker = 1e-6
telegraph = "3 %"
telegraph_low_dwell = "2 ms"
transport = "tunnel"
[device.faults]
stuck_low = "1 %"
stuck_high = "0.5 %"
placement = "clustered"
cluster_size = 5
[targets]"""
    scenario = load(
        tmp_path,
        ("[targets]", everything),
        ('scheme = "V/3"', 'scheme = {word = 0.4, bit = 0.6}\norder = "random"\npasses = 3\nresolution = "2 mV"'),
        ('"2 uS"', '"3 %"'),
        ("columns = 6", 'columns = 6\ntemperature = "350 K"'),
        ('width = "100 ns"', 'width = "100 ns"\nrise = "4 ns"\ndead_time = "30 ns"'),
        ("bits = 8", 'bits = 8\nreads = 3\nshot = false\ngain_error = "-2 %"\nintegration = "1 us"\nvoltage = "0.1 V"'),
    )
    job = scenario.job
    assert (job.seed, job.rows, job.columns, job.temperature_K, scenario.dies) == (3, 8, 6, 350.0, 2)
    assert job.cell.model is MODEL
    assert job.cell.values["v_on"] == -1.1
    assert job.cell.values["window"] == MODEL.quantities["window"].choices.index("none")
    assert job.cell.values["v_off"] == MODEL.sets["demo_oxide"]().values["v_off"].value
    assert job.cell.spreads["v_on"] == ParameterSpread("normal", 0.04)
    assert "k_on" not in job.cell.spreads
    assert "k_off" in job.cell.spreads
    assert job.cell.truncation == 2.5
    assert job.cell.cycle == ParameterSpread("normal", 0.25)
    assert (job.cell.initial_S, job.cell.initial_spread) == (14e-6, 0.05)
    noise = job.cell.noise
    assert (noise.flicker, noise.telegraph, noise.telegraph_low_dwell, noise.transport) == (1e-6, 0.03, 2e-3, "tunnel")
    assert job.faults == Faults(0.01, 0.005, "clustered", 5.0)
    assert job.verify == Verify(0.1, 1e-6, 3, 8, 100e-6, -0.02, 0.0, True, False, True, True, 1.0)
    assert job.set == PulseTrain(0.8, 0.02, 1.6, 100e-9, 0.0, 100e-9, 4e-9, 30e-9)
    assert job.reset == PulseTrain(0.8, 0.02, 1.6, 100e-9, 0.0, 100e-9)
    assert (job.tolerance_S, job.tolerance_fraction) == (0.0, 0.03)
    assert (job.order, job.passes, job.max_pulses, job.resolution) == ("random", 3, 200, 2e-3)
    assert (job.bias.word, job.bias.bit) == (0.4, 0.6)
    np.testing.assert_allclose(job.targets.levels_S, np.linspace(15e-6, 85e-6, 8), rtol=1e-15, atol=0)


def test_defaults(tmp_path: Path) -> None:
    job = load(tmp_path, ("bits = 8", ""), ('range = "100 uS"', ""), ('title = "Small"\n', "")).job
    assert job.verify == Verify()
    assert job.faults == Faults()
    assert (job.order, job.passes, job.resolution, job.stuck_false_alarm) == ("row_by_row", 1, 5e-3, 1e-3)
    assert load(tmp_path, ('scheme = "V/3"\n', "")).job.bias is SCHEMES["V/2"]
    assert load(tmp_path, ('title = "Small"\n', "")).title == "small"


def test_seed_and_dies_of_the_command_take_precedence(tmp_path: Path) -> None:
    scenario = load(tmp_path, seed=11, dies=5)
    assert (scenario.job.seed, scenario.dies) == (11, 5)


def test_every_value_has_its_source(tmp_path: Path) -> None:
    scenario = load(tmp_path, ("[targets]", '[device.overrides]\nv_on = "-1.1 V"\n[targets]'))
    assert set(scenario.job.cell.values) <= set(scenario.sources)
    assert scenario.sources["v_on"] == "this scenario"
    assert scenario.sources["v_off"] == MODEL.sets["demo_oxide"]().values["v_off"].source
    assert all(scenario.sources.values())


# ---- the digest


def digest(folder: Path, *edits: tuple[str, str]) -> str:
    return load(folder, *edits).digest


def test_digest_is_blind_to_spelling(tmp_path: Path) -> None:
    plain = digest(tmp_path)
    assert len(plain) == 64
    for same in (
        ('"100 ns"', '"0.1 us"'),
        ('"V/3"', f"{{word = {1 / 3!r}, bit = {2 / 3!r}}}"),
        ("seed = 3", "# a remark\nseed = 3"),
        ('title = "Small"', 'title = "Another name"'),
        ("bits = 8", "bits = 8\nreads = 1"),
    ):
        assert digest(tmp_path, same) == plain, same


def test_digest_sees_every_number(tmp_path: Path) -> None:
    changes: list[Edits] = [
        (),
        (("seed = 3", "seed = 4"),),
        (("dies = 2", "dies = 3"),),
        (("columns = 6", "columns = 7"),),
        (('"100 ns"', '"101 ns"'),),
        (('step = "20 mV"', 'step = "21 mV"'),),
        (('"V/3"', '"V/2"'),),
        (('"2 uS"', '"2.1 uS"'),),
        (("levels = 8", "levels = 9"),),
        (("bits = 8", "bits = 9"),),
        (("bits = 8", "bits = 8\nthermal = false"),),
        (("max_pulses = 200", 'max_pulses = 200\norder = "random"'),),
        (("[targets]", '[device.overrides]\nk_on = "-0.118 m/s"\n[targets]'),),
        (("[targets]", '[device.variation.cells]\nv_on = {spread = "11 %"}\n[targets]'),),
        (("[targets]", '[device.faults]\nstuck_low = "1 %"\n[targets]'),),
        (("[targets]", '[device.noise]\ntelegraph = "2 %"\n[targets]'),),
    ]
    assert len({digest(tmp_path, *edits) for edits in changes}) == len(changes)


def test_digest_covers_the_bytes_of_the_target_file(tmp_path: Path) -> None:
    edit = ('low = "15 uS"\nhigh = "85 uS"\nlevels = 8\n', 'kind = "file"\npath = "t.csv"\nunit = "uS"\n')
    rows = ["20,21,22,23,24,25"] * 8
    digests = set()
    for row in ("20,21,22,23,24,25", "20,21,22,23,25,25", "20.0,21,22,23,24,25"):
        (tmp_path / "t.csv").write_text("\n".join([*rows[:7], row]))
        digests.add(digest(tmp_path, edit))
    assert len(digests) == 3


# ---- targets from files


def test_targets_from_csv_and_npy(tmp_path: Path) -> None:
    matrix = np.linspace(20e-6, 80e-6, 48).reshape(8, 6)
    matrix[2, 3] = np.nan
    np.save(tmp_path / "t.npy", matrix)
    text = "\n".join(",".join("" if np.isnan(v) else f"{v * 1e6!r}" for v in row) for row in matrix.tolist())
    (tmp_path / "t.csv").write_bytes(b"\xef\xbb\xbf" + text.encode() + b"\r\n\r\n")  # as a spreadsheet writes it
    both = []
    for name, unit in (("t.csv", 'unit = "uS"'), ("t.npy", "")):
        edit = ('low = "15 uS"\nhigh = "85 uS"\nlevels = 8\n', f'kind = "file"\npath = "{name}"\n{unit}\n')
        targets = load(tmp_path, edit).job.targets
        assert targets.kind == "matrix"
        assert targets.matrix_S is not None
        assert np.isnan(targets.matrix_S[2, 3])
        np.testing.assert_allclose(targets.matrix_S, matrix, rtol=1e-14, atol=0)
        assert (targets.low_S, targets.high_S) == pytest.approx((20e-6, 80e-6), rel=1e-14, abs=0)
        both.append(targets.matrix_S)
    np.testing.assert_allclose(both[0], both[1], rtol=1e-14, atol=0)


# ---- what ships


@pytest.mark.parametrize("name", scenario_files())
def test_shipped_scenarios_load(name: str) -> None:
    scenario = load_scenario(name)
    assert scenario.title
    assert scenario.path == scenario_files()[name]


def test_the_demo_and_its_v3_twin_differ_by_the_scheme_alone() -> None:
    demo, v3 = (dict(load_scenario(name).document) for name in ("demo", "demo_v3"))
    assert demo["programming"].pop("scheme")["name"] == "V/2"
    assert v3["programming"].pop("scheme")["name"] == "V/3"
    assert demo == v3


def test_a_file_beats_a_shipped_name_only_as_a_path(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    write_scenario(tmp_path, name="demo.toml")
    (tmp_path / "demo").mkdir()
    monkeypatch.chdir(tmp_path)
    assert load_scenario("demo").path == scenario_files()["demo"]
    assert load_scenario("demo.toml").title == "Small"
