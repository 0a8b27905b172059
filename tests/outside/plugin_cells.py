"""A user's own file: cells and a strategy that no built-in is, for the laws of incremental-step programming.

CELL is four laws behind one switch, so that one compiled loop serves all of them; the state x has the unit of the law.
`kind` 0, steps: each pulse above the dead zone adds speed * width to x, whatever its voltage.
`kind` 1, moving threshold: dx/dt = speed exp((|V| - shift - x) / v0), separable, with its integral in closed form;
RESET is its mirror image.
`kind` 2, redraw: a pulse forgets the state and leaves x = |speed * width|, so that the cycle noise is the whole spread.
The conductance is offset + scale x, times (|V| / reference)^nonlinearity: 0 is an ohmic cell.
"""

from math import copysign, exp, log1p
from typing import NamedTuple

from device_models.compiled import compiled
from device_models.contract import DeviceModel, ParameterSet, Quantity, Sourced
from programming.strategy_contract import ACCEPT, SET, CellStrategy

STEPS, MOVING_THRESHOLD, REDRAW = 0.0, 1.0, 2.0


class Parameters(NamedTuple):
    kind: float
    offset: float
    scale: float
    lowest: float
    highest: float
    dead_zone: float
    speed: float
    shift: float
    v0: float
    nonlinearity: float
    reference: float


QUANTITIES = {
    "kind": Quantity("", 0.0, 2.0, "law of the pulses", ("steps", "moving_threshold", "redraw")),
    "offset": Quantity("S", 1e-12, 1.0, "conductance at x = 0"),
    "scale": Quantity("S", 1e-18, 1.0, "conductance per unit of x"),
    "lowest": Quantity("", -1e9, 1e9, "lowest x"),
    "highest": Quantity("", -1e9, 1e9, "highest x"),
    "dead_zone": Quantity("V", 0.0, 100.0, "no pulse up to this size moves the cell"),
    "speed": Quantity("1/s", 1e-12, 1e15, "change of x per second"),
    "shift": Quantity("V", 0.0, 100.0, "moving threshold: voltage at which a cell at x = 0 moves at `speed`"),
    "v0": Quantity("V", 1e-3, 10.0, "moving threshold: voltage and x over which the speed changes e-fold"),
    "nonlinearity": Quantity("", 0.0, 50.0, "exponent by which the conductance grows with the voltage"),
    "reference": Quantity("V", 1e-3, 10.0, "voltage at which the conductance is offset + scale x"),
}


@compiled
def rate(voltage, p):
    size = abs(voltage)
    if size <= p.dead_zone:
        return 0.0
    speed = p.speed
    if p.kind == MOVING_THRESHOLD:
        speed *= exp((size - p.shift) / p.v0)
    return copysign(speed, voltage)


@compiled
def advance(state, dose, p):
    if dose == 0.0:
        return state
    if p.kind == REDRAW:
        state = abs(dose)
    elif p.kind == STEPS:
        state += dose
    elif dose > 0.0:
        state += p.v0 * log1p(dose / p.v0 * exp(-state / p.v0))
    else:
        state -= p.v0 * log1p(-dose / p.v0 * exp(state / p.v0))
    return min(max(state, p.lowest), p.highest)


@compiled
def conductance(state, voltage, p):
    at_reference = p.offset + p.scale * state
    if p.nonlinearity == 0.0:
        return at_reference
    return at_reference * (abs(voltage) / p.reference) ** p.nonlinearity


@compiled
def state_of(conductance, p):
    return min(max((conductance - p.offset) / p.scale, p.lowest), p.highest)


@compiled
def bounds(p):
    return p.offset + p.scale * p.lowest, p.offset + p.scale * p.highest


def _set(name, **values):
    return ParameterSet(name, name, {key: Sourced(float(value), "chosen for the check") for key, value in values.items()})


# Steps of one unit in 100 ns. The conductance is nearly all offset: 1/f read noise, which goes with the conductance, is
# then the same for every x (within 1e-6 per unit of x).
_STEPS = {
    "kind": STEPS,
    "offset": 1e-4,
    "scale": 1e-10,
    "lowest": -1e4,
    "highest": 1e4,
    "dead_zone": 0.75,
    "speed": 1e7,
    "shift": 0.0,
    "v0": 1.0,
    "nonlinearity": 0.0,
    "reference": 0.2,
}


def steps():
    return _set("steps", **_STEPS)


def moving_threshold():
    """A = 1 /s and v0 = 0.1 V, for pulses of 1 ms; the shift only keeps half-selected cells in the dead zone."""
    own = {"kind": MOVING_THRESHOLD, "offset": 1e-5, "scale": 1e-6, "lowest": -1.5, "highest": 4.0}
    return _set("moving_threshold", **_STEPS | own | {"speed": 1.0, "shift": 10.0, "v0": 0.1, "dead_zone": 8.0})


def redraw():
    """A pulse of 100 ns leaves x = 100 on average."""
    return _set("redraw", **_STEPS | {"kind": REDRAW, "speed": 1e9, "lowest": 0.0})


CELL = DeviceModel(
    name="law_bench",
    summary="additive steps, a moving threshold, or a redraw",
    source="Suh et al., IEEE J. Solid-State Circuits 30:1149 (1995) for the moving threshold (from memory)",
    range="for the check of the loop against closed forms",
    set_polarity=1,
    Parameters=Parameters,
    quantities=QUANTITIES,
    rate=rate,
    advance=advance,
    conductance=conductance,
    state_of=state_of,
    bounds=bounds,
    sets={"steps": steps, "moving_threshold": moving_threshold, "redraw": redraw},
    default_set="steps",
)


@compiled
def decide(target, tolerance, reading, pulses, memory, rules):
    """SET pulses of growing amplitude until the reading is at or above the target; with a tolerance, inside it."""
    done = reading >= target if tolerance == 0.0 else abs(reading - target) <= tolerance
    if done:
        return ACCEPT, 0.0, 0.0, 0.0
    return SET, rules.set_start + pulses * rules.set_step, rules.set_width, 0.0


ONE_SIDED = CellStrategy(
    name="one_sided",
    summary="SET until the reading is at or above the target (or, with a tolerance, inside it)",
    source="Suh et al., IEEE J. Solid-State Circuits 30:1149 (1995) (from memory)",
    knowledge="none",
    decide=decide,
    amplitudes="staircase",
)
