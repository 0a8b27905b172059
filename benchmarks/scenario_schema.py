"""The sections and keys of a scenario file, their types, ranges, defaults and the rules between them.

Values are SI floats once validated. What only the device or the strategy can tell is judged in benchmarks.scenario_job.
"""

from __future__ import annotations

from typing import Annotated, Any, ClassVar, Literal

from pydantic import BeforeValidator, Field, model_validator

from benchmarks.errors import closest, listed, shown
from benchmarks.quantities import FRACTION_UNITS, QuantityError, parse_quantity, text_of
from benchmarks.scenario_keys import (
    UNAVAILABLE,
    Fraction,
    PositiveConductance,
    PositiveTime,
    PositiveVoltage,
    RelativeSpread,
    Section,
    Time,
    Voltage,
    complain,
    fail,
    one_of,
    quantity,
)
from programming.bias import SCHEMES
from programming.orders import ORDERS

LAW_NAMES = ("normal", "lognormal")
MOST_LINES = 16384


class ArraySection(Section):
    """[array]: size and surroundings."""

    unavailable: ClassVar[tuple[str, ...]] = ("segment_resistance", "driver_resistance", "line_capacitance")
    rows: Annotated[int, Field(ge=1, le=MOST_LINES)]
    columns: Annotated[int, Field(ge=1, le=MOST_LINES)]
    access: Annotated[str, one_of(("none",), unavailable=("transistor", "selector"))] = "none"
    wires: Annotated[str, one_of(("ideal",), unavailable=("lines", "network"))] = "ideal"
    temperature: Annotated[float, quantity("K", above=0.0, high=1000.0)] = 300.0


class InitialSection(Section):
    """[device.initial]: conductance before programming, with a relative spread between cells."""

    conductance: PositiveConductance | None = None
    spread: RelativeSpread | None = None


class SpreadSection(Section):
    """A spread: law and relative standard deviation. Without a law, that of the parameter set."""

    law: Annotated[Literal["normal", "lognormal"] | None, one_of(LAW_NAMES)] = None
    spread: RelativeSpread


class VariationSection(Section):
    """[device.variation]: overrides of the parameter set's spreads; truncation in standard deviations."""

    truncation: Annotated[float, quantity("", above=0.0, high=8.0)] | None = None
    cycle: SpreadSection | None = None
    cells: dict[str, SpreadSection] = Field(default_factory=dict)


class NoiseSection(Section):
    """[device.noise]: overrides of the parameter set's read noise."""

    flicker: Annotated[float, quantity("", low=0.0, high=1.0)] | None = None
    telegraph: Annotated[float, quantity("%", low=0.0, high=1.0)] | None = None
    telegraph_low_dwell: PositiveTime | None = None
    telegraph_high_dwell: PositiveTime | None = None
    transport: Annotated[Literal["ohmic", "tunnel"] | None, one_of(("ohmic", "tunnel"))] = None


class FaultsSection(Section):
    """[device.faults]: fractions of cells stuck at low and at high conductance, and how they lie."""

    stuck_low: Fraction = 0.0
    stuck_high: Fraction = 0.0
    placement: Annotated[Literal["uniform", "clustered"], one_of(("uniform", "clustered"))] = "uniform"
    cluster_size: Annotated[float, quantity("", low=1.0, high=1e6)] = 8.0

    @model_validator(mode="after")
    def _rules(self) -> FaultsSection:
        if self.stuck_low + self.stuck_high > 1.0:
            fail("stuck_high", f"together with stuck_low must not exceed 100 %, got {text_of(self.stuck_high, '%')}")
        if self.given("cluster_size") and self.placement != "clustered":
            fail("cluster_size", 'only has a meaning with placement = "clustered"')
        return self


class DeviceSection(Section):
    """[device]: which model, with which values."""

    model: str
    parameters: str | None = None
    overrides: dict[str, Any] = Field(default_factory=dict)
    initial: InitialSection = InitialSection()
    variation: VariationSection = VariationSection()
    noise: NoiseSection = NoiseSection()
    faults: FaultsSection = FaultsSection()


class TargetsSection(Section):
    """[targets]: what the cells should become."""

    kind: Annotated[Literal["levels", "uniform", "file", "classifier"], one_of(("levels", "uniform", "file", "classifier"))] = (
        "levels"
    )
    low: PositiveConductance | None = None
    high: PositiveConductance | None = None
    levels: Annotated[int, Field(ge=2, le=4096)] = 16
    path: str | None = None
    unit: str | None = None

    @model_validator(mode="after")
    def _rules(self) -> TargetsSection:
        needed = {"file": ("path",)}.get(self.kind, ("low", "high"))
        allowed = {"file": ("path", "unit"), "levels": ("low", "high", "levels")}.get(self.kind, ("low", "high"))
        for key in ("low", "high", "levels", "path", "unit"):
            if self.given(key) and key not in allowed:
                fail(key, f"has no meaning with kind = {shown(self.kind)}, which takes {listed(allowed)}")
        for key in needed:
            if getattr(self, key) is None:
                fail(key, f"is missing (needed with kind = {shown(self.kind)})")
        if self.low is not None and self.high is not None and self.low >= self.high:
            fail("low", f"must be below high ({text_of(self.high, 'S')}), got {text_of(self.low, 'S')}")
        return self


class PulseSection(Section):
    """[programming.set] and [programming.reset]: magnitudes; the polarity comes from the device model."""

    start: PositiveVoltage
    step: Voltage = 0.0
    stop: PositiveVoltage | None = None
    width: PositiveTime
    width_step: Time = 0.0
    width_stop: PositiveTime | None = None
    rise: Time = 0.0
    dead_time: Time = 0.0

    @model_validator(mode="after")
    def _rules(self) -> PulseSection:
        if self.stop is not None and self.stop < self.start:
            fail("stop", f"must not be below start ({text_of(self.start, 'V')}), got {text_of(self.stop, 'V')}")
        if self.width_stop is not None and self.width_stop < self.width:
            got = text_of(self.width_stop, "s")
            fail("width_stop", f"must not be below width ({text_of(self.width, 's')}), got {got}")
        if self.width_step > 0.0 and self.width_stop is None:
            fail("width_stop", "is missing (needed with width_step)")
        if self.step > 0.0 and self.stop is None:
            fail("stop", "is missing (needed with step)")
        return self


class SchemeFractions(Section):
    """Half-select bias by its two fractions of the selected voltage on the unselected word and bit lines."""

    word: Annotated[float, quantity("", low=0.0, high=1.0)]
    bit: Annotated[float, quantity("", low=0.0, high=1.0)]


def _read_scheme(value: object) -> object:
    if isinstance(value, dict):
        return value
    if value == "floating":
        raise complain(f"{shown(value)} is {UNAVAILABLE}; available: {listed(SCHEMES)}")
    if value not in SCHEMES:
        hint = closest(value, SCHEMES) if isinstance(value, str) else ""
        raise complain(f"must be one of {listed(SCHEMES)} or a table {{word = ..., bit = ...}}, got {shown(value)}{hint}")
    return SchemeFractions(word=SCHEMES[str(value)].word, bit=SCHEMES[str(value)].bit)


def _read_tolerance(value: object) -> tuple[float, float]:
    """(absolute [S], fraction of the target): one of the two is 0."""
    per_cent = isinstance(value, str) and value.rstrip().endswith(FRACTION_UNITS)
    try:
        number = parse_quantity(value, "%" if per_cent else "S")
    except QuantityError as error:
        raise complain(
            str(error).replace("a conductance with its unit", "a conductance or per cent of the target", 1)
        ) from error
    if number <= 0.0 or (per_cent and number >= 1.0):
        raise complain(f"must be above 0{' and below 100 %' if per_cent else ''}, got {shown(value)}")
    return (0.0, number) if per_cent else (number, 0.0)


class ProgrammingSection(Section):
    """[programming]: strategy, bias, order, band and limits."""

    unavailable: ClassVar[tuple[str, ...]] = ("compensate",)
    strategy: str = "amplitude_staircase"
    scheme: Annotated[SchemeFractions, BeforeValidator(_read_scheme)] = SchemeFractions(word=0.5, bit=0.5)
    order: Annotated[str, one_of(tuple(ORDERS))] = "row_by_row"
    tolerance: Annotated[tuple[float, float], BeforeValidator(_read_tolerance)]
    max_pulses: Annotated[int, Field(ge=1, le=1_000_000)] = 200
    passes: Annotated[int, Field(ge=1, le=1000)] = 1
    resolution: PositiveVoltage = 5e-3
    stuck_false_alarm: Annotated[float, quantity("%", above=0.0, high=0.5)] = 1e-3
    set: PulseSection
    reset: PulseSection


class VerifySection(Section):
    """[verify]: how a cell is read."""

    voltage: PositiveVoltage = 0.2
    integration: PositiveTime = 100e-9
    bits: Annotated[int, Field(ge=0, le=24)] = 0
    range: PositiveConductance | None = None
    gain_error: Annotated[float, quantity("%", low=-0.5, high=0.5)] = 0.0
    gain_spread: Annotated[float, quantity("%", low=0.0, high=0.3)] = 0.0
    reads: Annotated[int, Field(ge=1, le=100_000)] = 1
    thermal: bool = True
    shot: bool = True
    flicker: bool = True
    telegraph: bool = True
    flicker_low: Annotated[float, quantity("Hz", above=0.0)] = 1.0

    @model_validator(mode="after")
    def _rules(self) -> VerifySection:
        if self.bits > 0 and self.range is None:
            fail("range", "is missing (full scale of the converter, needed with bits)")
        if self.bits == 0 and self.range is not None:
            fail("range", "has no meaning without a converter (bits = 0)")
        if self.flicker_low * 2.0 * self.integration >= 1.0:
            fail("flicker_low", f"must be below 1 / (2 integration), {text_of(0.5 / self.integration, 'Hz')}")
        return self


class ScenarioFile(Section):
    """A whole scenario file."""

    unavailable: ClassVar[tuple[str, ...]] = ("retention",)
    title: str = ""
    seed: Annotated[int, Field(ge=0, le=2**63 - 1)] = 1
    dies: Annotated[int, Field(ge=1, le=1_000_000)] = 32
    array: ArraySection
    device: DeviceSection
    targets: TargetsSection
    programming: ProgrammingSection
    verify: VerifySection = VerifySection()
