"""Tables: CSV with every digit, Markdown for people, both saying what the result says."""

import csv

import pytest

from benchmarks.die_summary import DieSummariser
from benchmarks.headline import headline
from benchmarks.result import result_object
from benchmarks.tables import write_tables
from benchmarks.tally import Tally
from tests.fake_outcomes import FakeScenario, FakeScore, fake_job, fake_outcome


@pytest.fixture(scope="module")
def written(tmp_path_factory):
    job = fake_job(20, 20)
    tally, summarise = Tally(job), DieSummariser(job, FakeScore())
    for die in range(3):
        tally.add(summarise(fake_outcome(job, die)))
    result = result_object(tally, FakeScenario(score=FakeScore()))
    folder = tmp_path_factory.mktemp("tables")
    paths = write_tables(folder, tally, result)
    assert sorted(paths) == sorted(folder.iterdir())
    return folder, tally, result


def rows(folder, name):
    with (folder / f"{name}.csv").open(encoding="utf-8", newline="") as file:
        return list(csv.DictReader(file))


def markdown(folder, name):
    lines = (folder / f"{name}.md").read_text(encoding="utf-8").splitlines()
    cells = [[cell.strip() for cell in line.strip("|").split("|")] for line in lines]
    assert set("".join(cells[1])) == set(":-")
    assert {len(row) for row in cells} == {len(cells[0])}
    return [cells[0], *cells[2:]]


def test_summary(written):
    folder, _tally, result = written
    table = rows(folder, "summary")
    for row, quantity in zip(table, headline(result), strict=True):
        assert row["quantity"] == quantity.full_name
        assert [float(row[key]) for key in ("value", "ci95_low", "ci95_high")] == [quantity.value, *quantity.interval]
        assert row["unit"] == ("" if quantity.unit == "%" else quantity.unit)
    header, *text = markdown(folder, "summary")
    assert header == ["quantity", "value", "95 % interval", "unit"]
    in_band = next(row for row in text if row[0] == "In band")
    assert float(in_band[1]) == pytest.approx(100 * result["in_band"]["fraction"], abs=0.1)
    assert in_band[3] == "%"


def test_levels(written):
    folder, _tally, result = written
    for row, level in zip(rows(folder, "levels"), result["levels"], strict=True):
        assert float(row["target_S"]) == level["target_S"]
        assert int(row["cells"]) == level["cells"]
        assert float(row["rms_error_S"]) == level["error"]["rms_S"]
        assert [float(row["rms_ci95_low_S"]), float(row["rms_ci95_high_S"])] == level["error"]["ci95"]
        assert float(row["mean_error_S"]) == level["error"]["mean_S"]
        assert float(row["in_band"]) == level["in_band"]["fraction"]
        assert [float(row["in_band_ci95_low"]), float(row["in_band_ci95_high"])] == level["in_band"]["ci95"]
    header, *text = markdown(folder, "levels")
    assert header[0] == "target (uS)"
    assert [row[0] for row in text[:2]] == ["15.00", "20.33"]


def test_pulses(written):
    folder, tally, result = written
    table = rows(folder, "pulses")
    assert {int(row["pulses"]): int(row["cells"]) for row in table} == {
        count: cells for count, cells in enumerate(tally.pulses.tolist()) if cells
    }
    assert int(table[-1]["pulses"]) == result["pulses_per_cell"]["max"]
    assert float(table[-1]["up_to"]) == 1.0
    half = next(row for row in table if float(row["up_to"]) >= 0.5)
    assert int(half["pulses"]) == result["pulses_per_cell"]["p50"]


def test_energy(written):
    folder, _tally, result = written
    table = {row["part"]: row for row in rows(folder, "energy")}
    for part, row in table.items():
        assert float(row["energy_J"]) == result["energy_J"][part]
    shares = [float(table[part]["share"]) for part in ("selected", "half_selected", "rest", "verify", "lines")]
    assert sum(shares) == pytest.approx(1.0, rel=1e-12, abs=0)
    assert table["supply"]["share"] == ""
