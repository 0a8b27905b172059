"""Random numbers by counter: every draw is a pure function of what it is for, so no order and no worker changes a digit.

The generator is Philox4x32-10 (Salmon, Moraes, Dror, Shaw, SC'11: "Parallel random numbers: as easy as 1, 2, 3"). The
64-bit seed is the key. The 128-bit counter is built from die, cell, event index and (purpose, sub-draw), so that a pulse
more or a read fewer in one strategy does not shift the draws of another.

Normals come in two kinds: `normal` by a ziggurat (Marsaglia & Tsang, J. Stat. Softw. 5(8), 2000), the fast one; and
`normal_by_inverse`, the inverse distribution function (Wichura, Algorithm AS 241, Appl. Statist. 37:477, 1988), monotone
in the uniform behind it, for draws that are truncated or compared between two jobs.
"""

from __future__ import annotations

import math

import numpy as np

from device_models.compiled import compiled, compiled_inline

# Purposes keep streams apart. 8 bits. As int64: for plain integers numba would compile everything once for each value.
DEVICE_SPREAD, INITIAL, FAULTS, TARGETS, CYCLE, READ, STRESS, ORDER, CONVERTER, CALIBRATION = np.arange(10)

_MULTIPLIER_0 = np.uint64(0xD2511F53)
_MULTIPLIER_1 = np.uint64(0xCD9E8D57)
_WEYL_0 = np.uint64(0x9E3779B9)
_WEYL_1 = np.uint64(0xBB67AE85)
_LOW_32 = np.uint64(0xFFFFFFFF)
_SHIFT_32 = np.uint64(32)
_ROUNDS = 10


@compiled
def philox_block(counter_0, counter_1, counter_2, counter_3, key_0, key_1):
    """One Philox4x32-10 block: four 32-bit words (as uint64) from a counter of four and a key of two 32-bit words."""
    c0, c1, c2, c3 = np.uint64(counter_0), np.uint64(counter_1), np.uint64(counter_2), np.uint64(counter_3)
    k0, k1 = np.uint64(key_0), np.uint64(key_1)
    for _ in range(_ROUNDS):
        product_0 = c0 * _MULTIPLIER_0
        product_1 = c2 * _MULTIPLIER_1
        c0 = (product_1 >> _SHIFT_32) ^ c1 ^ k0
        c1 = product_1 & _LOW_32
        c2 = (product_0 >> _SHIFT_32) ^ c3 ^ k1
        c3 = product_0 & _LOW_32
        k0 = (k0 + _WEYL_0) & _LOW_32
        k1 = (k1 + _WEYL_1) & _LOW_32
    return c0, c1, c2, c3


@compiled_inline
def keyed_words(seed, die, cell, purpose, event, draw):
    """Two 64-bit words for one draw: (seed; event, cell, die, purpose | sub-draw) -> uint64, uint64.

    seed: uint64. die, cell, event: below 2**32. purpose: below 2**8. draw: below 2**24.
    """
    key = np.uint64(seed)
    tag = (np.uint64(purpose) << np.uint64(24)) | np.uint64(draw)
    w0, w1, w2, w3 = philox_block(np.uint64(event), np.uint64(cell), np.uint64(die), tag, key & _LOW_32, key >> _SHIFT_32)
    return (w1 << _SHIFT_32) | w0, (w3 << _SHIFT_32) | w2


@compiled_inline
def unit_interval(word):
    """A 64-bit word as a float strictly inside (0, 1): the top 53 bits, at the middle of their cell."""
    return (np.float64(np.int64(word >> np.uint64(12))) + 0.5) * 2.220446049250313e-16


@compiled
def uniform(seed, die, cell, purpose, event, draw):
    """One uniform draw, strictly inside (0, 1)."""
    return unit_interval(keyed_words(seed, die, cell, purpose, event, draw)[0])


def _ziggurat_tables() -> tuple[np.ndarray, np.ndarray, np.ndarray]:
    """Edges and heights of 256 strips of equal area under exp(-x*x/2) (Marsaglia & Tsang 2000, section 2)."""
    tail_start = 3.6541528853610088
    area = 0.00492867323399
    density = lambda x: math.exp(-0.5 * x * x)  # noqa: E731
    edges = np.empty(257)
    edges[0] = area / density(tail_start)
    edges[1] = tail_start
    for i in range(2, 256):
        edges[i] = math.sqrt(-2.0 * math.log(area / edges[i - 1] + density(edges[i - 1])))
    edges[256] = 0.0
    heights = np.array([density(x) for x in edges])
    return edges, heights, edges[1:] / edges[:-1]


_EDGES, _HEIGHTS, _RATIOS = _ziggurat_tables()
_TAIL_START = float(_EDGES[1])


@compiled_inline
def _ziggurat(word):
    """The quick part: (accepted, value, strip) from one 64-bit word."""
    strip = np.int64(word & np.uint64(255))
    # bits 11..63 give a signed fraction in (-1, 1); bits 0..7 the strip: disjoint, so independent
    fraction = (np.float64(np.int64(word) >> np.int64(11)) + 0.5) * 2.220446049250313e-16
    return abs(fraction) < _RATIOS[strip], fraction * _EDGES[strip], strip


@compiled
def _ziggurat_rare(value, strip, seed, die, cell, purpose, event, draw):
    """The wedge and the tail (about 1 % of the draws): fresh sub-draws until one is accepted."""
    attempt = draw
    while True:
        attempt += 64
        word_0, word_1 = keyed_words(seed, die, cell, purpose, event, attempt)
        if strip == 0:
            x = -math.log(unit_interval(word_0)) / _TAIL_START
            y = -math.log(unit_interval(word_1))
            if y + y > x * x:
                return math.copysign(_TAIL_START + x, value)
        else:
            height = _HEIGHTS[strip] + unit_interval(word_0) * (_HEIGHTS[strip + 1] - _HEIGHTS[strip])
            if height < math.exp(-0.5 * value * value):
                return value
            accepted, value, strip = _ziggurat(word_1)
            if accepted:
                return value


@compiled_inline
def normal_of_word(word, seed, die, cell, purpose, event, draw):
    """A standard normal from a word already drawn; the rest of the key serves the rare second look."""
    accepted, value, strip = _ziggurat(word)
    if accepted:
        return value
    return _ziggurat_rare(value, strip, seed, die, cell, purpose, event, draw)


@compiled_inline
def normal(seed, die, cell, purpose, event, draw):
    """One standard normal by the ziggurat. Sub-draws closer than 64 apart never share a word."""
    word = keyed_words(seed, die, cell, purpose, event, draw)[0]
    return normal_of_word(word, seed, die, cell, purpose, event, draw)


@compiled
def _ratio(r, a0, a1, a2, a3, a4, a5, a6, a7, b1, b2, b3, b4, b5, b6, b7):
    numerator = ((((((a7 * r + a6) * r + a5) * r + a4) * r + a3) * r + a2) * r + a1) * r + a0
    return numerator / (((((((b7 * r + b6) * r + b5) * r + b4) * r + b3) * r + b2) * r + b1) * r + 1.0)


@compiled
def inverse_normal(probability):
    """Quantile of the standard normal, about 1e-16 relative (Wichura 1988, AS 241, routine PPND16)."""
    q = probability - 0.5
    if abs(q) <= 0.425:
        return q * _ratio(
            0.180625 - q * q,
            3.3871328727963666080, 133.14166789178437745, 1971.5909503065514427, 13731.693765509461125,
            45921.953931549871457, 67265.770927008700853, 33430.575583588128105, 2509.0809287301226727,
            42.313330701600911252, 687.18700749205790830, 5394.1960214247511077, 21213.794301586595867,
            39307.895800092710610, 28729.085735721942674, 5226.4952788528545610,
        )  # fmt: skip
    r = math.sqrt(-math.log(min(probability, 1.0 - probability)))
    if r <= 5.0:
        x = _ratio(
            r - 1.6,
            1.42343711074968357734, 4.63033784615654529590, 5.76949722146069140550, 3.64784832476320460504,
            1.27045825245236838258, 0.241780725177450611770, 0.0227238449892691845833, 7.74545014278341407640e-4,
            2.05319162663775882187, 1.67638483018380384940, 0.689767334985100004550, 0.148103976427480074590,
            0.0151986665636164571966, 5.47593808499534494600e-4, 1.05075007164441684324e-9,
        )  # fmt: skip
    else:
        x = _ratio(
            r - 5.0,
            6.65790464350110377720, 5.46378491116411436990, 1.78482653991729133580, 0.296560571828504891230,
            0.0265321895265761230930, 1.24266094738807843860e-3, 2.71155556874348757815e-5, 2.01033439929228813265e-7,
            0.599832206555887937690, 0.136929880922735805310, 0.0148753612908506148525, 7.86869131145613259100e-4,
            1.84631831751005468180e-5, 1.42151175831644588870e-7, 2.04426310338993978564e-15,
        )  # fmt: skip
    return math.copysign(x, q)


@compiled
def normal_by_inverse(seed, die, cell, purpose, event, draw):
    """One standard normal, monotone in its uniform."""
    return inverse_normal(uniform(seed, die, cell, purpose, event, draw))


@compiled
def truncated_normal(seed, die, cell, purpose, event, draw, limit):
    """A standard normal cut off at +-limit standard deviations (limit 0: always 0), monotone in its uniform."""
    if limit <= 0.0:
        return 0.0
    tail = 0.5 * math.erfc(limit / math.sqrt(2.0))
    return inverse_normal(tail + uniform(seed, die, cell, purpose, event, draw) * (1.0 - 2.0 * tail))
