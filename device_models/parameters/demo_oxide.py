"""Our own invention: the oxide cell of "Marrow", the 64 x 64 passive test array of the imaginary Hollin project."""

from __future__ import annotations

from math import log

from device_models.contract import NoiseLevels, ParameterSet, Sourced, Spread
from device_models.resistance_laws import LINEAR_CONDUCTANCE
from device_models.windows import DISTANCE_LEFT

OWN = "our own invention (demo)"

# A pulse of 100 ns at 1.3 times the threshold moves a tenth of the distance left: k 0.3^3 100 ns / 3 nm = -ln 0.9.
_SPEED = 0.117
# 1/f noise of 0.5 % of the reading between 1 Hz and 5 MHz, the band of a 100 ns read.
_FLICKER = 0.005**2 / log(5e6)


def demo_oxide() -> ParameterSet:
    """Analogue oxide cell, 10 to 100 uS, thresholds of 1.05 V, for 100 ns pulses between 0.8 V and 1.6 V."""
    return ParameterSet(
        name="demo_oxide",
        title="Demo oxide cell of the Marrow array: 10 to 100 uS, thresholds 1.05 V, 100 ns pulses",
        values={
            "R_on": Sourced(10e3, f"{OWN}: 100 uS, near the quantum of conductance, where filaments are still graded"),
            "R_off": Sourced(100e3, f"{OWN}: 10 uS, a tenth of the highest conductance"),
            "x_on": Sourced(0.0, f"{OWN}: origin of the state"),
            "x_off": Sourced(3e-9, f"{OWN}: 3 nm, of the order of a filament gap"),
            "v_on": Sourced(-1.05, f"{OWN}: inside a staircase from 0.8 V to 1.6 V, half of 1.6 V below it"),
            "v_off": Sourced(1.05, f"{OWN}: the same as for SET, so that both directions are alike"),
            "k_on": Sourced(-_SPEED, f"{OWN}: 100 ns at 1.3 thresholds move a tenth of the distance left"),
            "k_off": Sourced(_SPEED, f"{OWN}: 100 ns at 1.3 thresholds move a tenth of the distance left"),
            "alpha_on": Sourced(3.0, f"{OWN}: a soft onset, so that steps of 20 mV count"),
            "alpha_off": Sourced(3.0, f"{OWN}: the same as for SET"),
            "law": Sourced(LINEAR_CONDUCTANCE, f"{OWN}: the conductance is what an analogue array stores"),
            "window": Sourced(DISTANCE_LEFT, f"{OWN}: pulses of one kind saturate"),
            "window_exponent": Sourced(1.0, f"{OWN}: unused by this window"),
        },
        spreads={
            "v_on": Spread("normal", 0.12, f"{OWN}: half of what passive arrays of a few thousand cells report"),
            "v_off": Spread("normal", 0.12, f"{OWN}: the same as for SET"),
            "k_on": Spread("lognormal", 0.20, f"{OWN}: rates scatter by factors, not by differences"),
            "k_off": Spread("lognormal", 0.20, f"{OWN}: rates scatter by factors, not by differences"),
            "R_on": Spread("normal", 0.05, f"{OWN}: ends of the range differ a little from cell to cell"),
            "R_off": Spread("normal", 0.05, f"{OWN}: ends of the range differ a little from cell to cell"),
        },
        cycle=Spread("lognormal", 0.20, f"{OWN}: middle of the usual 10 to 30 %"),
        truncation=3.0,
        initial_S=12e-6,
        initial_spread=0.10,
        noise=NoiseLevels(
            flicker=_FLICKER,
            telegraph=0.01,
            telegraph_low_dwell=1e-3,
            telegraph_high_dwell=1e-3,
            transport="ohmic",
            source=f"{OWN}: 1/f noise of 0.5 % between 1 Hz and 5 MHz, a two-level step of 1 %",
        ),
    )
