"""Whether a user's own device or strategy has the shape its contract asks for, told in a line before it is compiled.

The physics of a device is not judged here: device_models.contract_checks does that.
"""

from __future__ import annotations

import inspect

from benchmarks.errors import BadInputError, listed
from device_models.contract import DeviceModel, Quantity
from programming.strategy_contract import CellStrategy

# function -> number of arguments, as in DeviceModel
_NEEDED = {"rate": 2, "advance": 3, "conductance": 3, "state_of": 2, "bounds": 1}
_OPTIONAL = {"mean_conductance": 5, "advance_mixed": 4}
_DECIDE_ARGUMENTS = 6
_SERIES = {"amplitudes": ("one", "staircase", "any"), "widths": ("one", "staircase")}


def check_device_shape(model: DeviceModel) -> None:
    """Raises BadInputError for a missing record or quantity, a wrong polarity, a function of the wrong shape."""
    fields = getattr(model.Parameters, "_fields", None)
    if not fields:
        raise BadInputError(f"{model.name}: Parameters must be a NamedTuple with at least one field")
    missing = [name for name in fields if not isinstance(model.quantities.get(name), Quantity)]
    if missing:
        raise BadInputError(f"{model.name}: quantities has no Quantity for {listed(missing)}")
    if model.set_polarity not in (1, -1):
        raise BadInputError(f"{model.name}: set_polarity must be 1 or -1, is {model.set_polarity!r}")
    for name, count in {**_NEEDED, **_OPTIONAL}.items():
        function = getattr(model, name)
        if function is not None or name in _NEEDED:
            _check_function(model.name, name, function, count)


def check_strategy_shape(strategy: CellStrategy) -> None:
    """Raises BadInputError for a `decide` of the wrong shape and for series of pulses that do not exist."""
    _check_function(strategy.name, "decide", strategy.decide, _DECIDE_ARGUMENTS)
    for name, known in _SERIES.items():
        if getattr(strategy, name) not in known:
            raise BadInputError(f"{strategy.name}: {name} must be one of {listed(known)}, is {getattr(strategy, name)!r}")


def _check_function(owner: str, name: str, function: object, count: int) -> None:
    python = getattr(function, "py_func", None)
    if python is None:
        raise BadInputError(f"{owner}: {name} must be a function decorated with @compiled")
    takes = len(inspect.signature(python).parameters)
    if takes != count:
        raise BadInputError(f"{owner}: {name} must take {count} arguments, takes {takes}")
