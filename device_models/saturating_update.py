"""Cell whose pulses move a fixed fraction of the distance left to the end of its range.

    G = G_min + (G_max - G_min) u,   du/ds = 1 - u for a positive dose s (SET),   du/ds = -u for a negative one (RESET)

so that n equal pulses give G_n = G_max - (G_max - G_0) (1 - e)^n with e = 1 - exp(-s). The dose s has no unit.

Voltage and width law, our assumption: the dose is linear in the width and goes with the sinh of the voltage,

    ds/dt = set_rate sinh(v / set_scale) / sinh(set_voltage / set_scale)                       for v > 0
    ds/dt = -reset_rate sinh(-v / reset_scale) / sinh(reset_voltage / reset_scale)             for v < 0

so a pulse of the nominal voltage and of width t moves the fraction e = 1 - exp(-rate t). There is no dead zone: this is
also the cell with exponential kinetics, whose half-selected neighbours move, if exponentially less.

Source: Fusi & Abbott, Nature Neurosci. 10:485 (2007) and Frascaroli et al., Sci. Rep. 8:7178 (2018) for the update;
Guan, Yu, Wong, IEEE Electron Device Lett. 33:1405 (2012) for sinh, the law of field-driven hopping (all from memory).
Range: pulses short enough that heating does not build up from one to the next.
"""

from __future__ import annotations

from math import exp
from typing import NamedTuple

from device_models.compiled import compiled
from device_models.contract import DeviceModel, Quantity
from device_models.parameters.demo_analogue import demo_analogue
from device_models.parameters.fusi2007 import fusi2007
from device_models.windows import DISTANCE_LEFT, flow, mean_state, mixed_flow


class Parameters(NamedTuple):
    """Values of one cell, SI units; see QUANTITIES."""

    G_min: float
    G_max: float
    set_rate: float
    reset_rate: float
    set_voltage: float
    reset_voltage: float
    set_scale: float
    reset_scale: float


QUANTITIES = {
    "G_min": Quantity("S", 1e-15, 1e3, "lowest conductance"),
    "G_max": Quantity("S", 1e-15, 1e3, "highest conductance"),
    "set_rate": Quantity("1/s", 1e-12, 1e15, "SET dose per second at set_voltage, -ln(1 - fraction moved) / width"),
    "reset_rate": Quantity("1/s", 1e-12, 1e15, "RESET dose per second at reset_voltage"),
    "set_voltage": Quantity("V", 1e-3, 100.0, "voltage of the nominal SET pulse (a magnitude)"),
    "reset_voltage": Quantity("V", 1e-3, 100.0, "voltage of the nominal RESET pulse (a magnitude)"),
    "set_scale": Quantity("V", 1e-3, 100.0, "voltage over which the SET rate grows e-fold"),
    "reset_scale": Quantity("V", 1e-3, 100.0, "voltage over which the RESET rate grows e-fold"),
}


@compiled
def _sinh_ratio(voltage: float, nominal: float, scale: float) -> float:
    # sinh(voltage / scale) / sinh(nominal / scale), both positive, by two exponentials: in less than half the time of
    # two sinh, without overflow; e^600 is as good as infinite but still a number.
    grown = exp(min((voltage - nominal) / scale, 600.0))
    tail = exp(-nominal / scale)
    if tail < 1e-100:
        return grown * (1.0 - exp(-2.0 * voltage / scale))
    return max(grown - tail * tail / grown, 0.0) / (1.0 - tail * tail)


@compiled
def rate(voltage: float, p: Parameters) -> float:
    """Dose per second [1/s] at a cell voltage [V]."""
    if voltage > 0.0:
        return p.set_rate * _sinh_ratio(voltage, p.set_voltage, p.set_scale)
    if voltage < 0.0:
        return -p.reset_rate * _sinh_ratio(-voltage, p.reset_voltage, p.reset_scale)
    return 0.0


@compiled
def advance(state: float, dose: float, p: Parameters) -> float:
    """State u (0..1) after a dose."""
    return flow(DISTANCE_LEFT, 1.0, state, dose)


@compiled
def advance_mixed(state: float, up: float, down: float, p: Parameters) -> float:
    """State u after SET doses `up` and RESET doses `down` (both >= 0), finely interleaved."""
    return mixed_flow(DISTANCE_LEFT, 1.0, state, up, down)


@compiled
def conductance(state: float, voltage: float, p: Parameters) -> float:
    """Conductance [S] of state u; the same at every voltage."""
    return p.G_min + (p.G_max - p.G_min) * state


@compiled
def state_of(conductance: float, p: Parameters) -> float:
    """State u of a conductance [S], clipped to 0..1."""
    return min(max((conductance - p.G_min) / (p.G_max - p.G_min), 0.0), 1.0)


@compiled
def bounds(p: Parameters) -> tuple[float, float]:
    """Lowest and highest conductance [S]; both are approached, never passed."""
    return p.G_min, p.G_max


@compiled
def mean_conductance(before: float, after: float, dose: float, voltage: float, p: Parameters) -> float:
    """Time average of the conductance [S] over a pulse that takes u from `before` to `after` by a dose."""
    return p.G_min + (p.G_max - p.G_min) * mean_state(DISTANCE_LEFT, before, after, dose)


MODEL = DeviceModel(
    name="saturating_update",
    summary="each pulse moves a fixed fraction of the distance left; exponential in voltage, no dead zone",
    source="Fusi & Abbott, Nature Neurosci. 10:485 (2007); Frascaroli et al., Sci. Rep. 8:7178 (2018)",
    range="short pulses; the sinh voltage law and the linear width law are our assumption",
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
    sets={"demo_analogue": demo_analogue, "fusi2007": fusi2007},
    default_set="demo_analogue",
)
