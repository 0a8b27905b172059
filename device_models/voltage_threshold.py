"""Cell with voltage thresholds: nothing moves between v_on and v_off, a power law outside.

    dx/dt = k_off (v/v_off - 1)^alpha_off f_off(x)   for v > v_off > 0
    dx/dt = k_on  (v/v_on  - 1)^alpha_on  f_on(x)    for v < v_on < 0   (k_on < 0)
    dx/dt = 0                                        between, exactly

The state x [m] runs from x_on (resistance R_on) to x_off (R_off): a positive voltage raises the resistance, so SET is
the negative polarity. A dose is a length [m]: the way x would go without a window, positive towards x_on. The windows
f_off, f_on are those of device_models.windows on u = (x - x_on) / (x_off - x_on), rising for v > 0.

Source: Kvatinsky, Ramadan, Friedman, Kolodny, "VTEAM", IEEE Trans. Circuits Syst. II 62:786 (2015),
doi 10.1109/TCSII.2015.2433536, the voltage form of the threshold-adaptive model (equations cited from memory).
Range: constant voltage during a pulse; |v| up to a few thresholds, where the power law was fitted.
"""

from __future__ import annotations

from math import ceil, log, pow
from typing import NamedTuple

from device_models import resistance_laws, windows
from device_models.compiled import compiled
from device_models.contract import DeviceModel, Quantity
from device_models.parameters.demo_oxide import demo_oxide
from device_models.parameters.kvatinsky2015 import kvatinsky2015
from device_models.parameters.talati2016 import talati2016
from device_models.resistance_laws import (
    LINEAR_CONDUCTANCE,
    LINEAR_RESISTANCE,
    conductance_at,
    mean_over_even_travel,
    position_of,
)
from device_models.windows import DISTANCE_LEFT, NONE, closed_form, flow, inside, mean_state, mixed_flow


class Parameters(NamedTuple):
    """Values of one cell, SI units, published symbols; see QUANTITIES."""

    R_on: float
    R_off: float
    x_on: float
    x_off: float
    v_on: float
    v_off: float
    k_on: float
    k_off: float
    alpha_on: float
    alpha_off: float
    law: float
    window: float
    window_exponent: float


QUANTITIES = {
    "R_on": Quantity("ohm", 1e-3, 1e12, "resistance at x_on, the lowest"),
    "R_off": Quantity("ohm", 1e-3, 1e15, "resistance at x_off, the highest"),
    "x_on": Quantity("m", 0.0, 1e-6, "state of lowest resistance"),
    "x_off": Quantity("m", 1e-12, 1e-6, "state of highest resistance"),
    "v_on": Quantity("V", -100.0, -1e-6, "SET threshold (negative)"),
    "v_off": Quantity("V", 1e-6, 100.0, "RESET threshold (positive)"),
    "k_on": Quantity("m/s", -1e12, -1e-30, "speed of SET at twice its threshold (negative)"),
    "k_off": Quantity("m/s", 1e-30, 1e12, "speed of RESET at twice its threshold"),
    "alpha_on": Quantity("", 0.1, 50.0, "exponent of the SET kinetics"),
    "alpha_off": Quantity("", 0.1, 50.0, "exponent of the RESET kinetics"),
    "law": Quantity("", 0.0, 2.0, "how the resistance depends on x", resistance_laws.CHOICES),
    "window": Quantity("", 0.0, 4.0, "how the speed falls off towards the ends", windows.CHOICES),
    "window_exponent": Quantity("", 0.5, 50.0, "exponent p of the window (unused by none and distance_left)"),
}


@compiled
def _power(base: float, exponent: float) -> float:
    # The usual exponents as products: a tenth of the cost of pow, in the hottest place of the whole bench.
    if exponent == 3.0:
        return base * base * base
    if exponent == 1.0:
        return base
    return pow(base, exponent)


@compiled
def rate(voltage: float, p: Parameters) -> float:
    """Dose per second [m/s] at a cell voltage [V]; positive (SET) below v_on, negative (RESET) above v_off."""
    if voltage > p.v_off:
        return -p.k_off * _power(voltage / p.v_off - 1.0, p.alpha_off)
    if voltage < p.v_on:
        return -p.k_on * _power(voltage / p.v_on - 1.0, p.alpha_on)
    return 0.0


@compiled
def _position(state: float, p: Parameters) -> float:
    return (state - p.x_on) / (p.x_off - p.x_on)


@compiled
def advance(state: float, dose: float, p: Parameters) -> float:
    """State x [m] after a dose [m]."""
    span = p.x_off - p.x_on
    return p.x_on + span * flow(p.window, p.window_exponent, _position(state, p), -dose / span)


@compiled
def advance_mixed(state: float, up: float, down: float, p: Parameters) -> float:
    """State x [m] after SET doses `up` and RESET doses `down` [m, both >= 0], finely interleaved."""
    span = p.x_off - p.x_on
    return p.x_on + span * mixed_flow(p.window, p.window_exponent, _position(state, p), down / span, up / span)


@compiled
def conductance(state: float, voltage: float, p: Parameters) -> float:
    """Conductance [S] of state x [m]; the same at every voltage."""
    return conductance_at(p.law, _position(state, p), p.R_on, p.R_off)


@compiled
def state_of(conductance: float, p: Parameters) -> float:
    """State x [m] of a conductance [S], clipped to x_on..x_off; a hair inside where the window's ends are absorbing."""
    return p.x_on + (p.x_off - p.x_on) * inside(p.window, position_of(p.law, conductance, p.R_on, p.R_off))


@compiled
def bounds(p: Parameters) -> tuple[float, float]:
    """Lowest and highest conductance [S]."""
    low = conductance_at(p.law, inside(p.window, 1.0), p.R_on, p.R_off)
    return low, conductance_at(p.law, inside(p.window, 0.0), p.R_on, p.R_off)


@compiled
def mean_conductance(before: float, after: float, dose: float, voltage: float, p: Parameters) -> float:
    """Time average of the conductance [S] over a pulse that takes x from `before` to `after` [m] by a dose [m].

    Closed forms (derived by integration): linear conductance under a window with a closed flow; any law without
    window; linear resistance under distance_left. Otherwise Simpson's rule on the trajectory.
    """
    travel = -dose / (p.x_off - p.x_on)
    start, end = _position(before, p), _position(after, p)
    if travel == 0.0:
        return conductance_at(p.law, start, p.R_on, p.R_off)
    if p.law == LINEAR_CONDUCTANCE and closed_form(p.window, p.window_exponent):
        return conductance_at(p.law, mean_state(p.window, start, end, travel), p.R_on, p.R_off)
    if p.window == NONE:
        moving = min(abs((end - start) / travel), 1.0)
        resting = conductance_at(p.law, end, p.R_on, p.R_off)
        return moving * mean_over_even_travel(p.law, start, end, p.R_on, p.R_off) + (1.0 - moving) * resting
    if p.window == DISTANCE_LEFT and p.law == LINEAR_RESISTANCE and abs(travel) > 0.01:
        # R relaxes exponentially towards R_goal; the mean of 1/R then has this closed form.
        goal = p.R_off if travel > 0.0 else p.R_on
        ratio = (p.R_on + (p.R_off - p.R_on) * end) / (p.R_on + (p.R_off - p.R_on) * start)
        return (1.0 + log(ratio) / abs(travel)) / goal
    return _mean_by_simpson(start, travel, p)


@compiled
def _mean_by_simpson(u: float, travel: float, p: Parameters) -> float:
    # Panels short against the scale of the window and against that of the conductance at its steep end.
    ratio = p.R_off / p.R_on
    steepness = 4.0 * ratio if p.law == LINEAR_RESISTANCE else 4.0 * log(ratio)
    panels = min(16 + ceil(abs(travel) * (8.0 * p.window_exponent + steepness)), 2000)
    step = 0.5 * travel / panels
    total = 0.0
    left = conductance_at(p.law, u, p.R_on, p.R_off)
    for _ in range(panels):
        u = flow(p.window, p.window_exponent, u, step)
        middle = conductance_at(p.law, u, p.R_on, p.R_off)
        u = flow(p.window, p.window_exponent, u, step)
        right = conductance_at(p.law, u, p.R_on, p.R_off)
        total += left + 4.0 * middle + right
        left = right
    return total / (6.0 * panels)


MODEL = DeviceModel(
    name="voltage_threshold",
    summary="dead zone between two voltage thresholds, power-law kinetics outside",
    source="Kvatinsky, Ramadan, Friedman, Kolodny, IEEE Trans. Circuits Syst. II 62:786 (2015)",
    range="constant voltage during a pulse, up to a few thresholds",
    set_polarity=-1,
    Parameters=Parameters,
    quantities=QUANTITIES,
    rate=rate,
    advance=advance,
    conductance=conductance,
    state_of=state_of,
    bounds=bounds,
    mean_conductance=mean_conductance,
    advance_mixed=advance_mixed,
    sets={"demo_oxide": demo_oxide, "kvatinsky2015": kvatinsky2015, "talati2016": talati2016},
    default_set="demo_oxide",
)
