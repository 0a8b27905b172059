"""Physical invariants of every model in the catalog, for every set and every variant of its laws; and proof that the
checks catch models that break them."""

from dataclasses import replace

import pytest

from device_models.catalog import device_names, load_device
from device_models.contract_checks import (
    CHECKS,
    ContractError,
    check_device,
    check_direction,
    check_mean,
    check_mixed,
    check_parameter_set,
    check_rate,
    check_return,
    check_semigroup,
    check_state,
    parameters_of,
)
from tests.device_variants import VARIANTS

SETS = [(name, label) for name in device_names() for label in load_device(name).sets]


@pytest.mark.parametrize("variant", VARIANTS, ids=lambda v: v.label)
def test_model_keeps_its_contract(variant):
    for check in CHECKS:
        exact = variant.closed_mean if check is check_mean else variant.closed_flow
        check(variant.model, variant.p, 1e-10 if exact else 1e-6)


@pytest.mark.parametrize(("name", "label"), SETS)
def test_parameter_set_is_complete_in_range_and_sourced(name, label):
    model = load_device(name)
    values = model.sets[label]()
    check_parameter_set(model, values)
    assert values.name == label
    low, high = model.bounds(parameters_of(model, values))
    assert low <= values.initial_S <= high


def test_default_set_is_one_of_the_sets():
    for name in device_names():
        assert load_device(name).default_set in load_device(name).sets


def test_own_demo_values_say_so():
    for name, label in SETS:
        values = load_device(name).sets[label]()
        demo = label.startswith("demo_")
        sources = [v.source for v in values.values.values()] + [s.source for s in values.spreads.values()]
        assert all(source.startswith("our own invention") == demo for source in sources), label


def _broken(**functions):
    model = load_device("voltage_threshold")
    return replace(model, **functions), parameters_of(model, model.sets["demo_oxide"]())


GOOD = load_device("voltage_threshold")


def _ratchet(state, dose, p):
    return GOOD.advance(state, dose, p) if dose > 0 else state


BREAKAGES = {
    "wrong polarity": (check_rate, {"set_polarity": 1}),
    "leak in the dead zone": (check_rate, {"rate": lambda v, p: GOOD.rate(v, p) - 1e-30}),
    "rate that falls": (check_rate, {"rate": lambda v, p: GOOD.rate(v, p) / (1 + v**4)}),
    "wrong sign beyond 5 V": (check_rate, {"rate": lambda v, p: GOOD.rate(v, p) * (1 if abs(v) < 5 else -1)}),
    "state_of off by 1e-8": (check_state, {"state_of": lambda g, p: GOOD.state_of(g * (1 + 1e-8), p)}),
    "state_of does not clip": (
        check_state,
        {"state_of": lambda g, p: p.x_off * (g * p.R_off - 1) / (1 - p.R_off / p.R_on)},
    ),
    "not ohmic": (check_state, {"conductance": lambda x, v, p: GOOD.conductance(x, v, p) * (1 + 1e-6 * v * v)}),
    "dose the wrong way": (check_direction, {"advance": lambda x, s, p: GOOD.advance(x, -s, p)}),
    "beyond the bounds": (check_direction, {"advance": lambda x, s, p: x - s}),
    "an end that holds": (check_return, {"advance": _ratchet}),
    "no semigroup": (
        check_semigroup,
        {"advance": lambda x, s, p: GOOD.advance(x, s * (1 + 1e-3 * abs(s) / p.x_off), p)},
    ),
    "mean off by 1e-6": (check_mean, {"mean_conductance": lambda *a: GOOD.mean_conductance(*a) * (1 + 1e-6)}),
    "mean of the ends": (
        check_mean,
        {"mean_conductance": lambda x, y, s, v, p: (GOOD.conductance(x, v, p) + GOOD.conductance(y, v, p)) / 2},
    ),
    "net dose for a window that differs up and down": (
        check_mixed,
        {"advance_mixed": lambda x, up, down, p: GOOD.advance(x, up - down, p)},
    ),
}


@pytest.mark.parametrize("breakage", BREAKAGES)
def test_a_broken_model_is_caught(breakage):
    check, functions = BREAKAGES[breakage]
    model, p = _broken(**functions)
    check(GOOD, p, 1e-10)
    with pytest.raises(ContractError, match="device voltage_threshold: "):
        check(model, p, 1e-10)


def test_a_set_with_a_gap_is_caught():
    values = GOOD.sets["demo_oxide"]()
    with pytest.raises(ContractError, match="v_on"):
        check_parameter_set(GOOD, replace(values, values={k: v for k, v in values.values.items() if k != "v_on"}))


def test_check_device_runs_every_set():
    seen = []
    model = load_device("saturating_update")
    check_device(replace(model, sets={k: lambda k=k: seen.append(k) or model.sets[k]() for k in model.sets}))
    assert seen == list(model.sets)
