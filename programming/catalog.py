"""The cell strategies that ship, and those that installed packages add."""

from __future__ import annotations

from typing import cast

from device_models.named_plugins import NamedPlugins
from programming.strategy_contract import CellStrategy

# The one list of built-in strategies.
BUILT_IN = {
    "open_loop": "programming.strategies.open_loop:STRATEGY",
    "identical_pulses": "programming.strategies.identical_pulses:STRATEGY",
    "amplitude_staircase": "programming.strategies.amplitude_staircase:STRATEGY",
    "width_staircase": "programming.strategies.width_staircase:STRATEGY",
}
ENTRY_POINT_GROUP = "pulsewright.strategies"
_STRATEGIES = NamedPlugins(BUILT_IN, ENTRY_POINT_GROUP, CellStrategy)


def strategy_names() -> list[str]:
    """Names of all strategies: built-in ones first, then those of installed packages."""
    return _STRATEGIES.names()


def load_strategy(name: str) -> CellStrategy:
    """The strategy of that name. Raises KeyError if there is none, TypeError if an entry point is something else."""
    return cast(CellStrategy, _STRATEGIES.load(name))
