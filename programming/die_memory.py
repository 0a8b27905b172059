"""The memory of one die in flight."""

from __future__ import annotations

import numpy as np
import numpy.typing as npt

from programming.job import Job
from programming.plan import VARIED, Die, Plan

_LINE_RECORDS, _ARRAY_RECORDS = 64, 1024  # of recent mixed stress, in order; see programming.stress_history


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
        total=np.zeros(3),
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
