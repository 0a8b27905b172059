"""The contract of a device model: a few compiled scalar functions, a parameter record, and where its numbers come from.

A model is *separable* when its kinetics factor as dx/dt = r(V) w(x). Then a pulse of width t at voltage V is a *dose*
s = r(V) t, and the state after it follows from the state before and the dose alone. This is what lets the half-select
stress of thousands of pulses be settled in one step. The sign convention is the same for every model: a positive dose
raises the conductance (SET), whatever the sign of the voltage that causes it and whatever way the state variable runs.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass, field
from typing import Any, Literal

Law = Literal["normal", "lognormal"]


@dataclass(frozen=True)
class Quantity:
    """What one parameter means, and the range in which the model accepts it.

    unit: SI unit as text ("V", "1/s", "m", "ohm", "S"; "" for a pure number).
    low, high: inclusive range in that unit.
    meaning: one line for a person.
    choices: names of the integer codes 0, 1, ... where the parameter selects a variant of the law; empty otherwise.
    """

    unit: str
    low: float
    high: float
    meaning: str
    choices: tuple[str, ...] = ()


@dataclass(frozen=True)
class Sourced:
    """A parameter value [SI unit of its Quantity] and where it comes from."""

    value: float
    source: str


@dataclass(frozen=True)
class Spread:
    """A relative spread: the standard deviation over the mean (normal), or of exp(normal) over its mean (lognormal)."""

    law: Law
    relative: float
    source: str


@dataclass(frozen=True)
class NoiseLevels:
    """How noisy a read of this cell is, besides what physics gives for free (thermal, shot).

    flicker: K of the 1/f law; the variance of G over G squared is K ln(f_high / f_low).
    telegraph: relative step of a two-level fluctuation, (G_high - G_low) / G_mean.
    telegraph_low_dwell, telegraph_high_dwell: mean time [s] spent in the low and in the high level.
    transport: "ohmic" (a diffusive filament: thermal noise only) or "tunnel" (a gap: the coth crossover of shot noise).
    """

    flicker: float = 0.0
    telegraph: float = 0.0
    telegraph_low_dwell: float = 1e-3
    telegraph_high_dwell: float = 1e-3
    transport: Literal["ohmic", "tunnel"] = "ohmic"
    source: str = "no noise beyond thermal"


@dataclass(frozen=True)
class ParameterSet:
    """A named set of values for one model: published or of our own invention, each value with its source.

    values: parameter name -> value with source, one for every field of the model's Parameters record.
    spreads: device-to-device spread by parameter name. cycle: cycle-to-cycle spread of the dose of each pulse.
    truncation: device-to-device spreads are cut off at this many standard deviations on both sides.
    initial_S: conductance before programming [S]; initial_spread its relative spread.
    """

    name: str
    title: str
    values: Mapping[str, Sourced]
    spreads: Mapping[str, Spread] = field(default_factory=dict)
    cycle: Spread | None = None
    truncation: float = 3.0
    initial_S: float = 0.0
    initial_spread: float = 0.0
    noise: NoiseLevels = NoiseLevels()


@dataclass(frozen=True)
class DeviceModel:
    """A cell: equations, parameters and where they come from.

    Every function is compiled (see device_models.compiled) and works on scalars. `p` is a Parameters record.

    rate(voltage, p) -> dose per second, positive where it raises the conductance, exactly 0.0 in a dead zone; its size
        never falls as the size of the voltage grows.
    advance(state, dose, p) -> state after a dose; advance(advance(x, a), b) = advance(x, a + b) for a, b of one sign.
    conductance(state, voltage, p) -> current over voltage [S].
    state_of(conductance, p) -> the state of that small-signal conductance [S], clipped to the model's range.
    bounds(p) -> (lowest, highest) conductance the model can reach [S].
    mean_conductance(before, after, dose, voltage, p) -> time average of the conductance over a pulse [S], for energy;
        None: three-point (Simpson) rule on the trajectory.
    advance_mixed(state, up, down, p) -> state after doses of both signs, finely interleaved (up, down >= 0); None: small
        alternating steps.
    set_polarity: sign of the cell voltage that raises the conductance, +1 or -1.
    ohmic: conductance does not depend on voltage.
    """

    name: str
    summary: str
    source: str
    range: str
    set_polarity: int
    Parameters: type[Any]
    quantities: Mapping[str, Quantity]
    rate: Callable[..., Any]
    advance: Callable[..., Any]
    conductance: Callable[..., Any]
    state_of: Callable[..., Any]
    bounds: Callable[..., Any]
    mean_conductance: Callable[..., Any] | None = None
    advance_mixed: Callable[..., Any] | None = None
    ohmic: bool = True
    sets: Mapping[str, Callable[[], ParameterSet]] = field(default_factory=dict)
    default_set: str = ""
