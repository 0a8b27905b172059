"""Each warning comes when it should and stays away when it should not."""

from __future__ import annotations

from pathlib import Path

from tests.scenario_files import load


def warned(folder: Path, *edits: tuple[str, str]) -> str:
    return "\n".join(load(folder, *edits).warnings)


QUIET = ("[targets]", '[device.variation.cells]\nv_on = {spread = "0 %"}\nv_off = {spread = "0 %"}\n[targets]')


def test_no_warning_without_a_reason(tmp_path: Path) -> None:
    assert warned(tmp_path) == ""


def test_half_select_above_the_nominal_threshold(tmp_path: Path) -> None:
    """Thresholds at 1.05 V: half of 2.0 V is below, half of 2.2 V above; without spread nothing is in between."""
    half = ('"V/3"', '"V/2"')
    assert "half-select" not in warned(tmp_path, QUIET, half, ('stop = "1.6 V"', 'stop = "2.0 V"'))
    text = warned(tmp_path, QUIET, half, ('stop = "1.6 V"', 'stop = "2.2 V"'))
    assert "half-select above the threshold of the nominal cell: a SET pulse of 2.2 V puts -1.1 V on the same row" in text
    assert "RESET" not in text


def test_half_select_above_the_weakest_threshold(tmp_path: Path) -> None:
    """1.05 V less three times 12 % is 0.672 V: half of 1.34 V is below it, half of 1.6 V above."""
    half = ('"V/3"', '"V/2"')
    both = (('stop = "1.6 V"', 'stop = "1.34 V"'), ('stop = "1.6 V"', 'stop = "1.34 V"'))
    assert "half-select" not in warned(tmp_path, half, *both)
    text = warned(tmp_path, half)
    assert "half-select above the threshold of the weakest cells" in text
    assert "spreads are cut off at 3 sd" in text


def test_the_rest_of_the_array_is_looked_at_with_its_own_sign(tmp_path: Path) -> None:
    """Unselected word lines at V, bit lines at 0: the rest sees the whole pulse; bit lines at V: the reverse of it."""
    assert "a SET pulse of 1.6 V puts -1.6 V" in warned(tmp_path, ('"V/3"', "{word = 1.0, bit = 0.0}"))
    assert "a SET pulse of 1.6 V puts 1.6 V on the rest cells" in warned(tmp_path, ('"V/3"', "{word = 0.0, bit = 1.0}"))


def test_a_cell_without_threshold_is_judged_by_how_far_it_creeps(tmp_path: Path) -> None:
    other = (('"voltage_threshold"', '"saturating_update"'), ('"demo_oxide"', '"demo_analogue"'), ('"85 uS"', '"60 uS"'))
    assert "disturbs a cell without a threshold" not in warned(tmp_path, *other, ('stop = "1.6 V"', 'stop = "1.2 V"'))
    assert "disturbs a cell without a threshold" in warned(tmp_path, *other, ('"V/3"', '"grounded"'))


def test_pulses_that_move_nothing(tmp_path: Path) -> None:
    weak = ('stop = "1.6 V"', 'stop = "1.0 V"')
    assert "the largest SET pulse (1 V) is below the threshold of the nominal cell" in warned(tmp_path, weak)
    almost = ('stop = "1.6 V"', 'stop = "1.2 V"')
    assert "the largest SET pulse (1.2 V) is below the threshold of about" in warned(tmp_path, almost)
    assert "too few to bring the nominal cell" in warned(tmp_path, ("max_pulses = 200", "max_pulses = 2"))


def test_targets_out_of_reach_of_some_cells(tmp_path: Path) -> None:
    text = warned(tmp_path, ('"85 uS"', '"98 uS"'))
    assert "the highest target (98 uS) is out of reach for about" in text


def test_a_verify_that_writes(tmp_path: Path) -> None:
    text = warned(tmp_path, ("bits = 8", 'bits = 8\nvoltage = "1.2 V"'))
    assert "the verify voltage (1.2 V) moves" in text


def test_steps_and_bands(tmp_path: Path) -> None:
    coarse = ("max_pulses = 200", 'max_pulses = 200\nresolution = "50 mV"')
    assert "resolution (50 mV) is coarser than [programming.set] step (20 mV)" in warned(tmp_path, coarse)
    assert "narrower than the noise of one verify" in warned(tmp_path, ('"2 uS"', '"0.1 uS"'))
    assert "converter's step (12.5 uS) is wider than the whole band (4 uS)" in warned(tmp_path, ("bits = 8", "bits = 3"))
    assert "bands of neighbouring levels overlap" in warned(tmp_path, ("levels = 8", "levels = 64"))


def test_keys_without_effect_are_said(tmp_path: Path) -> None:
    text = warned(tmp_path, ('"amplitude_staircase"', '"identical_pulses"'))
    assert "[programming.set] step and stop: no effect with strategy identical_pulses" in text
    text = warned(tmp_path, ('"amplitude_staircase"', '"width_staircase"'))
    assert "the staircase of width_staircase has a single step" in text


def test_normal_cycle_noise_that_turns_pulses_round(tmp_path: Path) -> None:
    edit = ("[targets]", '[device.variation]\ncycle = {law = "normal", spread = "40 %"}\n[targets]')
    assert "turns some pulses round" in warned(tmp_path, edit)
