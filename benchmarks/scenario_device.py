"""The [device] section resolved: the model, its parameters as numbers with their sources, spreads, noise and faults."""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass, replace
from pathlib import Path
from typing import Any

from benchmarks.errors import BadInputError, closest, listed, shown
from benchmarks.plain_device import PlainDevice
from benchmarks.plugin_file import PluginFile, blaming_user_code, is_plugin_reference, load_plugin
from benchmarks.plugin_shape import check_device_shape
from benchmarks.quantities import QuantityError, parse_quantity, text_of
from benchmarks.scenario_schema import DeviceSection, SpreadSection
from device_models.catalog import BUILT_IN, device_names, load_device
from device_models.contract import DeviceModel, NoiseLevels, ParameterSet, Quantity, Spread
from programming.cell_sample import spread_size
from programming.job import Cell, Faults, ParameterSpread

FROM_SCENARIO = "this scenario"
OF_MODEL_ALONE = "all from this scenario"


@dataclass(frozen=True)
class ResolvedDevice:
    """A cell ready for a job.

    parameter_set: name of the set the values start from, "" for none. sources: parameter (or "initial", "cycle",
    "noise", "spread of v_on") -> where its value comes from. range_S: what the nominal cell can reach [S]. plugin: the
    user's file.
    """

    cell: Cell
    faults: Faults
    parameter_set: str
    sources: Mapping[str, str]
    range_S: tuple[float, float]
    plugin: PluginFile[DeviceModel] | None


def resolve_device(section: DeviceSection, folder: Path, allow_code: bool) -> ResolvedDevice:
    """Raises BadInputError, with section and key, for whatever the model does not know or does not allow."""
    model, plugin = _find_model(section.model, folder, allow_code)
    with blaming_user_code([plugin.path] if plugin else []):
        return _resolve(section, model, plugin)


def _resolve(section: DeviceSection, model: DeviceModel, plugin: PluginFile[DeviceModel] | None) -> ResolvedDevice:
    chosen = _find_set(section, model)
    sources: dict[str, str] = {}
    values = _values(section.overrides, model, chosen, sources)
    truncation = section.variation.truncation
    cell = Cell(
        model=model,
        values=values,
        spreads=_spreads(section.variation.cells, model, chosen, sources),
        truncation=chosen.truncation if truncation is None else truncation,
        cycle=_cycle(section.variation.cycle, chosen, sources),
        initial_S=_or(section.initial.conductance, chosen.initial_S),
        initial_spread=_or(section.initial.spread, chosen.initial_spread),
        noise=_noise(section, chosen, sources),
    )
    sources["initial"] = FROM_SCENARIO if section.initial.model_fields_set else chosen.title
    _check_spreads(cell)
    low_S, high_S = _range(model, values)
    _check_initial(cell, low_S, high_S)
    faults = Faults(**section.faults.model_dump())
    return ResolvedDevice(cell, faults, chosen.name, sources, (low_S, high_S), plugin)


def _find_model(name: str, folder: Path, allow_code: bool) -> tuple[DeviceModel, PluginFile[DeviceModel] | None]:
    if is_plugin_reference(name):
        try:
            plugin = load_plugin(name, folder, DeviceModel, allow_code)
            check_device_shape(plugin.object)
        except BadInputError as error:
            raise BadInputError(f"[device] model: {error}") from error
        return plugin.object, plugin
    try:
        return load_device(name), None
    except KeyError:
        names = device_names()
        hint = closest(name, names)
        raise BadInputError(f"[device] model: unknown model {shown(name)}{hint}; known are {listed(names)}") from None
    except Exception as error:  # whatever an installed package raises
        if name in BUILT_IN:
            raise
        raise BadInputError(f"[device] model: {shown(name)} cannot be loaded: {type(error).__name__}: {error}") from error


def _find_set(section: DeviceSection, model: DeviceModel) -> ParameterSet:
    name = model.default_set if section.parameters is None else section.parameters
    if name == "" and section.parameters is None:
        if model.sets:
            raise BadInputError(f"[device] parameters: is missing; {model.name} has {listed(model.sets)}")
        return ParameterSet(name="", title=OF_MODEL_ALONE, values={})
    if name not in model.sets:
        known = f"{model.name} has {listed(model.sets)}" if model.sets else f"{model.name} has none"
        raise BadInputError(f"[device] parameters: unknown set {shown(name)}{closest(name, model.sets)}; {known}")
    return model.sets[name]()


def _values(
    overrides: Mapping[str, Any], model: DeviceModel, chosen: ParameterSet, sources: dict[str, str]
) -> dict[str, float]:
    """Every field of the model's record, from the set or the overrides."""
    fields: tuple[str, ...] = model.Parameters._fields
    for name in overrides:
        if name not in fields or name not in model.quantities:
            hint = closest(name, fields)
            known = f"{model.name} has {listed(fields)}"
            raise BadInputError(f"[device.overrides] {name}: no such parameter{hint}; {known}")
    values: dict[str, float] = {}
    for name in fields:
        if name in overrides:
            values[name] = _override(name, overrides[name], model.quantities[name])
            sources[name] = FROM_SCENARIO
        elif name in chosen.values:
            values[name] = float(chosen.values[name].value)
            sources[name] = chosen.values[name].source
        else:
            set_name = f"the set {shown(chosen.name)} gives no value" if chosen.name else "there is no parameter set"
            raise BadInputError(f"[device.overrides] {name}: is missing ({set_name})")
    return values


def _override(name: str, given: object, quantity: Quantity) -> float:
    place = f"[device.overrides] {name}"
    if quantity.choices:
        if not isinstance(given, str) or given not in quantity.choices:
            hint = closest(given, quantity.choices) if isinstance(given, str) else ""
            raise BadInputError(f"{place}: must be one of {listed(quantity.choices)}, got {shown(given)}{hint}")
        return float(quantity.choices.index(given))
    try:
        value = parse_quantity(given, quantity.unit)
    except QuantityError as error:
        raise BadInputError(f"{place}: {error}") from error
    if not quantity.low <= value <= quantity.high:
        allowed = f"{text_of(quantity.low, quantity.unit)} to {text_of(quantity.high, quantity.unit)}"
        raise BadInputError(f"{place}: must be {allowed}, got {shown(given)}")
    return value


def _spreads(
    given: Mapping[str, SpreadSection], model: DeviceModel, chosen: ParameterSet, sources: dict[str, str]
) -> dict[str, ParameterSpread]:
    """The set's spreads with the scenario's in their place; a spread of 0 is left out."""
    fields: tuple[str, ...] = model.Parameters._fields
    for name in given:
        if name not in fields:
            known = f"{model.name} has {listed(fields)}"
            raise BadInputError(f"[device.variation.cells] {name}: no such parameter{closest(name, fields)}; {known}")
        if name in model.quantities and model.quantities[name].choices:
            raise BadInputError(f"[device.variation.cells] {name}: selects a variant of the law and cannot vary")
    spreads: dict[str, ParameterSpread] = {}
    for name in fields:
        spread = _spread(given.get(name), chosen.spreads.get(name), "normal")
        if spread is not None and spread.relative > 0.0:
            spreads[name] = ParameterSpread(spread.law, spread.relative)
            sources[f"spread of {name}"] = spread.source
    return spreads


def _cycle(given: SpreadSection | None, chosen: ParameterSet, sources: dict[str, str]) -> ParameterSpread | None:
    spread = _spread(given, chosen.cycle, "lognormal")
    if spread is None or spread.relative == 0.0:
        return None
    sources["cycle"] = spread.source
    return ParameterSpread(spread.law, spread.relative)


def _spread(given: SpreadSection | None, of_set: Spread | None, usual_law: Any) -> Spread | None:
    if given is None:
        return of_set
    law = given.law or (of_set.law if of_set is not None else usual_law)
    return Spread(law, given.spread, FROM_SCENARIO)


def _noise(section: DeviceSection, chosen: ParameterSet, sources: dict[str, str]) -> NoiseLevels:
    changes = section.noise.model_dump(exclude_none=True)
    noise = replace(chosen.noise, **changes) if changes else chosen.noise
    sources["noise"] = f"{FROM_SCENARIO} ({', '.join(changes)}); {noise.source}" if changes else noise.source
    return noise


def _check_spreads(cell: Cell) -> None:
    """No cell of the spread may leave the range in which the model accepts a parameter."""
    for name, spread in cell.spreads.items():
        place = f"[device.variation.cells] {name}"
        reach = cell.truncation * spread.relative
        if spread.law == "normal" and reach >= 1.0:
            limit = f"{text_of(spread.relative, '%')} times truncation {cell.truncation:g}"
            raise BadInputError(f'{place}: {limit} reaches the opposite sign; use a smaller one or law = "lognormal"')
        quantity = cell.model.quantities[name]
        for side in (-1.0, 1.0):
            value = cell.values[name] * spread_factor(spread, side * cell.truncation)
            if not quantity.low <= value <= quantity.high:
                allowed = f"{text_of(quantity.low, quantity.unit)} to {text_of(quantity.high, quantity.unit)}"
                got = text_of(value, quantity.unit)
                raise BadInputError(f"{place}: the spread reaches {got}, the model takes {allowed}")
    if cell.initial_spread * cell.truncation >= 1.0:
        limit = f"{text_of(cell.initial_spread, '%')} times truncation {cell.truncation:g}"
        raise BadInputError(f"[device.initial] spread: {limit} reaches 0 S")


def spread_factor(spread: ParameterSpread, deviations: float) -> float:
    """What a parameter is multiplied by, in a cell so many standard deviations off the mean."""
    size = spread_size(spread)
    return 1.0 + size * deviations if spread.law == "normal" else math.exp(size * deviations - 0.5 * size * size)


def _range(model: DeviceModel, values: Mapping[str, float]) -> tuple[float, float]:
    device = PlainDevice(model)
    low, high = device.bounds(device.parameters(values))
    if not 0.0 <= low < high:
        got = f"{text_of(low, 'S')} to {text_of(high, 'S')}"
        raise BadInputError(f"[device.overrides]: these values give {model.name} an empty range of conductance, {got}")
    return low, high


def _check_initial(cell: Cell, low_S: float, high_S: float) -> None:
    slack = 1e-9 * high_S
    if cell.initial_S != 0.0 and not low_S - slack <= cell.initial_S <= high_S + slack:
        allowed = f"{text_of(low_S, 'S')} to {text_of(high_S, 'S')}"
        got = text_of(cell.initial_S, "S")
        raise BadInputError(f"[device.initial] conductance: must be inside the cell's range ({allowed}), got {got}")


def _or(given: float | None, of_set: float) -> float:
    return of_set if given is None else given
