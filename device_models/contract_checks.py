"""What every device model must keep, built-in or a user's own: physical invariants, checked by evaluation.

Each check takes the model and one Parameters record and raises ContractError with a line that says what broke, where.
Conductances are compared relatively: siemens are tiny. `kinetics_tolerance` is what a model without closed form gets.
"""

from __future__ import annotations

from collections.abc import Callable
from itertools import pairwise
from math import isfinite
from typing import Any

import numpy as np

from device_models.contract import DeviceModel, ParameterSet

# Rounding of a state and of its conductance, in relative terms.
ROUNDING = 1e-13
Check = Callable[[DeviceModel, Any, float], None]


class ContractError(AssertionError):
    """A model breaks its contract."""


def _require(holds: bool, model: DeviceModel, rule: str, detail: str) -> None:
    if not holds:
        raise ContractError(f"device {model.name}: {rule}: {detail}")


def _close(one: float, other: float, tolerance: float) -> bool:
    return abs(one - other) <= tolerance * max(abs(one), abs(other))


def _levels(model: DeviceModel, p: Any) -> list[float]:
    """Conductances [S] across the range, its ends included."""
    low, high = model.bounds(p)
    return [low + (high - low) * part for part in (0.0, 0.02, 0.1, 0.35, 0.6, 0.9, 0.98, 1.0)]


def _states(model: DeviceModel, p: Any) -> list[float]:
    return [model.state_of(level, p) for level in _levels(model, p)]


def natural_dose(model: DeviceModel, p: Any) -> float:
    """The dose that moves a cell from the middle of its range by a tenth of the range, within a factor of two."""
    low, high = model.bounds(p)
    state = model.state_of(0.5 * (low + high), p)
    start = model.conductance(state, 0.1, p)
    dose = 1e-40
    while dose < 1e40:
        if abs(model.conductance(model.advance(state, dose, p), 0.1, p) - start) >= 0.1 * (high - low):
            return dose
        dose *= 2.0
    raise ContractError(f"device {model.name}: kinetics: no dose up to 1e40 moves a cell in the middle of its range")


def check_rate(model: DeviceModel, p: Any, kinetics_tolerance: float) -> None:
    """The dose rate: 0.0 at 0 V, SET only in the declared polarity, never smaller at a larger voltage."""
    _require(model.rate(0.0, p) == 0.0, model, "rate", f"{model.rate(0.0, p)!r} at 0 V, must be exactly 0")
    for sign in (1.0, -1.0):
        direction = sign * model.set_polarity
        voltages = sign * np.geomspace(1e-3, 10.0, 241)
        rates = [float(model.rate(float(voltage), p)) for voltage in voltages]
        for voltage, rate in zip(voltages, rates, strict=True):
            _require(isfinite(rate), model, "rate", f"{rate} at {voltage:.4g} V")
            _require(rate * direction >= 0.0, model, "polarity", f"rate {rate:.4g} at {voltage:.4g} V has the wrong sign")
        for (smaller, larger), voltage in zip(pairwise(rates), voltages[1:], strict=True):
            grows = abs(larger) >= abs(smaller) * (1.0 - ROUNDING)
            _require(
                grows,
                model,
                "rate",
                f"falls from {smaller:.4g} to {larger:.4g} as the voltage grows to {voltage:.4g} V",
            )
        _require(rates[-1] != 0.0, model, "rate", f"0 at {voltages[-1]:.4g} V: nothing ever moves in this direction")


def check_state(model: DeviceModel, p: Any, kinetics_tolerance: float) -> None:
    """state_of inverts conductance inside the range and clips outside; an ohmic cell has one conductance."""
    low, high = model.bounds(p)
    _require(0.0 < low < high and isfinite(high), model, "bounds", f"({low:.4g}, {high:.4g}) S must ascend from above 0")
    for level in _levels(model, p):
        back = model.conductance(model.state_of(level, p), 1e-3, p)
        _require(_close(back, level, 1e-9), model, "state_of", f"{level:.6g} S comes back as {back:.6g} S")
    for outside, end in ((0.5 * low, low), (2.0 * high, high)):
        clipped = model.conductance(model.state_of(outside, p), 1e-3, p)
        _require(_close(clipped, end, 1e-9), model, "state_of", f"{outside:.4g} S is not clipped to {end:.4g} S")
    if model.ohmic:
        for state in _states(model, p):
            at_low, at_high = model.conductance(state, 0.1, p), model.conductance(state, -1.0, p)
            _require(at_low == at_high, model, "ohmic", f"{at_low:.6g} S at 0.1 V but {at_high:.6g} S at -1 V")


def check_direction(model: DeviceModel, p: Any, kinetics_tolerance: float) -> None:
    """A positive dose never lowers the conductance, a negative one never raises it; both keep the bounds."""
    low, high = model.bounds(p)
    dose = natural_dose(model, p)
    for state in _states(model, p):
        before = model.conductance(state, 0.1, p)
        for size in (0.0, 1e-9, 1e-3, 0.3, 5.0, 1e3, 1e9):
            for sign in (1.0, -1.0):
                after = model.conductance(model.advance(state, sign * size * dose, p), 0.1, p)
                moved = sign * (after - before) >= -ROUNDING * before
                _require(moved, model, "direction", f"dose {sign * size * dose:.4g} takes {before:.6g} S to {after:.6g} S")
                kept = low * (1.0 - ROUNDING) <= after <= high * (1.0 + ROUNDING)
                _require(kept, model, "bounds", f"dose {sign * size * dose:.4g} reaches {after:.6g} S")
        unmoved = model.conductance(model.advance(state, 0.0, p), 0.1, p)
        _require(_close(unmoved, before, ROUNDING), model, "direction", f"dose 0 takes {before:.9g} S to {unmoved:.9g} S")


def check_return(model: DeviceModel, p: Any, kinetics_tolerance: float) -> None:
    """No end of the range holds a cell for ever."""
    low, high = model.bounds(p)
    dose = natural_dose(model, p)
    for level, sign in ((low, 1.0), (high, -1.0)):
        state = model.advance(model.state_of(level, p), -sign * 1e6 * dose, p)
        back = model.conductance(model.advance(state, sign * 1e6 * dose, p), 0.1, p)
        moved = abs(back - level) > 0.1 * (high - low)
        _require(moved, model, "return", f"a cell driven to {level:.4g} S never comes back (now {back:.4g} S)")


def check_semigroup(model: DeviceModel, p: Any, kinetics_tolerance: float) -> None:
    """Two doses of one sign do what their sum does."""
    dose = natural_dose(model, p)
    for state in _states(model, p):
        for first, second in ((0.2, 0.1), (1e-4, 1.0), (3.0, 2.0), (-0.2, -0.1), (-1.0, -1e-4), (-3.0, -2.0)):
            twice = model.advance(model.advance(state, first * dose, p), second * dose, p)
            once = model.advance(state, (first + second) * dose, p)
            one, two = model.conductance(once, 0.1, p), model.conductance(twice, 0.1, p)
            detail = f"doses {first * dose:.4g}, {second * dose:.4g}: {two:.12g} S in two, {one:.12g} S in one"
            _require(_close(one, two, kinetics_tolerance), model, "semigroup", detail)


def check_mean(model: DeviceModel, p: Any, kinetics_tolerance: float) -> None:
    """mean_conductance is the average over the dose, by adaptive quadrature; needs a model that gives it."""
    if model.mean_conductance is None:
        return
    from scipy.integrate import quad

    dose = natural_dose(model, p)
    for state in _states(model, p)[1:-1]:
        for part in (1e-6, 0.3, 4.0, -1e-6, -0.3, -4.0):
            end = part * dose
            after = model.advance(state, end, p)
            mean = model.mean_conductance(state, after, end, 0.1, p)

            def at(share: float, state: float = state, end: float = end) -> float:
                return float(model.conductance(model.advance(state, share * end, p), 0.1, p))

            expected = quad(at, 0.0, 1.0, epsabs=0.0, epsrel=1e-9, limit=200)[0]
            detail = f"{mean:.9g} S over dose {end:.4g} from state {state:.4g}, quadrature gives {expected:.9g} S"
            _require(_close(mean, expected, max(kinetics_tolerance, 1e-8)), model, "mean_conductance", detail)


def check_mixed(model: DeviceModel, p: Any, kinetics_tolerance: float) -> None:
    """advance_mixed is the limit of many small alternating doses; needs a model that gives it."""
    if model.advance_mixed is None:
        return
    dose = natural_dose(model, p)
    parts = 500
    for state in _states(model, p)[1:-1:2]:
        for up, down in ((1.0, 0.5), (0.3, 2.0), (0.7, 0.0), (0.0, 0.7)):
            expected = state
            for _ in range(parts):  # symmetric splitting: the error falls with the square of the parts
                expected = model.advance(expected, 0.5 * up * dose / parts, p)
                expected = model.advance(expected, -down * dose / parts, p)
                expected = model.advance(expected, 0.5 * up * dose / parts, p)
            mixed = model.conductance(model.advance_mixed(state, up * dose, down * dose, p), 0.1, p)
            limit = model.conductance(expected, 0.1, p)
            detail = f"doses +{up * dose:.4g}, -{down * dose:.4g}: {mixed:.9g} S, alternating {limit:.9g} S"
            _require(_close(mixed, limit, 1e-3), model, "advance_mixed", detail)


CHECKS: tuple[Check, ...] = (
    check_rate,
    check_state,
    check_direction,
    check_return,
    check_semigroup,
    check_mean,
    check_mixed,
)


def check_parameter_set(model: DeviceModel, values: ParameterSet) -> None:
    """A set names every parameter of its model and no other, in range, each with a source."""
    fields = set(model.Parameters._fields)
    for what, names in (("quantities", set(model.quantities)), (f"set {values.name}", set(values.values))):
        _require(names == fields, model, what, f"names {sorted(names ^ fields)} do not match the Parameters record")
    _require(set(values.spreads) <= fields, model, f"set {values.name}", "a spread of an unknown parameter")
    for name, sourced in values.values.items():
        quantity = model.quantities[name]
        inside = quantity.low <= sourced.value <= quantity.high
        detail = f"{name} = {sourced.value} is outside {quantity.low}..{quantity.high}"
        _require(inside, model, f"set {values.name}", detail)
        _require(bool(sourced.source.strip()), model, f"set {values.name}", f"{name} has no source")


def parameters_of(model: DeviceModel, values: ParameterSet) -> Any:
    """The Parameters record of a set."""
    return model.Parameters(**{name: float(sourced.value) for name, sourced in values.values.items()})


def check_device(model: DeviceModel, kinetics_tolerance: float = 1e-6) -> None:
    """Every check on every set of a model; raises ContractError at the first that fails."""
    for make in model.sets.values():
        values = make()
        check_parameter_set(model, values)
        for check in CHECKS:
            check(model, parameters_of(model, values), kinetics_tolerance)
