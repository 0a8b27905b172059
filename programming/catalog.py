"""The cell strategies that ship, and those that installed packages add."""

from __future__ import annotations

from importlib import import_module
from importlib.metadata import entry_points
from typing import cast

from programming.strategy_contract import CellStrategy

# The one list of built-in strategies: name in a scenario -> "module:attribute". Loaded when asked for.
BUILT_IN = {
    "open_loop": "programming.strategies.open_loop:STRATEGY",
    "identical_pulses": "programming.strategies.identical_pulses:STRATEGY",
    "amplitude_staircase": "programming.strategies.amplitude_staircase:STRATEGY",
    "width_staircase": "programming.strategies.width_staircase:STRATEGY",
}
ENTRY_POINT_GROUP = "pulsewright.strategies"


def strategy_names() -> list[str]:
    """Names of all strategies: built-in ones first, then those of installed packages."""
    return [*BUILT_IN, *sorted(point.name for point in entry_points(group=ENTRY_POINT_GROUP))]


def load_strategy(name: str) -> CellStrategy:
    """The strategy of that name. Raises KeyError if there is none, TypeError if an entry point is something else."""
    if name in BUILT_IN:
        module, attribute = BUILT_IN[name].split(":")
        return cast(CellStrategy, getattr(import_module(module), attribute))
    for point in entry_points(group=ENTRY_POINT_GROUP, name=name):
        strategy = point.load()
        if not isinstance(strategy, CellStrategy):
            raise TypeError(f"entry point {name!r} of {ENTRY_POINT_GROUP} is a {type(strategy).__name__}, not a CellStrategy")
        return strategy
    raise KeyError(name)
