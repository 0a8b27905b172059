"""Plain twin of device_models.random_numbers: Philox4x32-10 in Python integers, normals by the same published methods.

Imports nothing from the package.
"""

import math

from scipy.special import ndtri

DEVICE_SPREAD, INITIAL, FAULTS, TARGETS, CYCLE, READ, STRESS = range(7)
WORD = 0xFFFFFFFF


def philox(counter, key):
    """Salmon et al., SC'11, table 2: ten rounds of two 32-bit multiplications."""
    c, k = list(counter), list(key)
    for _ in range(10):
        high_0, low_0 = divmod(0xD2511F53 * c[0], 1 << 32)
        high_1, low_1 = divmod(0xCD9E8D57 * c[2], 1 << 32)
        c = [high_1 ^ c[1] ^ k[0], low_1, high_0 ^ c[3] ^ k[1], low_0]
        k = [(k[0] + 0x9E3779B9) & WORD, (k[1] + 0xBB67AE85) & WORD]
    return c


def words(seed, die, cell, purpose, event, draw):
    w = philox((event, cell, die, purpose << 24 | draw), (seed & WORD, seed >> 32))
    return w[1] << 32 | w[0], w[3] << 32 | w[2]


def unit(word):
    return ((word >> 12) + 0.5) / 2.0**52


def uniform(*key):
    return unit(words(*key)[0])


def truncated_normal(seed, die, cell, purpose, event, draw, limit):
    """Inverse distribution function of a normal cut off at +-limit."""
    tail = 0.5 * math.erfc(limit / math.sqrt(2))
    return float(ndtri(tail + uniform(seed, die, cell, purpose, event, draw) * (1 - 2 * tail)))


def bell(x):
    return math.exp(-x * x / 2)


# Marsaglia & Tsang (2000): 256 strips of equal area, the lowest with the tail beyond R.
R, AREA = 3.6541528853610088, 0.00492867323399
EDGES = [AREA / bell(R), R]
while len(EDGES) < 256:
    EDGES.append(math.sqrt(-2 * math.log(AREA / EDGES[-1] + bell(EDGES[-1]))))
EDGES.append(0.0)


def normal_of_word(word, seed, die, cell, purpose, event, draw):
    while True:
        strip = word & 255
        signed = (word if word < 1 << 63 else word - (1 << 64)) >> 11
        fraction = (signed + 0.5) / 2.0**52
        x = fraction * EDGES[strip]
        if abs(fraction) < EDGES[strip + 1] / EDGES[strip]:
            return x
        while True:
            draw += 64
            first, second = words(seed, die, cell, purpose, event, draw)
            if strip > 0:
                height = bell(EDGES[strip]) + unit(first) * (bell(EDGES[strip + 1]) - bell(EDGES[strip]))
                if height < bell(x):
                    return x
                word = second
                break
            extra = -math.log(unit(first)) / R
            if -2 * math.log(unit(second)) > extra * extra:
                return math.copysign(R + extra, x)


def normal(*key):
    return normal_of_word(words(*key)[0], *key)
