"""Everything the programming loop needs to know, resolved to numbers in SI units: what a scenario becomes."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from typing import Literal

import numpy as np
import numpy.typing as npt

from device_models.contract import DeviceModel, Law, NoiseLevels
from programming.bias import BiasScheme
from programming.strategy_contract import CellStrategy


@dataclass(frozen=True)
class ParameterSpread:
    """Device-to-device spread of one parameter: law and relative standard deviation."""

    law: Law
    relative: float


@dataclass(frozen=True)
class Cell:
    """The device of a job: its model, the value of each parameter and how cells and pulses scatter about it.

    values: parameter name -> value [SI]. spreads: parameter name -> spread between cells, cut off at `truncation`
    standard deviations. cycle: spread of the dose from pulse to pulse, None for none. initial_S [S] and
    initial_spread (relative, normal, same truncation): the conductance before programming.
    """

    model: DeviceModel
    values: Mapping[str, float]
    spreads: Mapping[str, ParameterSpread] = field(default_factory=dict)
    truncation: float = 3.0
    cycle: ParameterSpread | None = None
    initial_S: float = 0.0
    initial_spread: float = 0.0
    noise: NoiseLevels = field(default_factory=NoiseLevels)


@dataclass(frozen=True)
class Faults:
    """Fractions of cells stuck at low and at high conductance.

    placement: "uniform" (each cell by itself) or "clustered" (grown around random centres, `cluster_size` cells on
    average, the same total fraction).
    """

    stuck_low: float = 0.0
    stuck_high: float = 0.0
    placement: Literal["uniform", "clustered"] = "uniform"
    cluster_size: float = 8.0


@dataclass(frozen=True)
class Verify:
    """How a cell is read: voltage [V], integration time [s], number of reads averaged, converter, noise switches.

    bits: 0 for no converter; range_S: full scale of the converter [S]; gain_error: relative, the same for every read;
    gain_spread: relative standard deviation between the converters of the bit lines.
    flicker_low_Hz: lower corner of the 1/f band [Hz]; the upper one is 1 / (2 integration).
    """

    voltage_V: float = 0.2
    integration_s: float = 100e-9
    reads: int = 1
    bits: int = 0
    range_S: float = 0.0
    gain_error: float = 0.0
    gain_spread: float = 0.0
    thermal: bool = True
    shot: bool = True
    flicker: bool = True
    telegraph: bool = True
    flicker_low_Hz: float = 1.0


@dataclass(frozen=True)
class PulseTrain:
    """The pulses of one direction, as magnitudes: amplitudes [V], widths [s], edges and pauses [s].

    start, step, stop: the amplitude staircase. width, width_step, width_stop: the width staircase.
    rise: time of each of the two edges. dead_time: pause after the pulse.
    """

    start: float
    step: float
    stop: float
    width: float
    width_step: float = 0.0
    width_stop: float = 0.0
    rise: float = 0.0
    dead_time: float = 0.0


@dataclass(frozen=True)
class Targets:
    """What the cells should become, per die.

    kind "levels": every cell one of `levels_S` at random; "uniform": uniform between low_S and high_S; "matrix": the
    same `matrix_S` (rows x columns) [S] on every die, NaN where a cell is not addressed.
    """

    kind: Literal["levels", "uniform", "matrix"]
    low_S: float
    high_S: float
    levels_S: npt.NDArray[np.float64] = field(default_factory=lambda: np.empty(0))
    matrix_S: npt.NDArray[np.float64] | None = None


@dataclass(frozen=True)
class Job:
    """One programming experiment, as numbers.

    tolerance_S and tolerance_fraction: half width of the band, the larger of the absolute one [S] and the fraction of
    the target (one of them is 0). max_pulses is per pass. resolution [V]: step of the pulse generator.
    stuck_false_alarm: allowed chance that a healthy cell is called stuck. stress_noise: False freezes the cycle noise
    of half-select stress at its mean (for comparison with a plain loop; not reachable from a scenario).
    """

    seed: int
    rows: int
    columns: int
    temperature_K: float
    cell: Cell
    faults: Faults
    verify: Verify
    targets: Targets
    strategy: CellStrategy
    bias: BiasScheme
    order: str
    set: PulseTrain
    reset: PulseTrain
    tolerance_S: float
    tolerance_fraction: float
    max_pulses: int
    passes: int
    resolution: float
    stuck_false_alarm: float
    stress_noise: bool = True


STATUS_NAMES = ("not_addressed", "accepted", "gave_up", "stuck")
NOT_ADDRESSED, ACCEPTED, GAVE_UP, STUCK = range(4)
ENERGY_PARTS = ("selected", "half_selected", "rest", "verify", "lines", "supply")


@dataclass(frozen=True)
class DieOutcome:
    """What happened on one die. Arrays are of length rows * columns, in row-major order.

    target_S (NaN: not addressed), final_S, disturbance_S [S]; pulses, verifies: counts; status: index into
    STATUS_NAMES; fault: HEALTHY, STUCK_LOW or STUCK_HIGH (the truth); in_band: the truth.
    dose_share (cells, 3): how the stress since a cell's own last pulse splits over same row, same column, rest (rows
    sum to 1, or are 0 where there was none).
    energy_J: the six of ENERGY_PARTS [J], for the whole die ("supply" is apart: not part of the dissipated total).
    half_select_error: bound on the relative error of the half-selected and rest energies: changes of conductance by stress,
        each weighted with the share of the run it was owed before it was settled, over the sum of all conductances.
    time_s: time for the whole die, one cell after another [s]. stress_dominates: more than a tenth of the addressed cells
    ended out of their band because of disturbance (it is larger than what their own programming left as error).
    """

    die: int
    target_S: npt.NDArray[np.float64]
    final_S: npt.NDArray[np.float64]
    disturbance_S: npt.NDArray[np.float64]
    pulses: npt.NDArray[np.uint32]
    verifies: npt.NDArray[np.uint32]
    status: npt.NDArray[np.uint8]
    fault: npt.NDArray[np.uint8]
    in_band: npt.NDArray[np.bool_]
    dose_share: npt.NDArray[np.float64]
    energy_J: npt.NDArray[np.float64]
    half_select_error: float
    time_s: float
    stress_dominates: bool
