"""From a job to what the compiled loop reads: the plan, the rules for the controller, and memory for a die."""

from __future__ import annotations

import math
from typing import Any

import numpy as np
import numpy.typing as npt
from scipy.special import ndtri

from device_models.converter import lsb
from device_models.random_numbers import CONVERTER, normal_by_inverse
from device_models.read_noise import (
    noise_coefficients,
    telegraph_averaging,
    telegraph_correlation,
    telegraph_occupancy,
    telegraph_variance,
)
from programming.fuse import fuse
from programming.job import Job, ParameterSpread
from programming.plan import VARIED, Die, Plan
from programming.pulse_grid import amplitude_grid, width_grid
from programming.strategy_contract import Rules

Floats = npt.NDArray[np.float64]
_LAWS = {"normal": 0, "lognormal": 1}
_TARGET_KINDS = {"levels": 0, "uniform": 1, "matrix": 2}
_ENERGY_NODES = 33
_WEAK_CELL = 0.995  # quantile of the cells' stress doses that sets the scale of the record of mixed stress
_LINE_RECORDS, _ARRAY_RECORDS, _RECORD_STEP = 64, 1024, 0.08
_SAMPLE = 1024


def log_sigma(relative: float) -> float:
    """Sigma of the logarithm of a lognormal with that relative standard deviation."""
    return math.sqrt(math.log1p(relative * relative))


def spread_size(spread: ParameterSpread) -> float:
    """What the compiled loop multiplies a standard normal with: relative, or sigma of the logarithm."""
    return spread.relative if spread.law == "normal" else log_sigma(spread.relative)


def base_values(job: Job) -> Floats:
    """Nominal parameters in the order of the model's record."""
    return np.array([float(job.cell.values[name]) for name in job.cell.model.Parameters._fields])


def spread_arrays(job: Job) -> tuple[npt.NDArray[np.int64], npt.NDArray[np.int64], Floats]:
    """Which parameters vary (their place in the record), by which law (0 normal, 1 lognormal), and by how much."""
    fields = job.cell.model.Parameters._fields
    return (
        np.array([fields.index(name) for name in job.cell.spreads], dtype=np.int64),
        np.array([_LAWS[spread.law] for spread in job.cell.spreads.values()], dtype=np.int64),
        np.array([spread_size(spread) for spread in job.cell.spreads.values()], dtype=np.float64),
    )


def sampled_doses(job: Job, voltages: Floats, widths: Floats, count: int) -> Floats:
    """(count, pulses) signed doses of pulses on `count` healthy cells drawn from the job's spreads.

    voltages: signed, across the cell [V]; widths [s]. The sample belongs to no die.
    """
    out = np.empty((count, len(voltages)))
    varied, law, size = spread_arrays(job)
    fuse(job.cell.model, job.strategy).sample_doses(
        base_values(job),
        varied,
        law,
        size,
        float(job.cell.truncation),
        np.ascontiguousarray(voltages, dtype=np.float64),
        np.ascontiguousarray(widths, dtype=np.float64),
        out,
    )
    return out


def nominal_cell(job: Job) -> tuple[float, float, float]:
    """(lowest conductance [S], highest [S], unit dose) of the nominal cell.

    The unit dose moves it from mid-range by 1 - 1/e of the way to an end, the smaller of both directions.
    """
    return fuse(job.cell.model, job.strategy).nominal_cell(base_values(job), float(job.verify.voltage_V))


def _class_fractions(job: Job) -> dict[str, float]:
    """Fraction of the selected voltage on each class of cell; sizes that differ by rounding only are made equal."""
    row, column, rest = job.bias.same_row, job.bias.same_column, job.bias.rest
    column = row if math.isclose(column, row, rel_tol=1e-12) else column
    rest = math.copysign(row, rest) if math.isclose(abs(rest), row, rel_tol=1e-12) else rest
    return {"row_fraction": row, "column_fraction": column, "rest_fraction": rest}


def _pulse_arrays(job: Job) -> dict[str, Any]:
    """Grids of both directions, with the voltage and width of every ledger bin."""
    amplitudes, widths, spacings, width_spacings = [], [], [], []
    for train in (job.set, job.reset):
        values, spacing = amplitude_grid(train, job.strategy, job.resolution)
        times, width_spacing = width_grid(train, job.strategy)
        amplitudes.append(values)
        widths.append(times)
        spacings.append(spacing)
        width_spacings.append(width_spacing)
    fractions = _class_fractions(job)
    sign = np.array([1.0, -1.0]) * job.cell.model.set_polarity
    bins = [a.size * w.size for a, w in zip(amplitudes, widths, strict=True)]
    return {
        "amplitudes": np.concatenate(amplitudes),
        "widths": np.concatenate(widths),
        "amplitude_first": np.array([0, amplitudes[0].size, amplitudes[0].size + amplitudes[1].size]),
        "width_first": np.array([0, widths[0].size, widths[0].size + widths[1].size]),
        "bin_first": np.array([0, bins[0], bins[0] + bins[1]]),
        "amplitude_spacing": np.array(spacings),
        "width_spacing": np.array(width_spacings),
        "cell_sign": sign,
        "bin_voltage": np.concatenate([np.repeat(a * s, w.size) for a, w, s in zip(amplitudes, widths, sign, strict=True)]),
        "bin_amplitude": np.concatenate(
            [
                first + np.repeat(np.arange(a.size), w.size)
                for first, a, w in zip((0, amplitudes[0].size), amplitudes, widths, strict=True)
            ]
        ),
        "mirrored": int(
            fractions["rest_fraction"] == -fractions["row_fraction"] and np.array_equal(amplitudes[0], amplitudes[1])
        ),
        "bin_width": np.concatenate([np.tile(w, a.size) for a, w in zip(amplitudes, widths, strict=True)]),
    }


def _slow_doses(job: Job, pulses: dict[str, Any]) -> Floats:
    """Per bin, the dose that all but half the allowed false-alarm share of healthy cells exceed, cycle noise included."""
    share = 0.5 * job.stuck_false_alarm
    if share <= 0.0:
        return np.zeros(pulses["bin_voltage"].size)
    count = int(min(max(8.0 / share, 256.0), 16384.0))
    drawn = sampled_doses(job, pulses["bin_voltage"], pulses["bin_width"], count)
    slow = np.sign(drawn.sum(axis=0)) * np.quantile(np.abs(drawn), share, axis=0, method="lower")
    if job.cell.cycle is None:
        return slow
    if job.cell.cycle.law == "normal":
        return np.asarray(slow * max(0.0, 1.0 + job.cell.cycle.relative * float(ndtri(share))))
    return np.asarray(slow * math.exp(log_sigma(job.cell.cycle.relative) * float(ndtri(share))))


def _reference_doses(job: Job, pulses: dict[str, Any]) -> tuple[Floats, bool]:
    """(3, bins) size of a weak cell's dose per pulse by class, and whether stress of both signs occurs."""
    fractions = (job.bias.same_row, job.bias.same_column, job.bias.rest)
    drawn = np.array([sampled_doses(job, f * pulses["bin_voltage"], pulses["bin_width"], _SAMPLE) for f in fractions])
    both = bool((drawn > 0.0).any() and (drawn < 0.0).any())
    return np.quantile(np.abs(drawn), _WEAK_CELL, axis=1), both


def _node_voltages(job: Job, pulses: dict[str, Any]) -> Floats:
    """The verify voltage; for cells that are not ohmic also an even grid over what unselected cells can see."""
    if job.cell.model.ohmic:
        return np.array([job.verify.voltage_V])
    largest = float(np.abs(pulses["bin_voltage"]).max()) * max(job.bias.same_row, job.bias.same_column, abs(job.bias.rest))
    return np.concatenate([[job.verify.voltage_V], np.linspace(-largest, largest, _ENERGY_NODES)])


def _converter(job: Job) -> dict[str, Any]:
    bits = job.verify.bits
    gains = np.full(job.columns, 1.0 + job.verify.gain_error)
    if job.verify.gain_spread > 0.0:
        gains += [
            job.verify.gain_spread * normal_by_inverse(np.uint64(job.seed), 0, column, CONVERTER, 0, 0)
            for column in range(job.columns)
        ]
    return {
        "converter_step": lsb(job.verify.range_S, bits) if bits else 0.0,
        "converter_top": float(2**bits - 1),
        "converter_gain": gains,
    }


def read_noise_of(job: Job) -> dict[str, float]:
    """The noise fields of a plan: coefficients of the variances of one read and of one verify, and the two-level signal."""
    verify, noise = job.verify, job.cell.noise

    def coefficients(integration: float) -> tuple[float, float]:
        return noise_coefficients(
            verify.voltage_V,
            integration,
            job.temperature_K,
            noise,
            verify.thermal,
            verify.shot,
            verify.flicker,
            verify.flicker_low_Hz,
        )

    square = coefficients(verify.integration_s * verify.reads)[1]
    telegraph = telegraph_variance(noise) * telegraph_averaging(noise, verify.reads, verify.integration_s)
    return {
        "noise_linear": coefficients(verify.integration_s)[0],
        "noise_square": square,
        "verify_square": square + (telegraph if verify.telegraph else 0.0),
        "telegraph": float(noise.telegraph) if verify.telegraph else 0.0,
        "telegraph_high": telegraph_occupancy(noise),
        "telegraph_correlation": telegraph_correlation(noise, verify.integration_s),
    }


def reading_deviation(job: Job, conductance_S: float) -> float:
    """Standard deviation of a verify of a cell at that conductance [S]: all noise, the converter, averaged reads."""
    noise = read_noise_of(job)
    step = _converter(job)["converter_step"]
    variance = conductance_S * (noise["noise_linear"] / job.verify.reads + noise["verify_square"] * conductance_S)
    return math.sqrt(variance + step * step / 12.0)


def make_plan(job: Job) -> Plan:
    """The plan of a job. Costs a few thousand evaluations of the model, for the stuck test and the stress record."""
    pulses = _pulse_arrays(job)
    reference, both_signs = _reference_doses(job, pulses)
    varied, law, size = spread_arrays(job)
    cycle = job.cell.cycle
    targets = job.targets
    unit = nominal_cell(job)[2]
    return Plan(
        seed=np.uint64(job.seed),
        rows=job.rows,
        columns=job.columns,
        **_class_fractions(job),
        word_fraction=job.bias.word,
        bit_fraction=job.bias.bit,
        **{name: pulses[name] for name in Plan._fields if name in pulses},
        overhead=np.array([2.0 * train.rise + train.dead_time for train in (job.set, job.reset)]),
        base_values=base_values(job),
        varied=varied,
        spread_law=law,
        spread_size=size,
        truncation=float(job.cell.truncation),
        cycle_law=0 if cycle is None or cycle.relative == 0.0 else 1 + _LAWS[cycle.law],
        cycle_spread=float(cycle.relative) if cycle else 0.0,
        cycle_sigma=log_sigma(cycle.relative) if cycle else 0.0,
        stress_noise=int(job.stress_noise),
        initial_S=float(job.cell.initial_S),
        initial_spread=float(job.cell.initial_spread),
        unit_dose=unit,
        node_voltages=_node_voltages(job, pulses),
        stuck_low=float(job.faults.stuck_low),
        stuck_high=float(job.faults.stuck_high),
        clustered=int(job.faults.placement == "clustered"),
        cluster_size=float(job.faults.cluster_size),
        read_voltage=float(job.verify.voltage_V),
        integration=float(job.verify.integration_s),
        reads=int(job.verify.reads),
        **read_noise_of(job),
        **_converter(job),
        target_kind=_TARGET_KINDS[targets.kind],
        levels=np.ascontiguousarray(targets.levels_S, dtype=np.float64),
        low=float(targets.low_S),
        high=float(targets.high_S),
        matrix=np.ascontiguousarray(np.empty(0) if targets.matrix_S is None else targets.matrix_S, dtype=np.float64).ravel(),
        tolerance_S=float(job.tolerance_S),
        tolerance_fraction=float(job.tolerance_fraction),
        max_pulses=int(job.max_pulses),
        passes=int(job.passes),
        verifies=int(job.strategy.verifies),
        stuck_limit=float(-ndtri(0.5 * job.stuck_false_alarm)) if job.stuck_false_alarm > 0.0 else 0.0,
        slow_dose=_slow_doses(job, pulses),
        history=int(both_signs),
        reference_dose=reference,
        history_step=_RECORD_STEP * unit,
    )


def make_rules(job: Job) -> Rules:
    """What the controller is told."""
    return Rules(
        float(job.set.start),
        float(job.set.step),
        float(job.set.stop),
        float(job.set.width),
        float(job.set.width_step),
        float(job.set.width_stop or job.set.width),
        float(job.reset.start),
        float(job.reset.step),
        float(job.reset.stop),
        float(job.reset.width),
        float(job.reset.width_step),
        float(job.reset.width_stop or job.reset.width),
        float(job.targets.low_S),
        float(job.targets.high_S),
        float(job.max_pulses),
        reading_deviation(job, 0.5 * (job.targets.low_S + job.targets.high_S)),
    )


def make_die(job: Job, plan: Plan, order: npt.NDArray[np.int32], stop: npt.NDArray[np.uint8]) -> Die:
    """Memory for one die; see clear_die."""
    cells, lines, bins = job.rows * job.columns, job.rows + job.columns, int(plan.bin_first[2])
    nodes, amplitudes = plan.node_voltages.size, plan.amplitudes.size
    records, array_records = (_LINE_RECORDS, _ARRAY_RECORDS) if plan.history else (1, 1)
    return Die(
        cells=np.zeros((cells, VARIED + plan.varied.size)),
        target=np.empty(cells),
        pulses=np.zeros(cells, dtype=np.uint32),
        verifies=np.zeros(cells, dtype=np.uint32),
        status=np.zeros(cells, dtype=np.uint8),
        fault=np.zeros(cells, dtype=np.uint8),
        in_band=np.zeros(cells, dtype=np.bool_),
        settled_at=np.zeros(cells, dtype=np.uint32),
        order=order,
        row_count=np.zeros((job.rows, bins), dtype=np.int32),
        column_count=np.zeros((job.columns, bins), dtype=np.int32),
        all_count=np.zeros(bins, dtype=np.int64),
        top=np.full(2, -1, dtype=np.int64),
        row_sum=np.zeros((job.rows, nodes)),
        column_sum=np.zeros((job.columns, nodes)),
        all_sum=np.zeros((1, nodes)),
        stress_rate=np.zeros((3, amplitudes)),
        stress_low=np.zeros(2, dtype=np.int64),
        memory=np.zeros(max(job.strategy.memory, 1)),
        values=np.zeros(plan.base_values.size),
        energy=np.zeros(6),
        total=np.zeros(2),
        counter=np.zeros(1, dtype=np.int64),
        line_open=np.zeros((lines, 4)),
        line_sum=np.zeros((lines, 4)),
        line_moment=np.zeros((lines, records), dtype=np.uint32),
        line_dose=np.zeros((lines, records, 4), dtype=np.float32),
        line_records=np.zeros(lines, dtype=np.int64),
        all_open=np.zeros((1, 2)),
        all_sum_dose=np.zeros((1, 2)),
        all_moment=np.zeros((1, array_records), dtype=np.uint32),
        all_dose=np.zeros((1, array_records, 2), dtype=np.float32),
        all_records=np.zeros(1, dtype=np.int64),
        stop=stop,
    )


def clear_die(die: Die, plan: Plan) -> None:
    """Make a worker's memory ready for its next die."""
    for name, array in zip(Die._fields, die, strict=True):
        if name not in ("order", "stop"):
            array.fill(0)
    die.top.fill(-1)
    die.values[:] = plan.base_values
