"""What the compiled loop reads and writes, as records of numbers and arrays.

`Plan` is the same for every die and never written. `Die` holds the state of one die. The records below are the only way in
and out of the compiled loop.
"""

from __future__ import annotations

from typing import Any, NamedTuple

import numpy as np

# Columns of Die.cells, one row of float64 per cell. Varied device parameters follow from VARIED on.
STATE = 0  # state of the cell, with all stress settled up to its last visit
OWN_STATE = 1  # state right after its own last pulse (or before programming)
SETTLED_UP, SETTLED_DOWN = 2, 3  # stress doses raising and lowering the conductance, as of the last settling
SQUARE_UP, SQUARE_DOWN = 4, 5  # sums of squared doses per pulse, for the cycle noise of the stress
OWN_ROW, OWN_COLUMN, OWN_REST = 6, 7, 8  # sizes of the doses by class, as of its own last pulse
VARIED = 9

# Columns of Die.cells when the die is done: the same memory, now results.
FINAL_S, DISTURBANCE_S = 2, 3

SELECTED, HALF_SELECTED, REST, VERIFY, LINES, SUPPLY = range(6)


class Plan(NamedTuple):
    """The experiment, the same for every die.

    Directions are indexed 0 (SET) and 1 (RESET). Bins of the ledger: SET bins first, amplitude-major.
    """

    seed: Any  # uint64
    rows: int
    columns: int
    row_fraction: float  # of the selected voltage, across the cells of the same word line
    column_fraction: float
    rest_fraction: float
    word_fraction: float  # of the selected voltage, on the unselected word lines
    bit_fraction: float
    cell_sign: np.ndarray  # (2,) sign of the cell voltage in each direction
    # pulses
    amplitudes: np.ndarray  # [V] SET amplitudes, then RESET
    widths: np.ndarray  # [s] SET widths, then RESET
    amplitude_first: np.ndarray  # (3,) where each direction's amplitudes begin; the last is the total
    width_first: np.ndarray  # (3,)
    bin_first: np.ndarray  # (3,)
    bin_amplitude: np.ndarray  # (bins,) place of each bin's amplitude
    bin_width: np.ndarray  # (bins,) [s]
    mirrored: int  # 1: the rest sees in each direction what the rows see in the other
    amplitude_steps: np.ndarray  # (2, 3) [V] first and last value and spacing of each direction's grid, before rounding
    width_steps: np.ndarray  # (2, 3) [s]
    overhead: np.ndarray  # (2,) [s] edges and pause around each pulse
    # device
    base_values: np.ndarray  # (parameters,) [SI]
    varied: np.ndarray  # which parameters vary from cell to cell
    spread_law: np.ndarray  # 0 normal, 1 lognormal
    spread_size: np.ndarray  # relative, or sigma of the logarithm
    truncation: float
    cycle_law: int  # 0 none, 1 normal, 2 lognormal
    cycle_spread: float  # relative standard deviation of a dose
    cycle_sigma: float  # sigma of the logarithm
    stress_noise: int
    initial_S: float
    initial_spread: float
    unit_dose: float  # a dose that moves a middling cell by 1 - 1/e of the way
    node_voltages: np.ndarray  # [V] where line sums are kept: the verify voltage, then (not ohmic) an even grid
    # faults
    stuck_low: float
    stuck_high: float
    clustered: int
    cluster_size: float
    # verify
    read_voltage: float
    integration: float
    reads: int
    noise_linear: float  # variance of one read is noise_linear * G, and that of the verify noise_square * G * G more
    noise_square: float
    verify_square: float  # what a controller expects: verify variance noise_linear / reads * G + verify_square * G * G
    telegraph: float
    telegraph_high: float  # share of time in the high level
    telegraph_correlation: float  # from one read to the next
    converter_step: float  # [S], 0.0 without converter
    converter_top: float  # highest code
    converter_gain: np.ndarray  # (columns,)
    # targets and controller
    target_kind: int  # 0 levels, 1 uniform, 2 matrix
    levels: np.ndarray
    low: float
    high: float
    matrix: np.ndarray
    tolerance_S: float
    tolerance_fraction: float
    max_pulses: int
    passes: int
    verifies: int
    # stuck test
    stuck_limit: float  # z: how many standard deviations of a difference of readings still look like no movement
    slow_dose: np.ndarray  # (bins,) dose of the nominal cell that does what the pulse does to a slow healthy cell
    slow_low: float  # [S] readings that a healthy cell of the narrowest range can reach for sure, at the low end
    slow_high: float  # and at the high end
    nominal_low: float  # [S] range of the nominal cell
    nominal_high: float
    unseen_high: float  # [S] what a cell at its high end may read, had the converter no end
    # order of mixed stress
    history: int  # 0: only one polarity disturbs, no record kept
    reference_dose: np.ndarray  # (3, bins) size of the dose of a weak cell per pulse, by class
    history_step: float


class Die(NamedTuple):
    """The state of one die, and the scratch memory of the worker that simulates it."""

    cells: np.ndarray  # (cells, VARIED + varied parameters)
    target: np.ndarray  # [S]
    pulses: np.ndarray  # uint32
    verifies: np.ndarray  # uint32
    status: np.ndarray  # uint8
    fault: np.ndarray  # uint8
    in_band: np.ndarray  # bool
    settled_at: np.ndarray  # uint32, moment of the last settling: number of pulses given on the die until then
    order: np.ndarray  # int32
    row_count: np.ndarray  # (rows, bins) int32: pulses each word line carried
    column_count: np.ndarray  # (columns, bins) int32
    all_count: np.ndarray  # (bins,) int64
    top: np.ndarray  # (2,) int64: highest amplitude used in each direction, -1 for none
    row_sum: np.ndarray  # (rows, nodes) [S] sum of the conductances of a word line
    column_sum: np.ndarray  # (columns, nodes)
    all_sum: np.ndarray  # (nodes,)
    stress_rate: np.ndarray  # (3, amplitudes) [1/s] scratch: the visited cell's rates under stress, by class
    stress_low: np.ndarray  # (2,) int64 scratch: lowest amplitude at which it is stressed at all
    memory: np.ndarray  # scratch of the strategy
    values: np.ndarray  # scratch: parameters of the visited cell
    energy: np.ndarray  # (6,) [J]
    # (3,) time [s]; sizes of settled conductance changes times the pulses they waited [S]; cells out of band by disturbance
    total: np.ndarray
    counter: np.ndarray  # (1,) int64: number of pulses so far on the die
    # recent stress in order, in reference doses, per line (rows, then columns) and for the whole array; columns: up, down,
    # and for lines what the same pulses would be to cells of the rest, up, down
    line_open: np.ndarray  # (lines, 4) since the last record
    line_sum: np.ndarray  # (lines, 4) since the start
    line_moment: np.ndarray  # (lines, records) uint32
    line_dose: np.ndarray  # (lines, records, 4) float32
    line_records: np.ndarray  # (lines,) int64
    all_open: np.ndarray  # (1, 2)
    all_sum_dose: np.ndarray  # (1, 2)
    all_moment: np.ndarray  # (1, records) uint32
    all_dose: np.ndarray  # (1, records, 2) float32
    all_records: np.ndarray  # (1,)
    stop: np.ndarray  # (1,) uint8: set from outside to end early
