"""One pulse, no verify: the baseline, and the template of a strategy.

The amplitude is read off a straight line between the targets' range and the pulse train's range: the lowest target gets
`start`, the highest `stop`. Common practice, no source.
"""

from __future__ import annotations

from device_models.compiled import compiled
from programming.strategy_contract import ACCEPT, SET, CellStrategy


@compiled
def decide(target, tolerance, reading, pulses, memory, rules):
    """One SET pulse, its amplitude linear in the target; then done."""
    if pulses > 0:
        return ACCEPT, 0.0, 0.0, 0.0
    height = (target - rules.low) / (rules.high - rules.low) if rules.high > rules.low else 1.0
    return SET, rules.set_start + height * (rules.set_stop - rules.set_start), rules.set_width, 0.0


STRATEGY = CellStrategy(
    name="open_loop",
    summary="one SET pulse chosen from the target alone, never verified",
    source="common practice, no source",
    knowledge="the range of the targets",
    decide=decide,
    amplitudes="any",
    verifies=False,
)
