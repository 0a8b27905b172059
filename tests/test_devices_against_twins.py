"""Every compiled model against its plain twin, which marches the printed differential equation in small steps."""

import random

import numpy as np
import pytest

from device_models.contract_checks import natural_dose
from tests.device_variants import VARIANTS
from tests.twins.plain_cells import CELLS, march

# Midpoint steps of a three-thousandth of the dose; the doses are a few natural ones.
TWIN = 1e-4


@pytest.mark.parametrize("variant", VARIANTS, ids=lambda v: v.label)
def test_rate(variant):
    twin = CELLS[variant.model.name](variant.p._asdict())
    for voltage in np.linspace(-2.0, 2.0, 41):
        assert variant.model.rate(float(voltage), variant.p) == pytest.approx(twin.rate(float(voltage)), rel=1e-12, abs=0)


@pytest.mark.parametrize("variant", VARIANTS, ids=lambda v: v.label)
def test_trajectory_and_mean_conductance(variant):
    _, model, p, *_ = variant
    twin = CELLS[model.name](p._asdict())
    draw = random.Random(5)
    low, high = model.bounds(p)
    dose = natural_dose(model, p)
    for part in (0.02, 0.5, 3.0, -0.02, -0.5, -3.0):
        state = model.state_of(low + (high - low) * draw.uniform(0.15, 0.85), p)
        after, mean = march(twin, state, part * dose)
        ours = model.advance(state, part * dose, p)
        change = model.conductance(ours, 0.2, p) - model.conductance(state, 0.2, p)
        assert change == pytest.approx(twin.conductance(after) - twin.conductance(state), rel=TWIN, abs=0)
        assert model.mean_conductance(state, ours, part * dose, 0.2, p) == pytest.approx(mean, rel=TWIN, abs=0)
