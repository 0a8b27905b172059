"""What there is to choose from: device models, strategies, bias schemes, scenarios, each with a line about it."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

Entry = dict[str, Any]


def available(kind: str) -> list[Entry]:
    """Entries of "devices", "strategies", "schemes" or "scenarios", each with at least name and summary."""
    return {"devices": _devices, "strategies": _strategies, "schemes": _schemes, "scenarios": _scenarios}[kind]()


def _devices() -> list[Entry]:
    from device_models.catalog import device_names, load_device

    def describe(name: str) -> Entry:
        model = load_device(name)
        return {
            "summary": model.summary,
            "source": model.source,
            "range": model.range,
            "parameters": list(model.sets),
            "default_parameters": model.default_set,
        }

    return [_described(name, describe) for name in device_names()]


def _strategies() -> list[Entry]:
    from programming.catalog import load_strategy, strategy_names

    def describe(name: str) -> Entry:
        strategy = load_strategy(name)
        return {"summary": strategy.summary, "source": strategy.source, "knowledge": strategy.knowledge}

    return [_described(name, describe) for name in strategy_names()]


def _described(name: str, describe: Callable[[str], Entry]) -> Entry:
    """An entry; what an installed package adds may be broken, and is then listed as such."""
    try:
        return {"name": name, **describe(name)}
    except Exception as error:  # whatever the package raises
        return {"name": name, "summary": f"cannot be loaded: {type(error).__name__}: {error}"}


def _schemes() -> list[Entry]:
    from programming.bias import SCHEMES

    def summary(word: float, bit: float) -> str:
        return f"unselected word lines at {word:.3g} V, unselected bit lines at {bit:.3g} V, for 1 V on the selected cell"

    listed = [
        {"name": name, "summary": summary(scheme.word, scheme.bit), "word": scheme.word, "bit": scheme.bit}
        for name, scheme in SCHEMES.items()
    ]
    own = "any other point: fractions of the selected voltage on the unselected word and bit lines"
    return [*listed, {"name": "{word = ..., bit = ...}", "summary": own}]


def _scenarios() -> list[Entry]:
    from benchmarks.shipped_scenarios import scenario_files, scenario_title

    return [{"name": name, "summary": scenario_title(path), "path": str(path)} for name, path in scenario_files().items()]
