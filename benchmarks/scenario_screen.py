"""`pulsewright check`: a resolved scenario as JSON data, and on the terminal."""

from __future__ import annotations

from collections.abc import Mapping
from typing import TYPE_CHECKING, Any

from benchmarks.quantities import KINDS, text_of

if TYPE_CHECKING:
    from rich.console import Console

    from benchmarks.scenario import Scenario

SCHEMA = "pulsewright.scenario/1"


def checked_object(scenario: Scenario) -> dict[str, Any]:
    """The resolved scenario, each device value with its source, units in the key names."""
    document = dict(scenario.document)
    device = dict(document["device"])
    values = device["values"]
    device["values"] = {name: {**values[name], "source": scenario.sources[name]} for name in values}
    device["sources"] = {name: source for name, source in scenario.sources.items() if name not in values}
    return {
        "schema": SCHEMA,
        "title": scenario.title,
        "scenario_digest": scenario.digest,
        **document,
        "device": device,
        "warnings": list(scenario.warnings),
    }


def print_scenario(scenario: Scenario, console: Console) -> None:
    """Print sections, keys, values in SI units, the source of each device value, and the warnings."""
    from rich.text import Text

    checked = checked_object(scenario)
    console.print(Text(scenario.title, style="bold"))
    console.print(Text(f"{scenario.path}, seed {checked['seed']}, {checked['dies']} dies", style="dim"))
    _print_device(checked["device"], console)
    for section in ("array", "targets", "programming", "verify"):
        _print_section(section, checked[section], console)
    console.print()
    for warning in checked["warnings"]:
        console.print(Text(f"Warning: {warning}", style="yellow"))
    console.print(Text(f"digest {scenario.digest}", style="dim"))


def _print_device(device: Mapping[str, Any], console: Console) -> None:
    from rich.text import Text

    named = f", parameters {device['parameters']}" if device["parameters"] else ""
    table = _table(f"device: {device['model']}{named}", ("", "value", "source"))
    for name, entry in device["values"].items():
        table.add_row(name, _shown_value(entry["value"], entry["unit"]), Text(entry["source"], style="dim"))
    initial, variation = device["initial"], device["variation"]
    sources = device["sources"]
    first = f"{text_of(initial['conductance_S'], 'S')} ± {text_of(initial['spread'], '%')}"
    table.add_row("initial", first, Text(sources["initial"], style="dim"))
    for name, spread in variation["cells"].items():
        row = f"spread of {name}"
        table.add_row(row, _spread(spread), Text(sources[row], style="dim"))
    if variation["cycle"]:
        table.add_row("cycle to cycle", _spread(variation["cycle"]), Text(sources["cycle"], style="dim"))
    table.add_row("truncation", f"{variation['truncation']:g} sd", "")
    noise = device["noise"]
    table.add_row("1/f noise", f"K = {noise['flicker']:.3g}", Text(sources["noise"], style="dim"))
    table.add_row("telegraph noise", text_of(noise["telegraph"], "%"), "")
    faults = device["faults"]
    stuck = f"{text_of(faults['stuck_low'], '%')} low, {text_of(faults['stuck_high'], '%')} high"
    table.add_row("stuck cells", stuck, faults["placement"])
    console.print(table)


def _print_section(name: str, section: Mapping[str, Any], console: Console) -> None:
    table = _table(name, ("", "value"))
    for key, value in _flattened({key: value for key, value in section.items() if key != "scheme"}):
        table.add_row(*_row(key, value))
    if "scheme" in section:
        table.add_row("scheme", section["scheme"]["name"])
        for which, cells in section["scheme"]["cells"].items():
            table.add_row(f"  {which.replace('_', ' ')}", f"{cells['count']} at {cells['fraction']:.4g} V per volt")
    console.print(table)


def _table(title: str, headings: tuple[str, ...]) -> Any:
    from rich.table import Table

    table = Table(
        box=None, padding=(0, 2, 0, 0), title=f"\n{title}", title_justify="left", title_style="bold", show_header=False
    )
    for number, heading in enumerate(headings):
        table.add_column(heading, no_wrap=number == 0)
    return table


def _flattened(section: Mapping[str, Any], prefix: str = "") -> list[tuple[str, Any]]:
    """Tables inside a section as dotted keys."""
    rows: list[tuple[str, Any]] = []
    for key, value in section.items():
        if isinstance(value, Mapping):
            rows += _flattened(value, f"{prefix}{key}.")
        else:
            rows.append((f"{prefix}{key}", value))
    return rows


def _row(key: str, value: Any) -> tuple[str, str]:
    """A key without its unit and its value with it."""
    name, _, unit = key.rpartition("_")
    if unit in KINDS and name:
        if isinstance(value, list):
            return name, ", ".join(text_of(item, unit) for item in value)
        return name, text_of(value, unit)
    return key, _shown_value(value, "")


def _shown_value(value: Any, unit: str) -> str:
    if isinstance(value, bool):
        return "on" if value else "off"
    return text_of(value, unit) if isinstance(value, float) else str(value)


def _spread(spread: Mapping[str, Any]) -> str:
    return f"{text_of(spread['spread'], '%')} {spread['law']}"
