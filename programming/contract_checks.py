"""What every cell strategy must keep, built-in or a user's own, checked by asking it.

Each check takes the strategy and raises ContractError with a line that says what broke, where. Strategies are driven as the
loop drives them, with readings made up here; there is no device.
"""

from __future__ import annotations

from collections.abc import Callable, Iterator
from inspect import signature
from math import isfinite, nan
from typing import NamedTuple

import numpy as np
import numpy.typing as npt

from device_models.contract_checks import ContractError
from programming.pulse_grid import staircase_values
from programming.strategy_contract import ACCEPT, GIVE_UP, READ, RESET, SET, CellStrategy, Rules

Floats = npt.NDArray[np.float64]
Check = Callable[[CellStrategy], None]

# Powers of two, so that the edges of the band are exact.
TARGET, TOLERANCE = 2.0**-14, 2.0**-19
# All different, so that no value can stand in for another; the last step of each staircase is a short one.
RULES = Rules(
    set_start=0.75, set_step=0.125, set_stop=1.5625, set_width=100e-9, set_width_step=30e-9, set_width_stop=440e-9,
    reset_start=0.875, reset_step=0.0625, reset_stop=1.78125, reset_width=80e-9, reset_width_step=25e-9,
    reset_width_stop=390e-9, low=2.0**-16, high=2.0**-13, max_pulses=40.0, read_noise=2.0**-21,
)  # fmt: skip
MOST_READS = 64  # readings without a pulse that a strategy may take before it answers otherwise
_GUARD = 8


class Answer(NamedTuple):
    """What a strategy answered: an action, and the pulse [V, s, V] for SET and RESET."""

    action: int
    amplitude: float
    width: float
    gate: float


class Driver:
    """One visit to one cell: keeps the strategy's memory and counts its pulses."""

    def __init__(self, strategy: CellStrategy, guard: float = 0.0, target: float = TARGET) -> None:
        """guard: what lies around the strategy's memory; target [S]."""
        self.strategy, self.target = strategy, target
        self.buffer = np.full(strategy.memory + 2 * _GUARD, guard)
        self.memory: Floats = self.buffer[_GUARD : _GUARD + strategy.memory]
        self.memory[:] = 0.0
        self.pulses = 0

    def ask(self, reading: float) -> Answer:
        """The answer to a reading [S]; counts the pulse. Raises ContractError if it is no answer at all."""
        given = reading if self.strategy.verifies else nan
        try:
            got = self.strategy.decide(self.target, TOLERANCE, given, self.pulses, self.memory, RULES)
            answer = Answer(int(got[0]), float(got[1]), float(got[2]), float(got[3]))
        except (IndexError, TypeError, ValueError) as error:
            detail = str(error).splitlines()[0] if str(error) else "no message"
            raise ContractError(f"strategy {self.strategy.name}: answer: {type(error).__name__}: {detail}") from error
        if answer.action in (SET, RESET):
            self.pulses += 1
        return answer


def _require(holds: bool, strategy: CellStrategy, rule: str, detail: str) -> None:
    if not holds:
        raise ContractError(f"strategy {strategy.name}: {rule}: {detail}")


def _histories() -> Iterator[tuple[float, Floats]]:
    """(target, readings) [S]: to and fro about the target, long runs on one side, and never the same twice."""
    random = np.random.Generator(np.random.Philox(key=20))
    for target in (RULES.low, TARGET, RULES.high):
        outside = target + TOLERANCE * np.array([2.0, -2.0])
        yield target, np.repeat(outside, 20)
        yield target, np.repeat(outside[::-1], 20)
        yield target, np.tile(np.repeat(outside, 3), 6)
        yield target, np.tile(outside, 20)
        yield target, target + TOLERANCE * random.normal(0.0, 4.0, 40)


def _answers(strategy: CellStrategy, guard: float = 0.0) -> list[tuple[Answer, float, Driver]]:
    """Every answer over all histories, with the reading it was given, until the strategy ends or pulses run out."""
    out = []
    for target, readings in _histories():
        driver = Driver(strategy, guard, target)
        for reading in readings:
            answer = driver.ask(float(reading))
            out.append((answer, float(reading), driver))
            if answer.action in (ACCEPT, GIVE_UP) or driver.pulses >= RULES.max_pulses:
                break
    return out


def check_declaration(strategy: CellStrategy) -> None:
    """It has a name and says what it must know; memory, grids and arguments are ones the loop can serve."""
    _require(bool(strategy.name.strip() and strategy.knowledge.strip()), strategy, "declaration", "no name or knowledge")
    _require(strategy.memory >= 0, strategy, "memory", f"{strategy.memory} places")
    _require(strategy.amplitudes in ("one", "staircase", "any"), strategy, "amplitudes", repr(strategy.amplitudes))
    _require(strategy.widths in ("one", "staircase"), strategy, "widths", repr(strategy.widths))
    taken = len(signature(getattr(strategy.decide, "py_func", strategy.decide)).parameters)
    _require(taken == 6, strategy, "decide", f"takes {taken} arguments, must take 6")


def _on_grid(value: float, grid: str, start: float, step: float, stop: float) -> bool:
    if grid == "any":
        return start <= value <= stop
    allowed = staircase_values(start, step, stop) if grid == "staircase" else np.array([start])
    return bool(np.isclose(value, allowed, rtol=1e-12, atol=0.0).any())


def check_answers(strategy: CellStrategy) -> None:
    """Only actions that exist; amplitude and width of a pulse from the grid it declares, within the train's limits."""
    for answer, reading, _ in _answers(strategy):
        at = f"after reading {reading:.4g} S"
        _require(answer.action in (RESET, ACCEPT, SET, GIVE_UP, READ), strategy, "action", f"{answer.action} {at}")
        if answer.action not in (SET, RESET):
            continue
        side = "set" if answer.action == SET else "reset"
        r = RULES._asdict()
        train = (r[f"{side}_start"], r[f"{side}_step"], r[f"{side}_stop"])
        amplitude_fits = _on_grid(answer.amplitude, strategy.amplitudes, *train)
        detail = f"{answer.amplitude!r} V {at} is not of the {side} grid {strategy.amplitudes!r} {train}"
        _require(amplitude_fits, strategy, "amplitude", detail)
        train = (r[f"{side}_width"], r[f"{side}_width_step"], r[f"{side}_width_stop"])
        width_fits = _on_grid(answer.width, strategy.widths, *train)
        detail = f"{answer.width!r} s {at} is not of the {side} grid {strategy.widths!r} {train}"
        _require(width_fits, strategy, "width", detail)
        _require(isfinite(answer.gate) and answer.gate >= 0.0, strategy, "gate", f"{answer.gate!r} V {at}")


def check_direction(strategy: CellStrategy) -> None:
    """With verify: no pulse inside the band, its edges included; outside never accepted, and pushed towards the target."""
    if not strategy.verifies:
        return
    for steps in (-1.0, -0.5, 0.0, 0.5, 1.0):
        answer = Driver(strategy).ask(TARGET + steps * TOLERANCE)
        detail = f"action {answer.action} for a reading {steps:+.1f} tolerances off the target"
        _require(answer.action in (ACCEPT, READ), strategy, "in band", detail)
    for answer, reading, driver in _answers(strategy):
        off = (reading - driver.target) / TOLERANCE
        if abs(off) <= 1.0:
            continue
        wanted = SET if off < 0.0 else RESET
        detail = f"action {answer.action} for a reading {off:+.2f} tolerances off the target"
        _require(answer.action in (wanted, READ, GIVE_UP), strategy, "direction", detail)


def check_repeatable(strategy: CellStrategy) -> None:
    """The same arguments get the same answer, whatever was asked in between."""
    first = [answer for answer, _, _ in _answers(strategy)]
    Driver(strategy).ask(TARGET + 3.0 * TOLERANCE)
    again = [answer for answer, _, _ in _answers(strategy)]
    _require(first == again, strategy, "repeatable", "the same readings got other answers the second time")
    one, other = Driver(strategy), Driver(strategy)
    for steps in (-3.0, -2.5, 2.0, 4.0, -2.0, -5.0):
        left = one.ask(TARGET + steps * TOLERANCE)
        _require(left == other.ask(TARGET + steps * TOLERANCE), strategy, "repeatable", "two cells disturb each other")
        _require(np.array_equal(one.memory, other.memory), strategy, "repeatable", "the same readings, another memory")


def check_memory(strategy: CellStrategy) -> None:
    """It reads and writes no more places than it declares."""
    plain = _answers(strategy)
    for guard in (0.0, 1.0, -3e9):
        guarded = _answers(strategy, guard)
        same = [answer for answer, _, _ in guarded] == [answer for answer, _, _ in plain]
        _require(same, strategy, "memory", f"what lies beyond its {strategy.memory} places changes the answers")
        for _, _, driver in guarded:
            beyond = np.concatenate([driver.buffer[:_GUARD], driver.buffer[_GUARD + strategy.memory :]])
            detail = f"wrote beyond its {strategy.memory} places"
            _require(bool((beyond == guard).all()), strategy, "memory", detail)


def check_ends(strategy: CellStrategy) -> None:
    """It accepts a cell that stays in its band, ends without verify, and never reads for ever."""
    for before in (0, 1, 7):
        driver = Driver(strategy)
        for _ in range(before):
            driver.ask(TARGET - 3.0 * TOLERANCE)
        last = _last_action(driver, TARGET + 0.25 * TOLERANCE)
        ended = last == ACCEPT or not strategy.verifies
        _require(ended, strategy, "end", f"in the band after {before} pulses, never accepted (last action {last})")
        if not strategy.verifies:
            _require(last in (ACCEPT, GIVE_UP), strategy, "end", "never ends, and there is no verify to end it")
    reads = 0
    driver = Driver(strategy)
    while driver.pulses < RULES.max_pulses:
        action = driver.ask(TARGET - 5.0 * TOLERANCE).action
        if action in (ACCEPT, GIVE_UP):
            break
        reads = reads + 1 if action == READ else 0
        _require(reads <= MOST_READS, strategy, "end", f"more than {MOST_READS} readings in a row without a pulse")


def _last_action(driver: Driver, reading: float) -> int:
    """Action after which the strategy ended, or the last one it was allowed."""
    action = READ
    for _ in range(int(RULES.max_pulses) + MOST_READS):
        action = driver.ask(reading).action
        if action in (ACCEPT, GIVE_UP):
            break
    return action


CHECKS: tuple[Check, ...] = (
    check_declaration,
    check_answers,
    check_direction,
    check_repeatable,
    check_memory,
    check_ends,
)


def check_strategy(strategy: CellStrategy) -> None:
    """Every check on a strategy; raises ContractError at the first that fails."""
    for check in CHECKS:
        check(strategy)
