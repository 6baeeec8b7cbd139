"""float.powcast by MPFR's correctly rounded power (not by the kernel's own steps)."""

import gmpy2
from gmpy2 import mpfr

from float.chain64 import RECIPE
from float.common_ieee import BINARY64
from operands import Stream

LIBRARIES = ["cryptography", "gmpy2"]
MASK = (1 << 64) - 1
PUBLISHED = [53, 68, 3, 107, -3, 52, 78]


def operand(w: int, z: int):
    fraction = z & (1 << 52) - 1
    kind = (w >> 60) & 3
    if kind < 2:
        significand, unit, bound = (1 << 52) + (fraction >> 3), -52, 4096
    else:
        significand, unit, bound = (1 << 52) + fraction, -52 if kind == 2 else -53, 961
    y = w % bound
    return gmpy2.div_2exp(mpfr(significand), -unit), -y if w >> 63 else y


def fold(bits: int, integer: int) -> int:
    f = 0
    for word in [bits, integer] * 8:
        f = (f << 7 & MASK | f >> 57) + word & MASK
    return f


def words(seed: int, size: int) -> list[int]:
    stream = Stream("float.powcast", seed, size)
    with gmpy2.context(BINARY64.context()):
        starts, rows = RECIPE.draw(stream, 8, False)
        states = RECIPE.walk(starts, rows, 48)
        powers = [(mpfr("1.1"), 16 * y) for y in PUBLISHED]
        powers += [operand(*stream.words(2)) for _ in range(48 - len(PUBLISHED))]
        results = [x ** gmpy2.div_2exp(mpfr(y), 4) for x, y in powers]
        integers = [int(gmpy2.trunc(r)) & MASK for r in results]
        bits = [BINARY64.bits(r) for r in results]
        return bits + integers + [fold(*pair) for pair in zip(bits, integers)] + [BINARY64.bits(x) for x in states]
