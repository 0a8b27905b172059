"""The summary on the terminal: complete, within 80 columns, readable without colour and in plain ASCII."""

import io
from dataclasses import replace

import pytest
from rich.console import Console

from benchmarks.die_summary import DieSummariser
from benchmarks.headline import headline
from benchmarks.result import result_object
from benchmarks.tally import Tally
from benchmarks.terminal import print_summary
from tests.fake_outcomes import FakeScenario, FakeScore, fake_job, fake_outcome

JOB = fake_job(16, 16)


def result_of(dies=4, scenario=None, **changes):
    scenario = scenario or FakeScenario(score=FakeScore(), warnings=["the band is narrower than the read noise " * 4])
    tally, summarise = Tally(JOB), DieSummariser(JOB, scenario.score)
    for die in range(dies):
        tally.add(summarise(replace(fake_outcome(JOB, die), **changes)))
    return result_object(tally, scenario)


def printed(result, encoding="utf-8", **settings):
    raw = io.BytesIO()
    file = io.TextIOWrapper(raw, encoding=encoding, newline="\n")
    print_summary(result, Console(file=file, width=80, **settings))
    file.flush()
    return raw.getvalue().decode(encoding)


def test_every_quantity_is_there_with_its_interval():
    result = result_of()
    lines = printed(result).splitlines()
    for quantity in headline(result):
        if not quantity.healthy:
            assert sum(quantity.name in line for line in lines) == 1, quantity.name
    pulses = next(line for line in lines if "Pulses per cell" in line)
    low, high = result["pulses_per_cell"]["ci95"]
    assert f"{low:.2f} – {high:.2f}" in pulses or f"{low:.1f} – {high:.1f}" in pulses
    assert f"p50 {result['pulses_per_cell']['p50']}" in pulses
    text = "\n".join(lines)
    assert "Made-up oxide cells" in text
    assert "1 024 cells programmed on 4 dies" in text
    assert "software 90.00 %" in text
    for part in ("selected", "half-selected", "rest", "verify", "lines"):
        assert part in text


def test_energy_shares_are_of_the_total():
    result = result_of()
    line = next(line for line in printed(result).splitlines() if "half-selected" in line)
    energy = result["energy_J"]
    assert f"{100 * energy['half_selected'] / energy['per_cell']:.1f} %" in line


@pytest.mark.parametrize("dies", [1, 4])
@pytest.mark.parametrize("encoding", ["utf-8", "ascii"])
def test_eighty_columns_without_colour(dies, encoding):
    text = printed(result_of(dies, stress_dominates=True), encoding)
    assert max(len(line) for line in text.splitlines()) <= 80
    assert "\x1b" not in text
    assert "warning: disturbance dominates on every die" in " ".join(text.split())
    assert "warning: the band is narrower" in text


def test_colour_where_there_is_a_terminal():
    assert "\x1b[" in printed(result_of(), force_terminal=True, color_system="standard")


def test_one_die_says_so():
    text = printed(result_of(1))
    assert "on 1 die\n" in text.replace(" \n", "\n")
    assert text.count("one die") == 10


def test_no_healthy_cell_and_no_energy():
    result = result_of()
    result["responding"]["in_band"] = {"fraction": None, "ci95": None}
    result["energy_J"].update(per_cell=0.0, ci95=[0.0, 0.0], selected=0.0, half_selected=0.0, verify=0.0, lines=0.0)
    result["warnings"] = []
    text = printed(result)
    assert "none" in text
    assert "warning" not in text


def test_markup_in_a_title_is_only_text():
    text = printed(result_of(scenario=FakeScenario(title="[red]V/2[/red] :smile:", warnings=["[/]"])))
    assert "[red]V/2[/red] :smile:" in text
    assert "[/]" in text
