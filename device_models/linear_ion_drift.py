"""Cell with linear ion drift: a conductive region grows with the charge that has passed.

    M(x) = R_on x + R_off (1 - x),   dx/dt = k i f(x),   k = mobility R_on / thickness^2,   i = v / M(x)

The state x is the conductive fraction, 0..1; a positive voltage is SET. A dose is k times the flux [ohm]: under a
voltage v lasting t it is k v t, and x moves as dx/d(dose) = f(x) / M(x). Windows f: see device_models.windows. Under
the Joglekar and Prodromakis windows x = 0 and x = 1 are absorbing, so states are held a hair (windows.EDGE) inside.

Source: Strukov, Snider, Stewart, Williams, Nature 453:80 (2008), equations of the coupled variable resistors (cited
from memory); windows from the sources given in device_models.windows.
Range: no threshold and no field-driven speed-up, so that half-selected cells always move; a teaching model.
"""

from __future__ import annotations

from math import sqrt
from typing import NamedTuple

from device_models import windows
from device_models.compiled import compiled
from device_models.contract import DeviceModel, Quantity
from device_models.parameters.strukov2008 import strukov2008, strukov2008_joglekar
from device_models.windows import BIOLEK, DISTANCE_LEFT, EDGE, NONE, closed_form, flow, inside, mean_state, window

# Length of a Runge-Kutta step, relative to the shortest local scale of the trajectory.
FINENESS = 0.04


class Parameters(NamedTuple):
    """Values of one cell, SI units; see QUANTITIES."""

    R_on: float
    R_off: float
    mobility: float
    thickness: float
    window: float
    window_exponent: float


QUANTITIES = {
    "R_on": Quantity("ohm", 1e-3, 1e12, "resistance of the fully conductive cell"),
    "R_off": Quantity("ohm", 1e-3, 1e15, "resistance of the fully insulating cell"),
    "mobility": Quantity("m^2/(V s)", 1e-25, 1.0, "mobility of the ions"),
    "thickness": Quantity("m", 1e-10, 1e-6, "thickness of the layer"),
    "window": Quantity("", 0.0, 4.0, "how the speed falls off towards the ends", windows.CHOICES),
    "window_exponent": Quantity("", 0.5, 50.0, "exponent p of the window (unused by none and distance_left)"),
}


@compiled
def _resistance(x: float, p: Parameters) -> float:
    return p.R_off - (p.R_off - p.R_on) * x


@compiled
def rate(voltage: float, p: Parameters) -> float:
    """Dose per second [ohm/s] at a cell voltage [V]: k v."""
    return p.mobility * p.R_on / (p.thickness * p.thickness) * voltage


@compiled
def travel(x: float, dose: float, p: Parameters) -> tuple[float, float]:
    """State after a dose [ohm], and k times the charge that passed (no unit, the sign of the dose)."""
    x = inside(p.window, x)
    if p.window == NONE:
        return _travel_freely(x, dose, p)
    if closed_form(p.window, p.window_exponent):
        charge = _charge_of_dose(x, dose, p)
        return flow(p.window, p.window_exponent, x, charge), charge
    return travel_in_steps(x, dose, p, FINENESS)


@compiled
def _travel_freely(x: float, dose: float, p: Parameters) -> tuple[float, float]:
    # Square-root law M(phi)^2 = M(0)^2 - 2 k (R_off - R_on) phi until an end is reached, a constant resistance after.
    before = _resistance(x, p)
    square = before * before - 2.0 * (p.R_off - p.R_on) * dose
    limit = p.R_on if dose > 0.0 else p.R_off
    reached = square <= limit * limit if dose > 0.0 else square >= limit * limit
    if not reached:
        charge = 2.0 * dose / (before + sqrt(square))
        return min(max(x + charge, 0.0), 1.0), charge
    end = 1.0 if dose > 0.0 else 0.0
    moving_dose = 0.5 * (end - x) * (before + limit)
    return end, (end - x) + (dose - moving_dose) / limit


@compiled
def _charge_of_dose(x: float, dose: float, p: Parameters) -> float:
    # Solves charge * M(mean x on the way) = dose. The left side rises with slope M(x after), which is Newton's rule;
    # the bracket, from R_on <= M <= R_off, catches its overshoot where M changes a hundredfold on the way.
    size = abs(dose)
    sign = 1.0 if dose > 0.0 else -1.0
    low, high = size / p.R_off, size / p.R_on
    charge = size / _resistance(x, p)
    for _ in range(100):
        after = flow(p.window, p.window_exponent, x, sign * charge)
        mean = mean_state(p.window, x, after, sign * charge)
        miss = charge * _resistance(mean, p) - size
        if miss > 0.0:
            high = charge
        else:
            low = charge
        better = charge - miss / _resistance(after, p)
        if better < low or better > high:
            better = 0.5 * (low + high)
        done = abs(better - charge) <= 1e-12 * charge
        charge = better
        if done:
            break
    return sign * charge


@compiled
def _speed(x: float, rising: bool, p: Parameters) -> float:
    return window(p.window, p.window_exponent, x, rising) / _resistance(x, p)


@compiled
def travel_in_steps(x: float, dose: float, p: Parameters, fineness: float) -> tuple[float, float]:
    """As travel, by the fourth-order Runge-Kutta rule for any window; steps follow the local scale times `fineness`."""
    remaining = abs(dose)
    rising = dose > 0.0
    sign = 1.0 if rising else -1.0
    charge = 0.0
    while remaining > 0.0:
        resistance = _resistance(x, p)
        if (rising and x >= 1.0 - EDGE) or (not rising and x <= EDGE):
            charge += remaining / resistance
            break
        k1 = _speed(x, rising, p)
        step = min(fineness * resistance / (4.0 * p.window_exponent + (p.R_off - p.R_on) * k1), remaining)
        second = x + 0.5 * sign * step * k1
        k2 = _speed(second, rising, p)
        third = x + 0.5 * sign * step * k2
        k3 = _speed(third, rising, p)
        fourth = x + sign * step * k3
        k4 = _speed(fourth, rising, p)
        middle = 2.0 / _resistance(second, p) + 2.0 / _resistance(third, p)
        charge += step * (1.0 / resistance + middle + 1.0 / _resistance(fourth, p)) / 6.0
        x += sign * step * (k1 + 2.0 * k2 + 2.0 * k3 + k4) / 6.0
        remaining -= step
    return inside(p.window, x), sign * charge


@compiled
def advance(state: float, dose: float, p: Parameters) -> float:
    """State x after a dose [ohm]. Closed form without window; exact up to rounding for p = 1; else Runge-Kutta."""
    return travel(state, dose, p)[0]


@compiled
def advance_mixed(state: float, up: float, down: float, p: Parameters) -> float:
    """State x after SET doses `up` and RESET doses `down` [ohm, both >= 0], finely interleaved.

    A window that is the same in both directions sees the difference; the others by fourth-order Runge-Kutta.
    """
    symmetric = p.window != BIOLEK and p.window != DISTANCE_LEFT
    if symmetric or up == 0.0 or down == 0.0:
        return advance(state, up - down, p)
    x = state
    remaining = 1.0
    while remaining > 0.0:
        k1 = _balance(x, up, down, p)
        if abs(k1) < 1e-15:
            break
        resistance = _resistance(x, p)
        sharpness = 4.0 * p.window_exponent + (p.R_off - p.R_on) / resistance
        step = min(FINENESS * resistance / ((up + down) * sharpness), remaining)
        k2 = _balance(x + 0.5 * step * k1, up, down, p)
        k3 = _balance(x + 0.5 * step * k2, up, down, p)
        k4 = _balance(x + step * k3, up, down, p)
        x += step * (k1 + 2.0 * k2 + 2.0 * k3 + k4) / 6.0
        remaining -= step
    return min(max(x, 0.0), 1.0)


@compiled
def _balance(x: float, up: float, down: float, p: Parameters) -> float:
    return up * _speed(x, True, p) - down * _speed(x, False, p)


@compiled
def conductance(state: float, voltage: float, p: Parameters) -> float:
    """Conductance 1 / M(x) [S]; the same at every voltage."""
    return 1.0 / _resistance(state, p)


@compiled
def state_of(conductance: float, p: Parameters) -> float:
    """State x of a conductance [S], clipped to 0..1, and a hair (windows.EDGE) inside where the ends are absorbing."""
    return inside(p.window, (p.R_off - 1.0 / conductance) / (p.R_off - p.R_on))


@compiled
def bounds(p: Parameters) -> tuple[float, float]:
    """Lowest and highest conductance [S]."""
    return 1.0 / _resistance(inside(p.window, 0.0), p), 1.0 / _resistance(inside(p.window, 1.0), p)


@compiled
def mean_conductance(before: float, after: float, dose: float, voltage: float, p: Parameters) -> float:
    """Time average of the conductance [S] over a pulse of that dose [ohm]: charge over flux."""
    if dose == 0.0:
        return 1.0 / _resistance(before, p)
    return travel(before, dose, p)[1] / dose


MODEL = DeviceModel(
    name="linear_ion_drift",
    summary="conductive fraction grows with the charge passed; no threshold",
    source="Strukov, Snider, Stewart, Williams, Nature 453:80 (2008)",
    range="teaching model: no threshold, no field-driven speed-up; half-selected cells always move",
    set_polarity=1,
    Parameters=Parameters,
    quantities=QUANTITIES,
    rate=rate,
    advance=advance,
    conductance=conductance,
    state_of=state_of,
    bounds=bounds,
    mean_conductance=mean_conductance,
    advance_mixed=advance_mixed,
    sets={"strukov2008": strukov2008, "strukov2008_joglekar": strukov2008_joglekar},
    default_set="strukov2008",
)
