"""Figures: something is on them, whatever the job; the same bytes whatever the reader's own settings."""

from dataclasses import replace
from importlib import import_module
from io import BytesIO

import matplotlib as mpl
import numpy as np
import pytest
from matplotlib.image import imread

from benchmarks.die_summary import DieSummariser
from benchmarks.figure_style import house_style, new_figure, save
from benchmarks.figures import FIGURES, overview
from benchmarks.figures.error_axis import central_span, merged_bins
from benchmarks.result import result_object
from benchmarks.tally import Tally
from programming.job import Targets
from tests.fake_outcomes import FakeScenario, fake_job, fake_outcome

pytestmark = pytest.mark.filterwarnings("error")


def run(job, dies=2, disturbance=0.2e-6, **changes):
    tally, summarise = Tally(job), DieSummariser(job)
    for die in range(dies):
        tally.add(summarise(replace(fake_outcome(job, die, disturbance), **changes)))
    return tally, result_object(tally, FakeScenario())


def written(name, folder, tally, result):
    module = import_module(FIGURES[name])
    with house_style():
        place = new_figure(module.SIZE)
        module.draw(place, tally, result)
        png, svg = save(place.figure, folder / name)
    return png, svg


@pytest.mark.parametrize("name", FIGURES)
def test_something_is_drawn_in_more_than_black_and_white(name, tmp_path):
    tally, result = run(fake_job(24, 24))
    png, svg = written(name, tmp_path, tally, result)
    image = imread(png)[..., :3]
    height, width = image.shape[:2]
    assert (width / 300, height / 300) == pytest.approx(import_module(FIGURES[name]).SIZE, rel=0.01, abs=0)
    assert np.ptp(image, axis=2).max() > 0.3  # colour
    assert 0.02 < (image.min(axis=2) < 0.95).mean() < 0.8
    for edge in (image[0], image[-1], image[:, 0], image[:, -1]):
        assert edge.min() > 0.9  # nothing is cut off
    text = svg.read_text(encoding="utf-8")
    assert "<dc:date>" not in text
    assert "<text" not in text  # letters are outlines: no font is needed to read it


@pytest.mark.parametrize("name", ["final_conductance", "disturbance_map"])
def test_a_readers_own_settings_change_nothing(name, tmp_path):
    tally, result = run(fake_job(8, 8))
    first = [path.read_bytes() for path in written(name, tmp_path, tally, result)]
    with mpl.rc_context({"font.size": 20, "axes.facecolor": "red", "svg.hashsalt": None, "image.cmap": "jet"}):
        assert [path.read_bytes() for path in written(name, tmp_path, tally, result)] == first
        assert mpl.rcParams["font.size"] == 20


def _matrix(rows, columns):
    matrix = np.random.default_rng(2).uniform(1e-5, 9e-5, (rows, columns))
    matrix[:, 3] = np.nan
    return matrix


JOBS = {
    "one cell": fake_job(1, 1),
    "one row, one level": fake_job(1, 9, targets=Targets("levels", 2e-5, 2e-5, np.array([2e-5]))),
    "one column": fake_job(9, 1),
    "continuous, band a fraction": fake_job(
        20, 8, targets=Targets("uniform", 1e-5, 9e-5), tolerance_S=0.0, tolerance_fraction=0.05
    ),
    "matrix with gaps": fake_job(13, 6, targets=Targets("matrix", 1e-5, 9e-5, matrix_S=_matrix(13, 6))),
    "target of zero": fake_job(
        6, 6, targets=Targets("levels", 0.0, 5e-5, np.array([0.0, 5e-5])), tolerance_S=0.0, tolerance_fraction=0.1
    ),
    "a band far too narrow": fake_job(12, 12, tolerance_S=1e-9),
    "siemens far from micro": fake_job(6, 6, targets=Targets("levels", 1e-9, 8e-9, np.array([1e-9, 8e-9]))),
}


def drawn(tally, result):
    """The overview as an image, coarsely."""
    with house_style():
        place = new_figure(overview.SIZE)
        overview.draw(place, tally, result)
        file = BytesIO()
        place.figure.savefig(file, dpi=60)
    file.seek(0)
    return imread(file)[..., :3]


@pytest.mark.parametrize("job", JOBS)
@pytest.mark.parametrize("dies", [1, 3])
def test_every_kind_of_job_can_be_drawn(job, dies):
    assert np.ptp(drawn(*run(JOBS[job], dies)), axis=2).max() > 0.3


def test_an_array_that_nothing_disturbs_and_no_energy():
    tally, result = run(fake_job(6, 6), disturbance=0.0, energy_J=np.zeros(6), pulses=np.zeros(36, np.uint32))
    assert result["disturbance_S"]["max"] == 0.0
    assert result["energy_J"]["per_cell"] == 0.0
    assert result["pulses_per_cell"]["max"] == 0
    assert np.ptp(drawn(tally, result), axis=2).max() > 0.2


@pytest.mark.parametrize("reach", [2, 3, 8])
def test_merged_bins_keep_every_cell_and_the_edges_of_the_band(reach):
    histogram = np.random.default_rng(4).integers(0, 9, (5, 2 * 8 * 16 + 2))
    edges, counts = merged_bins(histogram, reach)
    middle = histogram.shape[1] // 2
    assert np.array_equal(counts.sum(axis=1), histogram[:, middle - 16 * reach : middle + 16 * reach].sum(axis=1))
    assert {-1.0, 1.0} <= set(edges.round(12).tolist())


def test_the_axis_holds_nearly_all_cells_but_not_the_stuck_ones():
    histogram = np.zeros(2 * 8 * 16 + 2, dtype=np.int64)
    middle = histogram.size // 2
    histogram[middle - 16 * 3 : middle + 16 * 3] = 10
    histogram[0] = 10  # about 1 % far away
    assert central_span(histogram, 8) == 3
    histogram[0] = 1000
    assert central_span(histogram, 8) == 8
