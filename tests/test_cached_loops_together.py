"""Loops compiled in processes of their own and loaded into one: each must keep to its own device."""

import os
import subprocess
import sys
from pathlib import Path

import pytest

PROBE = """
import sys
from device_models.catalog import load_device
from programming.cell_sample import nominal_cell
from tests.jobs import cell_of, job
for name in sys.argv[1:]:
    print(*nominal_cell(job(cell=cell_of(load_device(name))))[:2])
"""
RANGES = {"voltage_threshold": (10e-6, 100e-6), "saturating_update": (5e-6, 80e-6)}


def probed(cache: Path, *names: str) -> list[tuple[float, ...]]:
    """Lowest and highest conductance of the devices, asked for in one fresh process."""
    done = subprocess.run(
        [sys.executable, "-c", PROBE, *names],
        check=True,
        capture_output=True,
        text=True,
        env=os.environ | {"PULSEWRIGHT_CACHE_DIR": str(cache)},
        cwd=Path(__file__).parent.parent,
    )
    return [tuple(float(word) for word in line.split()) for line in done.stdout.splitlines()]


def test_loops_from_the_cache_do_not_find_each_others_parts(tmp_path: Path) -> None:
    for name in RANGES:
        probed(tmp_path, name)  # numba numbers its functions anew in each: the numbers of both are alike
    for names in (tuple(RANGES), tuple(reversed(RANGES))):
        for name, found in zip(names, probed(tmp_path, *names), strict=True):
            assert found == pytest.approx(RANGES[name], rel=1e-6, abs=0)
