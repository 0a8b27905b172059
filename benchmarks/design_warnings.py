"""What a designer would want to know before the run: stress above threshold, steps too fine, bands too narrow.

None of these is an error. Thresholds are not asked of the model by name: whether a cell moves at some voltage is seen
from its rate, for the nominal cell and for a sample of cells drawn from the spreads, so a user's own model is covered
too.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from functools import cached_property
from statistics import NormalDist
from typing import Any

import numpy as np

from benchmarks.plain_device import PlainDevice
from benchmarks.quantities import text_of
from benchmarks.scenario_device import spread_factor
from programming.job import Job
from programming.pulse_grid import amplitude_grid, width_grid
from programming.verify_noise import reading_deviation

SAMPLED_CELLS, SAMPLE_SEED = 2048, 1
# Common practice, no source: half-select stress may take a quarter of the verify band.
SHARE_OF_BAND = 0.25
DIRECTIONS = {"set": 1.0, "reset": -1.0}


def design_warnings(job: Job) -> tuple[str, ...]:
    """One line each, most important first."""
    cells = _Cells(job)
    return (
        *_half_select(job, cells),
        *_no_movement(job, cells),
        *_out_of_reach(job, cells),
        *_verify_moves(job, cells),
        *_steps(job),
        *_bands(job),
        *_cycle_noise(job),
    )


@dataclass(frozen=True)
class _Cells:
    """The nominal cell, the cells at the ends of each spread, and a sample of cells, evaluated as plain Python."""

    job: Job

    @cached_property
    def device(self) -> PlainDevice:
        return PlainDevice(self.job.cell.model)

    @cached_property
    def nominal(self) -> Any:
        return self.device.parameters(self.job.cell.values)

    @cached_property
    def extreme(self) -> list[Any]:
        """One parameter at a time at the end of its truncated spread."""
        cell = self.job.cell
        return [
            self.device.parameters({**cell.values, name: cell.values[name] * spread_factor(spread, deviations)})
            for name, spread in cell.spreads.items()
            for deviations in (-cell.truncation, cell.truncation)
        ]

    @cached_property
    def sample(self) -> list[Any]:
        cell = self.job.cell
        if not cell.spreads:
            return []
        uniform = np.random.default_rng(SAMPLE_SEED).uniform
        normal = NormalDist()
        low, high = normal.cdf(-cell.truncation), normal.cdf(cell.truncation)
        values = {name: np.full(SAMPLED_CELLS, cell.values[name]) for name in cell.values}
        for name, spread in cell.spreads.items():
            deviations = [normal.inv_cdf(share) for share in uniform(low, high, SAMPLED_CELLS)]
            values[name] *= [spread_factor(spread, deviation) for deviation in deviations]
        rows = np.column_stack(list(values.values())).tolist()
        return [self.device.parameters(dict(zip(values, row, strict=True))) for row in rows]

    def moves(self, voltage: float) -> bool:
        """Whether the nominal cell moves at this cell voltage [V]."""
        return self.device.rate(voltage, self.nominal) != 0.0

    def moving_share(self, voltage: float) -> float:
        """Share of the sampled cells that move at this cell voltage [V]."""
        moving = sum(self.device.rate(voltage, p) != 0.0 for p in self.sample)
        return moving / len(self.sample) if self.sample else float(self.moves(voltage))

    def some_move(self, voltage: float) -> bool:
        return any(self.device.rate(voltage, p) != 0.0 for p in [self.nominal, *self.extreme, *self.sample])

    def has_dead_zone(self, voltage: float) -> bool:
        """Whether the nominal cell ignores a thousandth of this voltage [V]."""
        return not self.moves(1e-3 * voltage)


def _pulse_voltage(job: Job, name: str) -> float:
    """Cell voltage [V], with its sign, of the largest pulse of a direction."""
    amplitudes, _spacing = amplitude_grid(getattr(job, name), job.strategy, job.resolution)
    return DIRECTIONS[name] * job.cell.model.set_polarity * float(amplitudes.max())


def _classes(job: Job) -> Iterator[tuple[str, float]]:
    """(which cells, fraction of the selected voltage across them), classes that see the same taken together."""
    fractions: dict[float, list[str]] = {}
    counts = job.bias.class_counts(job.rows, job.columns)
    for name in ("same_row", "same_column", "rest"):
        fraction = getattr(job.bias, name)
        if fraction != 0.0 and counts[name] > 0:
            fractions.setdefault(fraction, []).append(name.replace("_", " "))
    for fraction, names in fractions.items():
        yield " and ".join(names), fraction


def _half_select(job: Job, cells: _Cells) -> Iterator[str]:
    for name in DIRECTIONS:
        full = _pulse_voltage(job, name)
        for which, fraction in _classes(job):
            voltage = fraction * full
            pulse = f"a {name.upper()} pulse of {text_of(abs(full), 'V')} puts {text_of(voltage, 'V')} on the {which} cells"
            if not cells.has_dead_zone(voltage):
                yield from _creep(job, cells, name, voltage, pulse)
            elif cells.moves(voltage):
                yield f"half-select above the threshold of the nominal cell: {pulse}"
            elif cells.some_move(voltage):
                share = text_of(float(f"{cells.moving_share(voltage):.2g}"), "%")
                limit = f"spreads are cut off at {job.cell.truncation:g} sd"
                yield f"half-select above the threshold of the weakest cells ({share} of them move; {limit}): {pulse}"


def _creep(job: Job, cells: _Cells, name: str, voltage: float, pulse: str) -> Iterator[str]:
    """A cell without a threshold always moves: complain where one pulse per cell of its lines moves it too far."""
    times = {"same_row": job.columns - 1, "same_column": job.rows - 1, "rest": (job.rows - 1) * (job.columns - 1)}
    count = sum(times[key] for key in times if getattr(job.bias, key) * _pulse_voltage(job, name) == voltage)
    widths, _spacing = width_grid(getattr(job, name), job.strategy)
    middle = 0.5 * (job.targets.low_S + job.targets.high_S)
    dose = cells.device.rate(voltage, cells.nominal) * float(widths.max()) * count
    moved = abs(cells.device.after_dose(middle, dose, cells.nominal) - middle)
    if moved > SHARE_OF_BAND * _tolerance(job, middle):
        consequence = f"{count} of them, one per cell, move the nominal cell by {text_of(moved, 'S')}"
        yield f"half-select disturbs a cell without a threshold: {pulse}; {consequence}"


def _no_movement(job: Job, cells: _Cells) -> Iterator[str]:
    """Pulses too weak for the nominal cell, for some cells, or for the way from the lowest to the highest target."""
    for name, sign in DIRECTIONS.items():
        train = getattr(job, name)
        voltage = _pulse_voltage(job, name)
        pulse = f"the largest {name.upper()} pulse ({text_of(abs(voltage), 'V')})"
        rate = cells.device.rate(voltage, cells.nominal)
        if rate == 0.0:
            yield f"{pulse} is below the threshold of the nominal cell"
            continue
        share = 1.0 - cells.moving_share(voltage)
        if share > 0.0:
            yield f"{pulse} is below the threshold of about {text_of(float(f'{share:.2g}'), '%')} of the cells"
        widths, _spacing = width_grid(train, job.strategy)
        start, goal = (job.targets.low_S, job.targets.high_S)[:: int(sign)]
        reached = cells.device.after_dose(start, rate * float(widths.max()) * job.max_pulses, cells.nominal)
        if sign * (goal - reached) > _tolerance(job, goal):
            way = f"from {text_of(start, 'S')} to {text_of(goal, 'S')}"
            yield f"max_pulses = {job.max_pulses} of {pulse} are too few to bring the nominal cell {way}"


def _out_of_reach(job: Job, cells: _Cells) -> Iterator[str]:
    """Cells of the spread whose own range ends short of the lowest or the highest target."""
    ranges = [cells.device.bounds(p) for p in cells.sample]
    for which, target, side in (("lowest", job.targets.low_S, 0), ("highest", job.targets.high_S, 1)):
        band = _tolerance(job, target)
        short = sum(ends[0] > target + band if side == 0 else ends[1] < target - band for ends in ranges)
        if short:
            share = text_of(float(f"{short / len(ranges):.2g}"), "%")
            yield f"the {which} target ({text_of(target, 'S')}) is out of reach for about {share} of the cells"


def _verify_moves(job: Job, cells: _Cells) -> Iterator[str]:
    voltage = job.verify.voltage_V
    text = text_of(voltage, "V")
    if cells.has_dead_zone(voltage):
        if cells.some_move(voltage):
            share = text_of(float(f"{cells.moving_share(voltage):.2g}"), "%")
            yield f"the verify voltage ({text}) moves {share} of the cells; the result leaves that out"
        return
    middle = 0.5 * (job.targets.low_S + job.targets.high_S)
    dose = cells.device.rate(voltage, cells.nominal) * job.verify.integration_s * job.verify.reads * job.max_pulses
    moved = abs(cells.device.after_dose(middle, dose, cells.nominal) - middle)
    if moved > SHARE_OF_BAND * _tolerance(job, middle):
        yield (
            f"max_pulses = {job.max_pulses} verify reads at {text} move the nominal cell by {text_of(moved, 'S')}; "
            "the result leaves that out"
        )


def _steps(job: Job) -> Iterator[str]:
    resolution = text_of(job.resolution, "V")
    for name in DIRECTIONS:
        train = getattr(job, name)
        if 0.0 < train.step < job.resolution * (1.0 - 1e-9) and job.strategy.amplitudes == "staircase":
            step = text_of(train.step, "V")
            yield f"[programming] resolution ({resolution}) is coarser than [programming.{name}] step ({step})"
        if _single_step(job, name):
            yield f"[programming.{name}]: the staircase of {job.strategy.name} has a single step"
        unused = [key for key in ("step", "stop") if _unused_amplitude(job, name, key)]
        unused += [key for key in ("width_step", "width_stop") if _unused_width(job, name, key)]
        if unused:
            yield f"[programming.{name}] {' and '.join(unused)}: no effect with strategy {job.strategy.name}"


def _single_step(job: Job, name: str) -> bool:
    train = getattr(job, name)
    flat = train.stop <= train.start if job.strategy.amplitudes == "staircase" else False
    return flat or (job.strategy.widths == "staircase" and train.width_stop <= train.width)


def _unused_amplitude(job: Job, name: str, key: str) -> bool:
    train = getattr(job, name)
    given = train.step > 0.0 if key == "step" else train.stop > train.start
    return bool(job.strategy.amplitudes == "one" and given)


def _unused_width(job: Job, name: str, key: str) -> bool:
    train = getattr(job, name)
    given = train.width_step > 0.0 if key == "width_step" else train.width_stop > train.width
    return bool(job.strategy.widths == "one" and given)


def _bands(job: Job) -> Iterator[str]:
    if not job.strategy.verifies:
        return
    for target in (job.targets.low_S, job.targets.high_S):
        noise, band = reading_deviation(job, target), _tolerance(job, target)
        if band < noise:
            at, half, sd = text_of(target, "S"), text_of(band, "S"), text_of(noise, "S")
            yield f"the band (half width {half} at {at}) is narrower than the noise of one verify (sd {sd})"
            break
    if job.verify.bits:
        step, band = job.verify.range_S / 2**job.verify.bits, _tolerance(job, job.targets.low_S)
        if step > 2.0 * band:
            full = text_of(2.0 * band, "S")
            yield f"the converter's step ({text_of(step, 'S')}) is wider than the whole band ({full})"
    if job.targets.levels_S.size > 1:
        spacing, band = float(np.diff(job.targets.levels_S).min()), _tolerance(job, job.targets.high_S)
        if 2.0 * band > spacing:
            half, apart = text_of(band, "S"), text_of(spacing, "S")
            yield f"the bands of neighbouring levels overlap: half width {half}, levels {apart} apart"


def _cycle_noise(job: Job) -> Iterator[str]:
    cycle = job.cell.cycle
    if cycle is not None and cycle.law == "normal" and cycle.relative > 1.0 / 3.0:
        spread = text_of(cycle.relative, "%")
        yield f'normal cycle noise of {spread} turns some pulses round; law = "lognormal" does not'


def _tolerance(job: Job, target: float) -> float:
    return max(job.tolerance_S, job.tolerance_fraction * target)
