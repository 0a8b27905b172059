"""From a validated scenario file to a job: everything resolved to SI numbers, and the rules that need the strategy."""

from __future__ import annotations

import math
from dataclasses import dataclass
from pathlib import Path

from benchmarks.errors import BadInputError, closest, listed, shown
from benchmarks.plugin_file import PluginFile, is_plugin_reference, load_plugin
from benchmarks.plugin_shape import check_strategy_shape
from benchmarks.quantities import text_of
from benchmarks.scenario_device import ResolvedDevice, resolve_device
from benchmarks.scenario_schema import PulseSection, ScenarioFile, SchemeFractions, VerifySection
from benchmarks.scenario_targets import ResolvedTargets, resolve_targets
from programming.bias import SCHEMES, BiasScheme
from programming.catalog import BUILT_IN, load_strategy, strategy_names
from programming.job import Job, PulseTrain, Targets, Verify
from programming.strategy_contract import CellStrategy

MOST_CELLS = 2**26
MOST_PULSE_KINDS = 16384  # of one direction; the ledgers hold a count per line and kind


@dataclass(frozen=True)
class ResolvedScenario:
    """A job and what it was made from."""

    job: Job
    device: ResolvedDevice
    targets: ResolvedTargets
    strategy_plugin: PluginFile[CellStrategy] | None


def resolve(file: ScenarioFile, folder: Path, allow_code: bool) -> ResolvedScenario:
    """The job of a scenario whose relative paths start in `folder`. Raises BadInputError with section and key."""
    if file.array.rows * file.array.columns > MOST_CELLS:
        got = f"got {file.array.rows} x {file.array.columns}"
        raise BadInputError(f"[array] rows: times columns must not exceed {MOST_CELLS}, {got}")
    strategy, strategy_plugin = _find_strategy(file.programming.strategy, folder, allow_code)
    device = resolve_device(file.device, folder, allow_code)
    programming = file.programming
    trains = {name: _train(getattr(programming, name), name, strategy, programming.resolution) for name in _DIRECTIONS}
    targets = resolve_targets(file.targets, file.array, folder, device.range_S)
    job = Job(
        seed=file.seed,
        rows=file.array.rows,
        columns=file.array.columns,
        temperature_K=file.array.temperature,
        cell=device.cell,
        faults=device.faults,
        verify=_verify(file.verify, targets.targets),
        targets=targets.targets,
        strategy=strategy,
        bias=_bias(programming.scheme),
        order=programming.order,
        set=trains["set"],
        reset=trains["reset"],
        tolerance_S=programming.tolerance[0],
        tolerance_fraction=programming.tolerance[1],
        max_pulses=programming.max_pulses,
        passes=programming.passes,
        resolution=programming.resolution,
        stuck_false_alarm=programming.stuck_false_alarm,
    )
    return ResolvedScenario(job, device, targets, strategy_plugin)


_DIRECTIONS = ("set", "reset")


def _find_strategy(name: str, folder: Path, allow_code: bool) -> tuple[CellStrategy, PluginFile[CellStrategy] | None]:
    if is_plugin_reference(name):
        try:
            plugin = load_plugin(name, folder, CellStrategy, allow_code)
            check_strategy_shape(plugin.object)
        except BadInputError as error:
            raise BadInputError(f"[programming] strategy: {error}") from error
        return plugin.object, plugin
    try:
        return load_strategy(name), None
    except KeyError:
        names = strategy_names()
        known = f"known are {listed(names)}"
        hint = closest(name, names)
        raise BadInputError(f"[programming] strategy: unknown strategy {shown(name)}{hint}; {known}") from None
    except Exception as error:  # whatever an installed package raises
        if name in BUILT_IN:
            raise
        raise BadInputError(
            f"[programming] strategy: {shown(name)} cannot be loaded: {type(error).__name__}: {error}"
        ) from error


def _bias(fractions: SchemeFractions) -> BiasScheme:
    for scheme in SCHEMES.values():
        if (scheme.word, scheme.bit) == (fractions.word, fractions.bit):
            return scheme
    return BiasScheme(f"word {fractions.word:g}, bit {fractions.bit:g}", fractions.word, fractions.bit)


def _train(section: PulseSection, name: str, strategy: CellStrategy, resolution: float) -> PulseTrain:
    """The pulses of one direction; keys left out mean a staircase of a single step."""
    stop = section.start if section.stop is None else section.stop
    width_stop = section.width if section.width_stop is None else section.width_stop
    place = f"[programming.{name}]"
    if section.start < 0.5 * resolution:
        got = text_of(section.start, "V")
        raise BadInputError(f"{place} start: must not round to 0 V at a resolution of {text_of(resolution, 'V')}, got {got}")
    if strategy.amplitudes == "staircase" and stop > section.start and section.step == 0.0:
        raise BadInputError(f"{place} step: is missing ({strategy.name} steps the amplitude from start to stop)")
    if strategy.widths == "staircase" and width_stop > section.width and section.width_step == 0.0:
        raise BadInputError(f"{place} width_step: is missing ({strategy.name} steps the width up to width_stop)")
    spacing = {"one": 0.0, "staircase": section.step, "any": resolution}[strategy.amplitudes]
    amplitudes = _steps(section.start, spacing, stop)
    widths = _steps(section.width, section.width_step if strategy.widths == "staircase" else 0.0, width_stop)
    if amplitudes * widths > MOST_PULSE_KINDS:
        key = "step" if amplitudes > widths else "width_step"
        got = f"this makes {amplitudes * widths:.3g}"
        raise BadInputError(f"{place} {key}: at most {MOST_PULSE_KINDS} different pulses are allowed, {got}")
    return PulseTrain(
        start=section.start,
        step=section.step,
        stop=stop,
        width=section.width,
        width_step=section.width_step,
        width_stop=width_stop,
        rise=section.rise,
        dead_time=section.dead_time,
    )


def _steps(start: float, step: float, stop: float) -> float:
    return 1.0 if step <= 0.0 else math.floor((stop - start) / step) + 2.0


def _verify(section: VerifySection, targets: Targets) -> Verify:
    if section.range is not None and section.range < targets.high_S:
        high, got = text_of(targets.high_S, "S"), text_of(section.range, "S")
        raise BadInputError(f"[verify] range: must cover the highest target ({high}), got {got}")
    return Verify(
        voltage_V=section.voltage,
        integration_s=section.integration,
        reads=section.reads,
        bits=section.bits,
        range_S=section.range or 0.0,
        gain_error=section.gain_error,
        gain_spread=section.gain_spread,
        thermal=section.thermal,
        shot=section.shot,
        flicker=section.flicker,
        telegraph=section.telegraph,
        flicker_low_Hz=section.flicker_low,
    )
