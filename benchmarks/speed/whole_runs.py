"""Whole runs: two workers against one, the time to help and to a result in a fresh process, memory per cell."""

from __future__ import annotations

import subprocess
import sys
import time

import numpy as np

from benchmarks.scenario import load_scenario
from benchmarks.speed.jobs import speed_job
from programming.die_memory import make_die
from programming.job import DieOutcome
from programming.orders import ORDERS
from programming.plan import VARIED
from programming.prepare import make_plan
from programming.run import program_dies


def _pulses(outcome: DieOutcome) -> int:
    return int(outcome.pulses.sum())


def worker_times(dies: int = 96, repeats: int = 3) -> tuple[float, float]:
    """Best times [s] of the same dies of the demo with one worker and with two, run in turn."""
    job = load_scenario("demo", seed=1).job
    best = [np.inf, np.inf]
    list(program_dies(job, 1, 1, _pulses))
    for _ in range(repeats):
        for workers in (1, 2):
            start = time.perf_counter()
            list(program_dies(job, dies, workers, _pulses))
            best[workers - 1] = min(best[workers - 1], time.perf_counter() - start)
    return best[0], best[1]


def process_time(arguments: list[str], repeats: int = 5) -> float:
    """Median time [s] of a fresh process of the command, its compiled code in the cache."""
    command = [sys.executable, "-m", "benchmarks", *arguments]
    times = []
    for _ in range(repeats + 1):
        start = time.perf_counter()
        subprocess.run(command, check=True, capture_output=True)
        times.append(time.perf_counter() - start)
    return float(np.median(times[1:]))


def bytes_per_cell(size: int) -> tuple[float, float]:
    """(all memory of a die in flight, the same without state and varied parameters) per cell of the demo [bytes]."""
    job = speed_job("mild stress", size, "V/2")
    plan = make_plan(job)
    die = make_die(job, plan, ORDERS[job.order](size, size, 1, 0), np.zeros(1, np.uint8))
    whole = sum(array.nbytes for array in die) / (size * size)
    return whole, whole - 8.0 * (1 + die.cells.shape[1] - VARIED)
