"""Our own invention: the exponential cell of "Sedge", a second test array of the imaginary Hollin project."""

from __future__ import annotations

from math import log, log1p

from device_models.contract import NoiseLevels, ParameterSet, Sourced, Spread

OWN = "our own invention (demo)"

_WIDTH = 100e-9
# 1/f noise of 0.3 % of the reading between 1 Hz and 5 MHz, the band of a 100 ns read.
_FLICKER = 0.003**2 / log(5e6)


def demo_analogue() -> ParameterSet:
    """Analogue cell without thresholds, 5 to 80 uS; nominal pulses of 1.2 V and 100 ns."""
    steep = f"{OWN}: 138 mV per decade, so that V/2 is 22000 times slower than V"
    return ParameterSet(
        name="demo_analogue",
        title="Demo exponential cell of the Sedge array: 5 to 80 uS, 1.2 V pulses of 100 ns move 4 % and 6 %",
        values={
            "G_min": Sourced(5e-6, f"{OWN}: a sixteenth of the highest conductance"),
            "G_max": Sourced(80e-6, f"{OWN}: the quantum of conductance, rounded"),
            "set_rate": Sourced(-log1p(-0.04) / _WIDTH, f"{OWN}: 100 ns at set_voltage move 4 % of the distance left"),
            "reset_rate": Sourced(-log1p(-0.06) / _WIDTH, f"{OWN}: 100 ns at reset_voltage move 6 %"),
            "set_voltage": Sourced(1.2, f"{OWN}: a usual write voltage"),
            "reset_voltage": Sourced(1.2, f"{OWN}: the same as for SET"),
            "set_scale": Sourced(0.06, steep),
            "reset_scale": Sourced(0.06, steep),
        },
        spreads={
            "set_rate": Spread("lognormal", 0.30, f"{OWN}: rates scatter by factors, not by differences"),
            "reset_rate": Spread("lognormal", 0.30, f"{OWN}: rates scatter by factors, not by differences"),
            "G_min": Spread("normal", 0.05, f"{OWN}: ends of the range differ a little from cell to cell"),
            "G_max": Spread("normal", 0.05, f"{OWN}: ends of the range differ a little from cell to cell"),
        },
        cycle=Spread("lognormal", 0.20, f"{OWN}: middle of the usual 10 to 30 %"),
        truncation=3.0,
        initial_S=10e-6,
        initial_spread=0.10,
        noise=NoiseLevels(flicker=_FLICKER, source=f"{OWN}: 1/f noise of 0.3 % between 1 Hz and 5 MHz"),
    )
