"""Half-select bias schemes: voltages, counts, energies and disturb doses of the real loop against circuit laws.

Elementary circuit laws (derived; the energies of V/2 and V/3 were also found by brute force elsewhere). Source of the
size limits of passive arrays: Flocke & Noll, ESSCIRC 2007; of the schemes: A. Chen, IEEE TED 60:1318 (2013) (both from
memory). Selected word line at V, selected bit line at 0; the voltage of a cell is word line less bit line.
"""

from dataclasses import replace
from fractions import Fraction
from math import log2

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from device_models.catalog import load_device
from device_models.resistance_laws import LINEAR_CONDUCTANCE
from device_models.windows import NONE
from programming.bias import SCHEMES, BiasScheme
from programming.job import PulseTrain, Targets
from programming.run import program_dies
from programming.strategy_contract import RESET, SET
from tests.jobs import NO_NOISE, cell_of, job, quiet_verify
from tests.outside.plugin_jobs import plugin_job, step_targets

V, G, WIDTH = 2.0, 10e-6, 100e-9
UNIT = V * V * G * WIDTH  # 4 pJ
PARTS = ("selected", "half_selected", "rest", "verify", "lines", "supply")


def approx(value, rel=1e-12):
    return pytest.approx(value, rel=rel, abs=0)


# ---- voltages and counts


def by_lines(scheme, rows, columns, row, column):
    """Cell voltages as fractions of V, from the voltages of the lines, exactly."""
    word, bit = Fraction(scheme.word), Fraction(scheme.bit)
    words = [Fraction(1) if r == row else word for r in range(rows)]
    bits = [Fraction(0) if c == column else bit for c in range(columns)]
    return {(r, c): words[r] - bits[c] for r in range(rows) for c in range(columns)}


def check_classes(scheme, rows, columns, row, column):
    found = {"selected": [], "same_row": [], "same_column": [], "rest": []}
    for (r, c), voltage in by_lines(scheme, rows, columns, row, column).items():
        kind = {(True, True): "selected", (True, False): "same_row", (False, True): "same_column"}
        found[kind.get((r == row, c == column), "rest")].append(voltage)
    assert {kind: len(voltages) for kind, voltages in found.items()} == scheme.class_counts(rows, columns)
    assert set(found["selected"]) == {Fraction(1)}
    for kind, fraction in (("same_row", scheme.same_row), ("same_column", scheme.same_column), ("rest", scheme.rest)):
        # the only rounding is that of one subtraction of doubles
        assert all(fraction == float(voltage) for voltage in found[kind])


fractions = st.floats(0.0, 1.0)


@settings(derandomize=True)
@given(fractions, fractions, st.integers(1, 6), st.integers(1, 6), st.data())
def test_any_point_of_the_plane(word, bit, rows, columns, data):
    row, column = data.draw(st.integers(0, rows - 1)), data.draw(st.integers(0, columns - 1))
    check_classes(BiasScheme("custom", word, bit), rows, columns, row, column)


@pytest.mark.parametrize("name", SCHEMES)
def test_named_schemes(name):
    check_classes(SCHEMES[name], 5, 7, 2, 6)


def test_the_table_of_schemes():
    # scheme: unselected word and bit lines; same row, same column, rest, as fractions of V
    third = Fraction(1, 3)
    table = {
        "V/2": (Fraction(1, 2), Fraction(1, 2), Fraction(1, 2), Fraction(1, 2), Fraction(0)),
        "V/3": (third, 2 * third, third, third, -third),
        "grounded": (Fraction(0), Fraction(0), Fraction(1), Fraction(0), Fraction(0)),
    }
    assert set(table) == set(SCHEMES)
    for name, expected in table.items():
        scheme = SCHEMES[name]
        got = (scheme.word, scheme.bit, scheme.same_row, scheme.same_column, scheme.rest)
        for value, exact in zip(got, expected, strict=True):
            # zeros and halves exactly, thirds to the last digit of a number of size 1
            assert abs(Fraction(value) - exact) <= (Fraction(1, 2**53) if exact.denominator == 3 else 0)
    assert SCHEMES["V/3"].class_counts(64, 32) == {"selected": 1, "same_row": 31, "same_column": 63, "rest": 63 * 31}


# ---- energies of linear cells that one pulse each does not move


def idle_job(rows, columns, bias, **changes):
    """One SET pulse of 2 V and 100 ns on every cell, far below its threshold; two reads that cost next to nothing."""
    cell = {"overrides": {"v_on": -9.0, "v_off": 9.0}, "spreads": {}, "cycle": None, "initial_S": G, "initial_spread": 0.0}
    settings = {
        "cell": cell_of(load_device("voltage_threshold"), "demo_oxide", noise=NO_NOISE, **cell | changes.pop("cell", {})),
        "strategy": "identical_pulses",
        "bias": bias,
        "verify": quiet_verify(),
        "targets": Targets("levels", 90e-6, 90e-6, np.array([90e-6])),
        "set": PulseTrain(V, 0.0, V, WIDTH),
        "reset": PulseTrain(V, 0.0, V, WIDTH),
        "max_pulses": 1,
    }
    return job(rows, columns, **settings | changes)


def energies(a_job):
    """Energy of each part per pulse, in units of V^2 G t, and the final conductances."""

    def keep(outcome):
        assert (outcome.pulses == 1).all()
        assert not outcome.disturbance_S.any()
        return dict(zip(PARTS, outcome.energy_J / outcome.pulses.size / UNIT, strict=True)), outcome.final_S.copy()

    return next(program_dies(a_job, 1, 1, keep))


def dissipated(parts):
    return parts["selected"] + parts["half_selected"] + parts["rest"]


# rows, columns, scheme: dissipated and drawn from supplies that cannot sink, pJ
ENERGIES = [
    (4, 4, "V/2", 10.0, 13.0),
    (4, 4, "V/3", 10.66667, 13.33333),
    (4, 4, "grounded", 16.0, 16.0),
    (64, 64, "V/2", 130.0, 193.0),
    (64, 64, "V/3", 1824.0, 3560.0),
    (64, 64, "grounded", 256.0, 256.0),
    (128, 64, "V/2", 194.0, None),
    (128, 64, "V/3", 3644.44444, None),
    (128, 64, "grounded", 256.0, 256.0),
    (128, 128, "V/2", 258.0, 385.0),
    (128, 128, "V/3", 7285.33333, None),
    (128, 128, "grounded", 512.0, 512.0),
]


def laws(name, M, N):
    """Dissipated and drawn energy over V^2 G t of M word lines and N bit lines."""
    return {
        "V/2": (1 + (M + N - 2) / 4, 1 + (N - 1) / 2 + (M - 1) / 4),
        "V/3": (1 + (M * N - 1) / 9, 1 + (N - 1) / 3 + 2 / 9 * (N - 1) * (M - 2)),
        "grounded": (N, N),
    }[name]


@pytest.mark.parametrize(("rows", "columns", "name", "total", "drawn"), ENERGIES)
def test_energy_of_uniform_cells(rows, columns, name, total, drawn):
    parts, _ = energies(idle_job(rows, columns, SCHEMES[name]))
    law_total, law_drawn = laws(name, rows, columns)
    assert dissipated(parts) == approx(law_total)
    assert parts["supply"] == approx(law_drawn)
    assert parts["selected"] == approx(1.0)
    assert parts["verify"] == approx(2 * columns * 0.2**2 / V**2)  # the whole word line, read twice
    assert dissipated(parts) * 4.0 == approx(total, rel=1e-6)
    if drawn is not None:
        assert parts["supply"] * 4.0 == approx(drawn, rel=1e-6)


def test_which_scheme_burns_more():
    # V/3 burns more than V/2 in every linear square array from 4 x 4 on
    for size, more in ((3, False), (4, True), (16, True)):
        third, half = (dissipated(energies(idle_job(size, size, SCHEMES[name]))[0]) for name in ("V/3", "V/2"))
        assert (third > half) == more


@pytest.mark.parametrize(
    ("word", "bit"), [(0.5, 0.5), (1 / 3, 2 / 3), (0.0, 0.0), (0.4, 0.7), (0.7, 0.4), (1.0, 0.0), (0.25, 1.0)]
)
def test_energy_at_any_point_of_the_plane(word, bit):
    """Every rail by itself, from Kirchhoff: it delivers its voltage times what flows out, and nothing where it flows in."""
    M, N = 9, 14
    parts, _ = energies(idle_job(M, N, BiasScheme("custom", word, bit)))
    row, column, rest = 1.0 - bit, word, word - bit
    assert parts["half_selected"] == approx((N - 1) * row**2 + (M - 1) * column**2)
    assert parts["rest"] == approx((M - 1) * (N - 1) * rest**2)
    out_of_word_rail = (M - 1) * column + (M - 1) * (N - 1) * rest
    out_of_bit_rail = -(N - 1) * row - (M - 1) * (N - 1) * rest
    drawn = 1.0 + (N - 1) * row + max(word * out_of_word_rail, 0.0) + max(bit * out_of_bit_rail, 0.0)
    assert parts["supply"] == approx(drawn)
    # Tellegen: with rails that can sink, the sources deliver what the cells dissipate
    delivered = 1.0 + (N - 1) * row + word * out_of_word_rail + bit * out_of_bit_rail
    assert dissipated(parts) == approx(delivered)
    assert parts["supply"] >= dissipated(parts) * (1.0 - 1e-12)


@pytest.mark.parametrize("name", SCHEMES)
def test_energy_of_scattered_cells(name):
    """Each cell is selected once and half-selected by all others: the law holds with the mean conductance."""
    M, N = 24, 40
    parts, final = energies(idle_job(M, N, SCHEMES[name], cell={"initial_S": 50e-6, "initial_spread": 0.2}))
    mean = final.mean() / G
    assert final.std() / final.mean() > 0.15
    assert parts["selected"] == approx(mean)
    assert dissipated(parts) == approx(mean * laws(name, M, N)[0])


@pytest.mark.parametrize(("kappa", "size"), [(10.0, 6), (100.0, 51), (1000.0, 501)])
def test_nonlinear_cells_half_select_as_much_at_a_larger_size(kappa, size):
    """I(V) / I(V/2) = kappa: half-select current equals selected current at N = kappa/2 + 1, a square array under V/2."""
    values = {"nonlinearity": log2(kappa) - 1.0, "dead_zone": 1.5, "reference": 0.2, "offset": 1e-6}
    cell = {"overrides": values, "initial_S": 1e-6, "initial_spread": 0.0}
    a_job = plugin_job(
        rows=size,
        columns=size,
        cell=cell,
        set=PulseTrain(1.0, 0.0, 1.0, WIDTH),
        targets=step_targets(5.0, 5.0),
        max_pulses=1,
    )
    # the plug-in's functions serve for both kinds of cell
    a_job = replace(a_job, cell=replace(a_job.cell, model=replace(a_job.cell.model, ohmic=False)))
    energy = next(program_dies(a_job, 1, 1, lambda o: o.energy_J.copy()))
    selected, half, rest = energy[:3]
    current = half / 0.5 / (selected / 1.0)  # power over voltage, half-selected against selected
    assert current == approx(1.0)
    assert rest == 0.0
    # a sum of up to 251,001 equal terms
    assert selected == approx(1e-6 * 5.0 ** (log2(kappa) - 1.0) * WIDTH * size * size, rel=1e-11)


# ---- how often a cell is half-selected while the whole array is programmed once

HIGH, P = 3.0, 10  # pulse voltage [V]; pulses per cell
THRESHOLD, SPEED, SPAN = 0.9, 1.35e-7, 3e-9  # dx/dt = k (|v| / threshold - 1); in 100 ns at 1 V 5e-7 of the span


def step_at(voltage):
    """Change of x [m] by one pulse, without window."""
    return SPEED * (voltage / THRESHOLD - 1.0) * WIDTH if voltage > THRESHOLD else 0.0


def moved(name, passes=1, back=1.0, rows=64, columns=64, direction=SET, speed=SPEED):
    """Run an array of cells that only count: way of each cell in the direction of its pulses [m], and the outcome's arrays.

    back: speed against that direction over the speed along it.
    """
    values = {"R_on": 1e4, "R_off": 1e6, "x_on": 0.0, "x_off": SPAN, "v_on": -THRESHOLD, "v_off": THRESHOLD}
    values |= {"k_on": -speed * (1.0 if direction == SET else back), "k_off": speed * (back if direction == SET else 1.0)}
    values |= {"alpha_on": 1.0, "alpha_off": 1.0, "window": NONE, "law": LINEAR_CONDUCTANCE}
    train = PulseTrain(HIGH, 0.0, HIGH, WIDTH)
    target = 90e-6 if direction == SET else 10e-6
    settings = {"set": train, "reset": train, "targets": Targets("levels", target, target, np.array([target]))}
    settings["cell"] = {"overrides": values, "initial_S": 50e-6}
    a_job = idle_job(rows, columns, SCHEMES[name], max_pulses=P // passes, passes=passes, **settings)

    def keep(outcome):
        assert (outcome.pulses == P).all()
        to_metres = direction * SPAN / (100e-6 - 1e-6)
        return (outcome.final_S - 50e-6) * to_metres, outcome.disturbance_S * to_metres, outcome.dose_share.copy()

    return next(program_dies(a_job, 1, 1, keep))


# pulses P, array M x N: (M + N - 2) P half-selects under V/2; (M N - 1) P under V/3, of which (M - 1)(N - 1) P reversed
@pytest.mark.parametrize(
    ("name", "half", "reversed_half"),
    [("V/2", 1260, 0), ("V/3", 1260, 39690), ("grounded", 630, 0)],
)
@pytest.mark.parametrize("passes", [1, 2])
@pytest.mark.parametrize("direction", [SET, RESET])
def test_disturb_dose_of_an_array_programmed_once(name, half, reversed_half, passes, direction):
    seen = {"V/2": HIGH / 2, "V/3": HIGH / 3, "grounded": HIGH}[name]
    strong, weak = (moved(name, passes, ratio, direction=direction)[0] for ratio in (1.0, 0.25))
    back = (weak - strong) / (0.75 * step_at(HIGH / 3))
    forth = (strong - P * step_at(HIGH)) / step_at(seen) + back
    np.testing.assert_allclose(forth, half, rtol=1e-8, atol=0)
    if reversed_half:
        np.testing.assert_allclose(back, reversed_half, rtol=1e-8, atol=0)
        assert half + reversed_half == 40950
    else:
        assert not back.any()


@pytest.mark.parametrize(("size", "faster"), [(8, 1500.0), (10, 1000.0)])
@pytest.mark.parametrize("passes", [1, 2])
def test_disturb_dose_of_debts_so_large_that_their_order_is_replayed(size, faster, passes):
    """Steps so long that every line closes records of its own: replayed in order, the doses still sum up."""
    strong, weak = (moved("V/3", passes, ratio, size, size, speed=faster * SPEED)[0] for ratio in (1.0, 0.25))
    back = (weak - strong) / (0.75 * faster * step_at(HIGH / 3))
    forth = (strong - P * faster * step_at(HIGH)) / (faster * step_at(HIGH / 3)) + back
    np.testing.assert_allclose(back, (size - 1) ** 2 * P, rtol=1e-12, atol=0)
    np.testing.assert_allclose(forth, 2 * (size - 1) * P, rtol=1e-12, atol=0)


@pytest.mark.parametrize("direction", [SET, RESET])
@pytest.mark.parametrize("name", ["V/2", "V/3"])
def test_disturbance_counts_from_the_last_own_pulse(name, direction):
    """Programmed row by row, a cell is disturbed by the pulses on the cells after it: their number by class is known."""
    M, N = 20, 32
    seen = {"V/2": HIGH / 2, "V/3": HIGH / 3}[name]
    _, disturbance, share = moved(name, rows=M, columns=N, direction=direction)
    row, column = np.divmod(np.arange(M * N), N)
    same_row, same_column = (N - 1 - column) * P, (M - 1 - row) * P
    rest = (M * N - 1 - np.arange(M * N)) * P - same_row - same_column
    if name == "V/2":
        rest = np.zeros_like(rest)
    expected = (same_row + same_column - rest) * step_at(seen)
    np.testing.assert_allclose(disturbance[:-1], expected[:-1], rtol=1e-7, atol=0)
    assert disturbance[-1] == 0.0
    assert not share[-1].any()
    counts = np.stack([same_row, same_column, rest], axis=1)[:-1]
    np.testing.assert_allclose(share[:-1], counts / counts.sum(axis=1, keepdims=True), rtol=1e-9, atol=0)
