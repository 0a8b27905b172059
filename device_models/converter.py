"""The converter behind the sense amplifier: mid-rise, n bits over 0 to full scale.

Code floor(g / lsb), clipped to the ends; the value of a code is the middle of its step. Terms as in IEEE Std 1241
(cited from memory).
"""

from __future__ import annotations

from math import floor

from device_models.compiled import compiled


def lsb(full_scale: float, bits: int) -> float:
    """One step of a converter of `bits` bits, in the unit of its full scale."""
    return full_scale / (1 << bits)


@compiled
def convert(value: float, step: float, top_code: int) -> float:
    """What a converter of that step and top code reports for a value; the unit is that of the step."""
    code = floor(min(max(value / step, 0.0), float(top_code)))
    return (code + 0.5) * step
