"""The counter-based generator against published vectors, and its draws against the laws they stand for.

Philox4x32-10 and its known-answer vectors: Salmon, Moraes, Dror, Shaw, SC'11 (vectors as in the reference test files of
that paper, reproduced independently). Statistics on fixed seeds: 4 standard errors, or a test at the stated alpha.
"""

import numpy as np
import pytest
from scipy import stats
from scipy.special import ndtri

from device_models import random_numbers
from device_models.compiled import compiled
from device_models.random_numbers import (
    CYCLE,
    READ,
    inverse_normal,
    keyed_words,
    normal,
    normal_of_word,
    philox_block,
    truncated_normal,
    uniform,
    unit_interval,
)
from tests.twins import plain_random as twin

SEED = np.uint64(20_240_607)
ALPHA = 1e-4  # chance that a right generator would fail a test of fit
COUNT = 2_000_000

PHILOX_4X32 = [
    ((0, 0, 0, 0), (0, 0), "6627e8d5 e169c58d bc57ac4c 9b00dbd8"),
    ((0xFFFFFFFF,) * 4, (0xFFFFFFFF,) * 2, "408f276d 41c83b0e a20bc7c6 6d5451fd"),
    (
        (0x243F6A88, 0x85A308D3, 0x13198A2E, 0x03707344),
        (0xA4093822, 0x299F31D0),
        "d16cfe09 94fdcceb 5001e420 24126ea1",
    ),
]
PHILOX_4X64_OF_ZERO = "16554d9eca36314c db20fe9d672d0fdc d7e772cee186176b 7e68b68aec7ba23b"
PHILOX_4X64_OF_ONE = "02f4ba6408e4d89b 3dd62b0b9ca8c5b2 1c8667a55d902e79 907d7a052fd5b4dc"


def hexadecimal(words, digits=8):
    return " ".join(f"{int(word):0{digits}x}" for word in words)


@compiled
def fill_uniforms(seed, purpose, cells, events, out):
    for cell in range(cells):
        for event in range(events):
            out[cell * events + event] = uniform(seed, 3, cell, purpose, event, 0)


@compiled
def fill_normals(seed, purpose, cells, events, out):
    for cell in range(cells):
        for event in range(events):
            out[cell * events + event] = normal(seed, 3, cell, purpose, event, 0)


@compiled
def fill_neighbours(seed, die, cell, purpose, event, draw, step, out):
    """Uniforms whose keys count up in the places where `step` is 1."""
    for i in range(out.size):
        out[i] = uniform(
            seed + np.uint64(i * step[0]),
            die + i * step[1],
            cell + i * step[2],
            purpose + i * step[3],
            event + i * step[4],
            draw + i * step[5],
        )


@compiled
def fill_read_words(seed, normals, uniforms):
    """What one read uses of one block: a normal of its first word and a uniform of its second."""
    for event in range(normals.size):
        word, other = keyed_words(seed, 0, 11, READ, event, 0)
        normals[event] = normal_of_word(word, seed, 0, 11, READ, event, 0)
        uniforms[event] = unit_interval(other)


@pytest.fixture(scope="module")
def uniforms():
    out = np.empty(COUNT)
    fill_uniforms(SEED, CYCLE, 200, COUNT // 200, out)
    return out


@pytest.fixture(scope="module")
def normals():
    out = np.empty(COUNT)
    fill_normals(SEED, CYCLE, 200, COUNT // 200, out)
    return out


def within(values, expected, errors=4.0):
    """The mean of a sample within that many of its standard errors."""
    return abs(values.mean() - expected) < errors * values.std() / np.sqrt(values.size)


# ---- words


@pytest.mark.parametrize(("counter", "key", "words"), PHILOX_4X32)
def test_known_answers(counter, key, words):
    assert hexadecimal(philox_block(*map(np.uint64, counter), *map(np.uint64, key))) == words
    assert hexadecimal(twin.philox(counter, key)) == words


def test_numpy_has_the_other_variant_and_counts_first():
    # numpy.random.Philox is 4x64-10 and adds one to its counter before the first block
    assert hexadecimal(np.random.Philox(counter=0, key=0).random_raw(4), 16) == PHILOX_4X64_OF_ONE
    assert hexadecimal(np.random.Philox(counter=2**256 - 1, key=0).random_raw(4), 16) == PHILOX_4X64_OF_ZERO
    ours = {hexadecimal(keyed_words(np.uint64(0), 0, 0, 0, event, 0), 16) for event in (0, 1)}
    theirs = PHILOX_4X64_OF_ZERO.split() + PHILOX_4X64_OF_ONE.split()
    assert not any(word in pair for pair in ours for word in theirs)
    assert hexadecimal(keyed_words(np.uint64(0), 0, 0, 0, 0, 0), 16) == "e169c58d6627e8d5 9b00dbd8bc57ac4c"


def test_every_draw_against_the_twin():
    keys = np.random.default_rng(5)
    for _ in range(3000):
        seed = int(keys.integers(2**64, dtype=np.uint64))
        die, cell, event = (int(v) for v in keys.integers(2**32, size=3))
        purpose, draw = int(keys.integers(10)), int(keys.integers(64))
        key = (seed, die, cell, purpose, event, draw)
        ours = (np.uint64(seed), die, cell, purpose, event, draw)
        assert tuple(int(word) for word in keyed_words(*ours)) == twin.words(*key)
        assert uniform(*ours) == twin.uniform(*key)
        assert normal(*ours) == pytest.approx(twin.normal(*key), rel=1e-14, abs=0)
        expected = twin.truncated_normal(*key, 2.5)
        assert truncated_normal(*ours, 2.5) == pytest.approx(expected, rel=1e-13, abs=0)


def test_purposes_do_not_share_streams():
    names = [name for name in vars(random_numbers) if name.isupper() and not name.startswith("_")]
    assert {"DEVICE_SPREAD", "INITIAL", "FAULTS", "TARGETS", "CYCLE", "READ", "STRESS"} <= set(names)
    codes = [getattr(random_numbers, name) for name in names]
    assert len(set(codes)) == len(codes)
    for name in ("DEVICE_SPREAD", "INITIAL", "FAULTS", "TARGETS", "CYCLE", "READ", "STRESS"):
        assert getattr(random_numbers, name) == getattr(twin, name)


def test_no_two_keys_in_a_box_share_a_word():
    words = set()
    for die in range(3):
        for cell in range(20):
            for purpose in range(8):
                for event in range(10):
                    words.update(int(word) for word in keyed_words(SEED, die, cell, purpose, event, 0))
    assert len(words) == 2 * 3 * 20 * 8 * 10


# ---- uniforms


def test_uniforms(uniforms):
    assert uniforms.min() > 0.0
    assert uniforms.max() < 1.0
    for power in range(1, 5):
        assert within(uniforms**power, 1.0 / (power + 1))
    assert stats.kstest(uniforms, "uniform").pvalue > ALPHA
    counts = np.bincount((uniforms * 4096).astype(int), minlength=4096)
    assert ALPHA < stats.chisquare(counts).pvalue < 1.0 - ALPHA  # too even is wrong as well


def test_the_ends_of_the_unit_interval():
    assert unit_interval(np.uint64(0)) == 2.0**-53
    assert unit_interval(np.uint64(2**64 - 1)) == 1.0 - 2.0**-53


# a step of one in each part of the key by itself, and in two at once: seed, die, cell, purpose, event, sub-draw
NEIGHBOURS = {
    "seed": (1, 0, 0, 0, 0, 0),
    "die": (0, 1, 0, 0, 0, 0),
    "cell": (0, 0, 1, 0, 0, 0),
    "event": (0, 0, 0, 0, 1, 0),
    "sub-draw": (0, 0, 0, 0, 0, 1),
    "cell and event": (0, 0, 1, 0, 1, 0),
    "die and cell": (0, 1, 1, 0, 0, 0),
}


@pytest.mark.parametrize("place", NEIGHBOURS)
def test_neighbouring_keys_are_uncorrelated(place):
    u = np.empty(400_001)
    fill_neighbours(SEED, 2, 5, READ, 9, 0, np.array(NEIGHBOURS[place]), u)
    z = ndtri(u)
    for values in (z - z.mean(), z * z - (z * z).mean()):
        for lag in (1, 2, 64):
            correlation = (values[:-lag] * values[lag:]) / values.var()
            assert within(correlation, 0.0)


def test_purposes_are_uncorrelated():
    drawn = np.empty((10, 200_000))
    for purpose in range(10):
        fill_uniforms(SEED, purpose, 20, 10_000, drawn[purpose])
    correlations = np.corrcoef(drawn)[np.triu_indices(10, 1)]
    assert np.abs(correlations).max() < 4.0 / np.sqrt(200_000)
    assert stats.kstest(correlations * np.sqrt(200_000), "norm").pvalue > ALPHA


def test_both_words_of_a_read_are_independent():
    z, u = np.empty(500_000), np.empty(500_000)
    fill_read_words(SEED, z, u)
    for moment in (z, np.abs(z)):
        assert within((moment - moment.mean()) * (u - 0.5), 0.0)
    assert stats.kstest(u, "uniform").pvalue > ALPHA


# ---- normals


def test_normals(normals):
    for power, moment in ((1, 0.0), (2, 1.0), (3, 0.0), (4, 3.0), (5, 0.0), (6, 15.0), (8, 105.0)):
        assert within(normals**power, moment)
    assert stats.kstest(normals, "norm").pvalue > ALPHA
    counts = np.bincount((stats.norm.cdf(normals) * 2048).astype(int), minlength=2048)
    assert ALPHA < stats.chisquare(counts).pvalue < 1.0 - ALPHA


@pytest.mark.parametrize("limit", [1.0, 2.0, 3.0, 3.6541528853610088, 4.0, 4.5])
def test_tails_of_the_normals(normals, limit):
    # the ziggurat changes method at 3.654
    for beyond in (normals > limit, normals < -limit):
        expected = stats.norm.sf(limit) * normals.size
        assert abs(beyond.sum() - expected) < 4.0 * np.sqrt(expected)


def test_shape_of_the_tail(normals):
    beyond = np.abs(normals[np.abs(normals) > 3.6541528853610088])
    law = stats.truncnorm(3.6541528853610088, np.inf)
    assert beyond.size > 400
    assert stats.kstest(beyond, law.cdf).pvalue > ALPHA


def test_normals_of_neighbouring_keys_are_uncorrelated(normals):
    table = normals.reshape(200, -1)
    for first, second in ((table[:, :-1], table[:, 1:]), (table[:-1], table[1:])):
        assert within((first * second).ravel(), 0.0)
        assert within(((first**2 - 1.0) * (second**2 - 1.0)).ravel(), 0.0)


# ---- quantiles


def test_inverse_normal_against_a_library():
    # Wichura, Appl. Statist. 37:477 (1988), claims about 1e-16
    low = np.concatenate([np.geomspace(1e-300, 0.499, 4001), np.linspace(0.01, 0.4999, 1001)])
    ours = np.array([inverse_normal(p) for p in low])
    np.testing.assert_allclose(ours, ndtri(low), rtol=1e-14, atol=0)
    mirrored = np.array([inverse_normal(1.0 - p) for p in low[low > 1e-10]])
    np.testing.assert_allclose(mirrored, ndtri(1.0 - low[low > 1e-10]), rtol=1e-14, atol=0)
    assert inverse_normal(0.5) == 0.0


@pytest.mark.parametrize("limit", [0.5, 2.0, 3.0, 5.0])
def test_truncated_normals(limit):
    law = stats.truncnorm(-limit, limit)
    drawn = np.array([truncated_normal(SEED, 0, cell, 0, 4, 0, limit) for cell in range(20_000)])
    assert np.abs(drawn).max() <= limit
    assert stats.kstest(drawn, law.cdf).pvalue > ALPHA
    assert within(drawn, 0.0)
    assert within(drawn**2, law.var())
    # draw by draw: the quantile of the uniform behind it
    behind = np.array([uniform(SEED, 0, cell, 0, 4, 0) for cell in range(2000)])
    np.testing.assert_allclose(drawn[:2000], law.ppf(behind), rtol=1e-10, atol=0)


def test_no_truncated_spread_at_limit_zero():
    assert truncated_normal(SEED, 0, 1, 0, 0, 0, 0.0) == 0.0
