"""One line of cells.csv per addressed cell, formatted fast enough to keep up with the programming loop.

Numbers are written in the shortest form that reads back as the same float. A die is formatted where it ran, in a worker
thread; the main thread only writes bytes.
"""

from __future__ import annotations

import numpy as np

from programming.job import STATUS_NAMES, DieOutcome, Job

HEADER = b"die,row,column,target_S,final_S,pulses,verifies,status,disturbance_S\n"
_BLOCK = 8192  # rows formatted at a time: bounds the memory of Python objects, and stays in the cache
_NAMES = np.array(STATUS_NAMES, dtype=object)


def format_cells(outcome: DieOutcome, job: Job) -> bytes:
    """The lines of one die, without the header. Raises ValueError where a number is not finite."""
    chosen = np.flatnonzero(~np.isnan(outcome.target_S))
    blocks = (chosen[start : start + _BLOCK] for start in range(0, chosen.size, _BLOCK))
    return b"".join(_format_block(outcome, block, job.columns) for block in blocks)


def _format_block(outcome: DieOutcome, cells: np.ndarray[tuple[int], np.dtype[np.intp]], columns: int) -> bytes:
    import orjson  # writes shortest floats about five times faster than repr

    row, column = np.divmod(cells, columns)
    lists = (
        [outcome.die] * cells.size,
        row.tolist(),
        column.tolist(),
        outcome.target_S[cells].tolist(),
        outcome.final_S[cells].tolist(),
        outcome.pulses[cells].tolist(),
        outcome.verifies[cells].tolist(),
        _NAMES[outcome.status[cells]].tolist(),
        outcome.disturbance_S[cells].tolist(),
    )
    # [[0,0,1,"accepted"],[...]] becomes lines by taking out brackets and quotes; no status name contains any.
    text = orjson.dumps(list(zip(*lists, strict=True)))
    if b"null" in text:
        raise ValueError(f"die {outcome.die}: a conductance is not a finite number")
    return text[2:-2].replace(b"],[", b"\n").replace(b'"', b"") + b"\n"
