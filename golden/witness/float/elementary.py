"""float.elementary by MPFR at 53 bits: polynomials interpolated anew from the functions, then the pinned steps.

The coefficients are the interpolation at Chebyshev's points of what the polynomial stands for, in 400 bits, each rounded to
nearest. The kernel and the reference have them as numbers; here they are worked out.
"""

import gmpy2
import numpy
from gmpy2 import mpfr

from float.common_ieee import BINARY64
from operands import Stream

LIBRARIES = ["cryptography", "gmpy2", "numpy"]
COUNT = 1024
HIGH = gmpy2.context(precision=400)


def interpolate(function, low, high, degree: int) -> list:
    """Monomial coefficients, lowest first, through degree + 1 Chebyshev points of [low, high]."""
    n = degree + 1
    angle = [gmpy2.const_pi() * (2 * j + 1) / (2 * n) for j in range(n)]
    nodes = [(low + high) / 2 + (high - low) / 2 * gmpy2.cos(t) for t in angle]
    # Newton's divided differences, then expanded
    table = [function(v) for v in nodes]
    for level in range(1, n):
        for i in range(n - 1, level - 1, -1):
            table[i] = (table[i] - table[i - 1]) / (nodes[i] - nodes[i - level])
    coefficients = [mpfr(0)] * n
    for node, difference in zip(reversed(nodes), reversed(table)):
        shifted = [mpfr(0), *coefficients[:-1]]
        coefficients = [s - node * c for s, c in zip(shifted, coefficients)]
        coefficients[0] += difference
    return coefficients


def cut(x, bits: int):
    """x to this many bits toward zero, and what is left."""
    head = gmpy2.context(precision=bits, round=gmpy2.RoundToZero).plus(x)
    return head, x - head


with HIGH:
    half_ln2 = gmpy2.log(mpfr(2)) / 2
    root = gmpy2.sqrt(mpfr(2))
    widest = ((root - 1) / (root + 1)) ** 2
    eighth = (gmpy2.const_pi() / 4) ** 2

    def of_log(w):
        s = gmpy2.sqrt(w)
        return (gmpy2.log((1 + s) / (1 - s)) / s - 2) / w

    POLYNOMIALS = [
        interpolate(lambda r: (gmpy2.exp(r) - 1 - r) / (r * r), -half_ln2, half_ln2, 9),
        interpolate(of_log, mpfr(0), widest, 6),
        interpolate(lambda w: (gmpy2.sin(gmpy2.sqrt(w)) / gmpy2.sqrt(w) - 1) / w, mpfr(0), eighth, 5),
        interpolate(lambda w: (gmpy2.cos(gmpy2.sqrt(w)) - 1 + w / 2) / (w * w), mpfr(0), eighth, 5),
    ]
    LN2_HIGH, rest = cut(gmpy2.log(mpfr(2)), 33)
    LN2_LOW = rest
    PI_1, rest = cut(gmpy2.const_pi() / 2, 33)
    PI_2, PI_3 = cut(rest, 33)
    LOG2_E, TWO_OVER_PI = 1 / gmpy2.log(mpfr(2)), 2 / gmpy2.const_pi()

with BINARY64.context():
    EXP, LOG, SIN, COS = [[mpfr(c) for c in p] for p in POLYNOMIALS]
    LN2_LOW, PI_3, LOG2_E, TWO_OVER_PI = map(mpfr, (LN2_LOW, PI_3, LOG2_E, TWO_OVER_PI))
    MAGIC = mpfr(3 << 51)


def horner(coefficients, v):
    total = coefficients[-1]
    for c in coefficients[-2::-1]:
        total = total * v + c
    return total


def exp(x):
    k = (x * LOG2_E + MAGIC) - MAGIC
    r = (x - k * LN2_HIGH) - k * LN2_LOW
    return scaled((r * r * horner(EXP, r) + r) + 1, int(k))


def scaled(x, k: int):
    return gmpy2.mul_2exp(x, k) if k >= 0 else gmpy2.div_2exp(x, -k)


def log(x):
    exponent = gmpy2.get_exp(x)
    m = scaled(x, -exponent)
    if m < SQRT_HALF:
        m, exponent = m * 2, exponent - 1
    e = mpfr(exponent)
    s = (m - 1) / (m + 1)
    w = s * s
    return (s * w * horner(LOG, w) + e * LN2_LOW) + (s + s) + e * LN2_HIGH


def turn(x):
    """sin and cos."""
    k = (x * TWO_OVER_PI + MAGIC) - MAGIC
    r = ((x - k * PI_1) - k * PI_2) - k * PI_3
    w = r * r
    s = r * w * horner(SIN, w) + r
    c = (w * w * horner(COS, w) - w / 2) + 1
    match int(k) % 4:
        case 0:
            return s, c
        case 1:
            return c, -s
        case 2:
            return -s, -c
    return -c, s


SQRT_HALF = BINARY64.value(0x3FE6A09E667F3BCD)


def operand(word: int, lowest: int, highest: int):
    power = min(lowest + (word >> 52 & 15), highest)
    return BINARY64.value(word & (1 << 63 | (1 << 52) - 1) | power + 1023 << 52)


def positive(word: int, odd: bool):
    biased = 1022 + (word >> 63) if odd else 1 + (word >> 52 & 0x7FF) % 2046
    return BINARY64.value(word & (1 << 52) - 1 | biased << 52)


def digest(results) -> list[int]:
    bits = numpy.array([float(x) for x in results]).view(numpy.uint64).reshape(-1, 8)
    running = numpy.cumsum(bits, axis=0, dtype=numpy.uint64)
    return [int(v) for v in numpy.concatenate([running[-1], running.sum(axis=0, dtype=numpy.uint64)])]


def words(seed: int, size: int) -> list[int]:
    stream = Stream("float.elementary", seed, size)
    drawn = [stream.words(COUNT) for _ in range(3)]
    with BINARY64.context():
        powers = [exp(operand(w, -6, 8)) for w in drawn[0]]
        logarithms = [log(positive(w, seed % 2 == 1)) for w in drawn[1]]
        sines, cosines = zip(*(turn(operand(w, -4, 11)) for w in drawn[2]))
    return [word for results in (powers, logarithms, sines, cosines) for word in digest(results)]
