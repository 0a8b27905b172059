"""How the resistance of a cell depends on its position u, from 0 (R_on) to 1 (R_off). All laws are ohmic.

    linear_resistance         R = R_on + (R_off - R_on) u
    exponential_resistance    R = R_on exp(lambda u), lambda = ln(R_off / R_on)
    linear_conductance        1/R = 1/R_on + (1/R_off - 1/R_on) u

Source of the first two: Kvatinsky, Ramadan, Friedman, Kolodny, IEEE Trans. Circuits Syst. II 62:786 (2015), the linear
and the exponential current-voltage relation (cited from memory). The third is the usual reading of analogue arrays,
whose conductance is what is programmed (common practice, no source).
"""

from __future__ import annotations

from math import exp, expm1, log, log1p

from device_models.compiled import compiled

CHOICES = ("linear_resistance", "exponential_resistance", "linear_conductance")
LINEAR_RESISTANCE, EXPONENTIAL_RESISTANCE, LINEAR_CONDUCTANCE = 0.0, 1.0, 2.0


@compiled
def conductance_at(law: float, u: float, R_on: float, R_off: float) -> float:
    """Conductance [S] at position u (0..1) under `law` (a code above); R_on, R_off [ohm]."""
    if law == LINEAR_CONDUCTANCE:
        on = 1.0 / R_on
        return on + (1.0 / R_off - on) * u
    if law == EXPONENTIAL_RESISTANCE:
        return exp(-log(R_off / R_on) * u) / R_on
    return 1.0 / (R_on + (R_off - R_on) * u)


@compiled
def position_of(law: float, conductance: float, R_on: float, R_off: float) -> float:
    """Position u with that conductance [S], not clipped."""
    if law == LINEAR_CONDUCTANCE:
        on = 1.0 / R_on
        return (conductance - on) / (1.0 / R_off - on)
    if law == EXPONENTIAL_RESISTANCE:
        return -log(conductance * R_on) / log(R_off / R_on)
    return (1.0 / conductance - R_on) / (R_off - R_on)


@compiled
def mean_over_even_travel(law: float, before: float, after: float, R_on: float, R_off: float) -> float:
    """Time average of the conductance [S] while u goes at constant speed from `before` to `after`.

    linear_resistance: ln(R1/R0) / (R1 - R0); exponential_resistance: (G1 - G0) / ln(G1/G0). Derived by integration.
    """
    start = conductance_at(law, before, R_on, R_off)
    if law == LINEAR_CONDUCTANCE or before == after:
        return 0.5 * (start + conductance_at(law, after, R_on, R_off))
    if law == EXPONENTIAL_RESISTANCE:
        growth = -log(R_off / R_on) * (after - before)
        return start * expm1(growth) / growth
    # The same rounded change appears in numerator and denominator, so small steps do not cancel.
    change = (R_off - R_on) * (after - before) * start
    return start * log1p(change) / change
