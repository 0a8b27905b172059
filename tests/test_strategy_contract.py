"""The contract of strategies: kept by every one in the catalog, each also equal to its plain twin; broken ones are caught."""

import itertools
from dataclasses import replace

import numpy as np
import pytest

from device_models.contract_checks import ContractError
from programming.catalog import load_strategy, strategy_names
from programming.contract_checks import (
    CHECKS,
    RULES,
    check_answers,
    check_declaration,
    check_direction,
    check_ends,
    check_memory,
    check_repeatable,
    check_strategy,
)
from programming.strategy_contract import ACCEPT, GIVE_UP, READ, RESET, SET
from tests.twins import plain_strategies

PARTS = ("start", "step", "stop", "width", "width_step", "width_stop")
SET_TRAIN = {part: getattr(RULES, f"set_{part}") for part in PARTS}
RESET_TRAIN = {part: getattr(RULES, f"reset_{part}") for part in PARTS}
TARGET, TOLERANCE = 50e-6, 2e-6
BELOW, ABOVE, INSIDE = 40e-6, 60e-6, 51e-6


@pytest.mark.parametrize("name", strategy_names())
@pytest.mark.parametrize("check", CHECKS, ids=lambda check: check.__name__)
def test_strategy_keeps_its_contract(name, check):
    check(load_strategy(name))


def test_catalog_names_are_the_strategies_own():
    for name in strategy_names():
        assert load_strategy(name).name == name


# ---- what the built-in ones do, pulse by pulse


def pulses_of(name, readings, target=TARGET):
    """Answers of a strategy to readings in turn, as (action, amplitude, width)."""
    strategy = load_strategy(name)
    memory = np.zeros(strategy.memory)
    out = []
    for given, reading in enumerate(readings):
        out.append(strategy.decide(target, TOLERANCE, reading, given, memory, RULES)[:3])
    return out


def close(got, expected):
    assert [g[0] for g in got] == [e[0] for e in expected]
    np.testing.assert_allclose([g[1:] for g in got], [e[1:] for e in expected], rtol=1e-12, atol=0)


def test_amplitude_staircase_written_out():
    readings = [BELOW] * 9 + [ABOVE] * 3 + [BELOW] * 2 + [INSIDE]
    up = [0.75, 0.875, 1.0, 1.125, 1.25, 1.375, 1.5, 1.5625, 1.5625]
    expected = [(SET, amplitude, 100e-9) for amplitude in up]
    expected += [(RESET, amplitude, 80e-9) for amplitude in (0.875, 0.9375, 1.0)]
    expected += [(SET, 0.75, 100e-9), (SET, 0.875, 100e-9), (ACCEPT, 0.0, 0.0)]
    close(pulses_of("amplitude_staircase", readings), expected)


def test_width_staircase_written_out():
    readings = [ABOVE] * 15 + [BELOW] * 3 + [INSIDE]
    down = [
        80e-9,
        105e-9,
        130e-9,
        155e-9,
        180e-9,
        205e-9,
        230e-9,
        255e-9,
        280e-9,
        305e-9,
        330e-9,
        355e-9,
        380e-9,
        390e-9,
        390e-9,
    ]
    expected = [(RESET, 0.875, width) for width in down]
    expected += [(SET, 0.75, width) for width in (100e-9, 130e-9, 160e-9)] + [(ACCEPT, 0.0, 0.0)]
    close(pulses_of("width_staircase", readings), expected)


def test_identical_pulses_written_out():
    expected = [(SET, 0.75, 100e-9), (SET, 0.75, 100e-9), (RESET, 0.875, 80e-9), (SET, 0.75, 100e-9), (ACCEPT, 0.0, 0.0)]
    close(pulses_of("identical_pulses", [BELOW, BELOW, ABOVE, BELOW, INSIDE]), expected)


def test_open_loop_written_out():
    for target, amplitude in ((RULES.low, 0.75), (0.5 * (RULES.low + RULES.high), 1.15625), (RULES.high, 1.5625)):
        close(pulses_of("open_loop", [np.nan, np.nan], target), [(SET, amplitude, 100e-9), (ACCEPT, 0.0, 0.0)])


@pytest.mark.parametrize("name", ["identical_pulses", "amplitude_staircase", "width_staircase"])
def test_agrees_with_its_plain_twin(name):
    twin = getattr(plain_strategies, name)
    random = np.random.default_rng(5)
    kinds = set()
    for spread in (0.5, 1.5, 5.0):
        for _ in range(20):
            readings = TARGET + TOLERANCE * np.cumsum(random.normal(0.0, spread, 30))
            readings = readings[: next((i + 1 for i, r in enumerate(readings) if abs(r - TARGET) <= TOLERANCE), 30)]
            got = pulses_of(name, readings)
            for count, answer in enumerate(got, start=1):
                pulse = twin(TARGET, TOLERANCE, list(readings[:count]), SET_TRAIN, RESET_TRAIN)
                close([answer], [(ACCEPT, 0.0, 0.0) if pulse is None else (SET if pulse[0] > 0 else RESET, *pulse[1:])])
                kinds.add(answer[0])
    assert kinds == {ACCEPT, SET, RESET}


def test_open_loop_agrees_with_its_plain_twin():
    for target in np.linspace(RULES.low, RULES.high, 12):
        got = pulses_of("open_loop", [np.nan, np.nan], target)
        first = plain_strategies.open_loop(target, 0, RULES.low, RULES.high, SET_TRAIN)
        assert plain_strategies.open_loop(target, 1, RULES.low, RULES.high, SET_TRAIN) is None
        close(got, [(SET, *first[1:]), (ACCEPT, 0.0, 0.0)])


# ---- proof that the checks catch what breaks the contract

GOOD = load_strategy("amplitude_staircase")
OPEN = load_strategy("open_loop")


def good(*arguments):
    return GOOD.decide(*arguments)


def changed(change):
    """The good strategy with its answer changed by change(answer, arguments)."""
    return lambda *arguments: change(good(*arguments), arguments)


def only_pulses(change):
    return changed(lambda answer, arguments: change(answer) if answer[0] in (SET, RESET) else answer)


def remembers_elsewhere():
    count = itertools.count()
    return only_pulses(lambda a: (a[0], RULES.set_stop if next(count) % 3 and a[0] == SET else a[1], a[2], a[3]))


def draws():
    random = np.random.default_rng(1)
    return only_pulses(lambda a: a if random.random() < 0.9 else STOP)


def beyond_its_memory(target, tolerance, reading, pulses, memory, rules):
    memory.base[8 + 2] = 1.0  # the place after its own two
    return good(target, tolerance, reading, pulses, memory, rules)


def reads_beyond_its_memory(target, tolerance, reading, pulses, memory, rules):
    answer = good(target, tolerance, reading, pulses, memory, rules)
    return STOP if memory.base[8 + 2] == 1.0 else answer


def accepts_late(target, tolerance, reading, pulses, memory, rules):
    return good(target, 2.5 * tolerance, reading, pulses, memory, rules)


def band_without_edges(target, tolerance, reading, pulses, memory, rules):
    return good(target, tolerance * (1 - 1e-12), reading, pulses, memory, rules)


READ_ON, STOP, PULSE = (READ, 0.0, 0.0, 0.0), (GIVE_UP, 0.0, 0.0, 0.0), (SET, 0.75, 100e-9, 0.0)


def instead_of_accepting(other):
    return changed(lambda answer, _: other if answer[0] == ACCEPT else answer)


BREAKAGES = {
    "no name": (check_declaration, {"name": " "}, "declaration"),
    "memory below nothing": (check_declaration, {"memory": -1}, "memory"),
    "a grid that does not exist": (check_declaration, {"amplitudes": "some"}, "amplitudes"),
    "arguments": (check_declaration, {"decide": lambda target, reading: READ_ON}, "takes 2 arguments"),
    "three answers": (check_answers, {"decide": changed(lambda a, _: a[:3])}, "IndexError"),
    "an action that does not exist": (check_answers, {"decide": only_pulses(lambda a: (7, *a[1:]))}, "action: 7"),
    "below the start": (check_answers, {"decide": only_pulses(lambda a: (a[0], 0.5 * a[1], *a[2:]))}, "amplitude"),
    "above the stop": (check_answers, {"decide": only_pulses(lambda a: (a[0], 2.0, *a[2:])), "amplitudes": "any"}, "amplitude"),
    "not a number": (check_answers, {"decide": only_pulses(lambda a: (a[0], np.nan, *a[2:]))}, "amplitude: nan"),
    "off the staircase": (check_answers, {"decide": only_pulses(lambda a: (a[0], a[1] + 1e-6, *a[2:]))}, "amplitude"),
    "the other direction's pulse": (check_answers, {"decide": only_pulses(lambda a: (-a[0], *a[1:]))}, "grid"),
    "a staircase not declared": (check_answers, {"amplitudes": "one"}, "amplitude"),
    "no width": (check_answers, {"decide": only_pulses(lambda a: (a[0], a[1], 0.0, a[3]))}, "width"),
    "negative gate": (check_answers, {"decide": only_pulses(lambda a: (*a[:3], -0.1))}, "gate"),
    "accepts outside": (check_direction, {"decide": accepts_late}, "direction"),
    "does not accept the edge": (check_direction, {"decide": band_without_edges}, "in band"),
    "wrong way": (check_direction, {"decide": only_pulses(lambda a: (-a[0], *a[1:]))}, "direction"),
    "one pulse more": (check_direction, {"decide": instead_of_accepting(PULSE)}, "in band"),
    "remembers elsewhere": (check_repeatable, {"decide": remembers_elsewhere()}, "repeatable"),
    "draws": (check_repeatable, {"decide": draws()}, "repeatable"),
    "less memory than it uses": (check_memory, {"memory": 1}, "memory"),
    "no memory at all": (check_memory, {"memory": 0}, "memory"),
    "writes beyond its memory": (check_memory, {"decide": beyond_its_memory}, "wrote beyond"),
    "reads beyond its memory": (check_memory, {"decide": reads_beyond_its_memory}, "changes the answers"),
    "never accepts": (check_ends, {"decide": instead_of_accepting(READ_ON)}, "never accepted"),
    "gives up what is in the band": (check_ends, {"decide": instead_of_accepting(STOP)}, "end"),
    "reads for ever": (check_ends, {"decide": only_pulses(lambda _: READ_ON)}, "readings in a row"),
}  # fmt: skip


@pytest.mark.parametrize("breakage", BREAKAGES)
def test_a_broken_strategy_is_caught(breakage):
    check, changes, says = BREAKAGES[breakage]
    check(GOOD)
    with pytest.raises(ContractError, match=f"^strategy .*{says}"):
        check(replace(GOOD, **changes))


def test_an_open_loop_that_never_ends_is_caught():
    check_ends(OPEN)
    with pytest.raises(ContractError, match="never ends"):
        check_ends(replace(OPEN, decide=lambda *arguments: (SET, 0.75, 100e-9, 0.0)))


def test_check_strategy_runs_every_check():
    check_strategy(GOOD)
    for check, changes, _ in BREAKAGES.values():
        assert check in CHECKS
        with pytest.raises(ContractError):
            check_strategy(replace(GOOD, **changes))
