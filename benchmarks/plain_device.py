"""A device model evaluated a few times, as plain Python: no waiting for the compiler just to look at a threshold."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from types import FunctionType
from typing import Any

from device_models.contract import DeviceModel

Function = Callable[..., Any]


def plain(function: Function) -> Function:
    """The Python function behind a compiled one, calling the Python functions behind those it calls in turn."""
    return _plain(function, {})


def _plain(function: Function, done: dict[Function, Function]) -> Function:
    python = getattr(function, "py_func", None)
    if not isinstance(python, FunctionType):
        return function
    if function not in done:
        names = dict(python.__globals__)
        copy = FunctionType(python.__code__, names, python.__name__, python.__defaults__, python.__closure__)
        done[function] = copy  # before looking at what it calls: it may call itself
        for name in python.__code__.co_names:
            if hasattr(names.get(name), "py_func"):
                names[name] = _plain(names[name], done)
    return done[function]


class PlainDevice:
    """The functions of a model for a single cell; see DeviceModel for what they take and give."""

    def __init__(self, model: DeviceModel) -> None:
        """Nothing is evaluated yet."""
        self._model = model
        self._plain: dict[str, Function] = {}

    def parameters(self, values: Mapping[str, float]) -> Any:
        """The model's parameter record from values by name."""
        return self._model.Parameters(**{name: float(value) for name, value in values.items()})

    def rate(self, voltage: float, p: Any) -> float:
        """Dose per second at a cell voltage [V]."""
        return float(self._call("rate", voltage, p))

    def bounds(self, p: Any) -> tuple[float, float]:
        """Lowest and highest conductance [S]."""
        low, high = self._call("bounds", p)
        return float(low), float(high)

    def after_dose(self, conductance: float, dose: float, p: Any) -> float:
        """Small-signal conductance [S] that a cell of some conductance [S] has after a dose."""
        state = self._call("advance", self._call("state_of", conductance, p), dose, p)
        return float(self._call("conductance", state, 0.0, p))

    def _call(self, name: str, *arguments: Any) -> Any:
        compiled = getattr(self._model, name)
        if name not in self._plain:
            self._plain[name] = plain(compiled)
        try:
            return self._plain[name](*arguments)
        except (ArithmeticError, ValueError):
            # where Python raises (1 / 0, exp(1000), log(0)), the compiled function goes on with infinity or NaN
            return compiled(*arguments)
