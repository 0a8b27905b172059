"""Cells whose conductance depends on the voltage: energy from line sums kept at a few voltages."""

import math
from typing import NamedTuple

import numpy as np
import pytest

from device_models.compiled import compiled
from device_models.contract import DeviceModel, NoiseLevels, Quantity
from programming.job import Cell, PulseTrain, Targets
from programming.plan import HALF_SELECTED, REST, SELECTED, SUPPLY, VERIFY
from programming.run import program_dies
from tests.jobs import job, quiet_verify

V0 = 0.25


class Parameters(NamedTuple):
    g_max: float


@compiled
def still(voltage, p):
    return 0.0


@compiled
def unmoved(state, dose, p):
    return state


@compiled
def sinh_conductance(state, voltage, p):
    """I = g V0 sinh(V / V0): the hopping law, small-signal conductance g."""
    x = voltage / V0
    return state * (1.0 if abs(x) < 1e-6 else math.sinh(x) / x)


@compiled
def small_signal(conductance, p):
    return conductance


@compiled
def limits(p):
    return 1e-6, p.g_max


STILL_CELL = DeviceModel(
    name="still_sinh",
    summary="does not move; sinh current",
    source="test",
    range="test",
    set_polarity=1,
    Parameters=Parameters,
    quantities={"g_max": Quantity("S", 0.0, 1.0, "highest conductance")},
    rate=still,
    advance=unmoved,
    conductance=sinh_conductance,
    state_of=small_signal,
    bounds=limits,
    ohmic=False,
)


def current(g, voltage):
    return g * V0 * math.sinh(voltage / V0)


@pytest.mark.parametrize(("scheme", "row", "rest"), [("V/2", 1 / 2, 0.0), ("V/3", 1 / 3, -1 / 3)])
def test_energy_of_sinh_cells(scheme, row, rest):
    rows, columns, volts, width = 6, 9, 1.37, 80e-9
    a_job = job(
        rows,
        columns,
        scheme,
        "identical_pulses",
        cell=Cell(STILL_CELL, {"g_max": 1e-4}, initial_S=2e-5, noise=NoiseLevels()),
        verify=quiet_verify(),
        targets=Targets("matrix", 5e-5, 5e-5, matrix_S=np.full((rows, columns), 5e-5)),
        set=PulseTrain(volts, 0.0, volts, width),
        reset=PulseTrain(volts, 0.0, volts, width),
        max_pulses=3,
        resolution=0.0,
    )
    energy = next(iter(program_dies(a_job, 1, 1, lambda outcome: outcome.energy_J.copy())))
    g, pulses, verifies = 2e-5, rows * columns * 3, rows * columns * 4
    half = (rows + columns - 2) * row * volts * current(g, row * volts)
    others = (rows - 1) * (columns - 1) * rest * volts * current(g, rest * volts)
    assert energy[SELECTED] == pytest.approx(pulses * width * volts * current(g, volts), rel=1e-12, abs=0)
    # cubic between 33 nodes, for a voltage scale of 0.25 V
    assert energy[HALF_SELECTED] == pytest.approx(pulses * width * half, rel=1e-4, abs=0)
    if rest:
        assert energy[REST] == pytest.approx(pulses * width * others, rel=1e-4, abs=0)
    else:
        assert energy[REST] == 0.0
    read = a_job.verify
    in_row = columns * read.voltage_V * current(g, read.voltage_V) * read.integration_s
    assert energy[VERIFY] == pytest.approx(verifies * in_row, rel=1e-12, abs=0)
    assert energy[SUPPLY] > energy[SELECTED] + energy[HALF_SELECTED] + energy[REST]
