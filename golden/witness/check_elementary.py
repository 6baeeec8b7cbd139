"""Writes golden/tests/data/elementary.txt: correctly rounded values by MPFR, for golden/tests/softfloat.rs; prints how far
the pinned steps of float.elementary are from the true values, in last places, over 100,000 points of each function.

`python3 golden/witness/check_elementary.py` from the repository's root. `--numbers` prints the polynomials' bits instead.
"""

import standard  # noqa: F401, I001

import random
import sys

import gmpy2
from gmpy2 import mpfr

from float import elementary as pinned
from float.common_ieee import BINARY64

TRUE = gmpy2.context(precision=300)
ONE = 0x3FF0000000000000


def points(name: str, dice: random.Random, count: int):
    yield from EDGES[name]
    for _ in range(count):
        word = dice.getrandbits(64)
        match name:
            case "exp":
                yield BINARY64.bits(pinned.operand(word, -6, 8))
            case "log":
                yield BINARY64.bits(pinned.positive(word, dice.random() < 0.5))
            case _:
                yield BINARY64.bits(pinned.operand(word, -4, 11))


def turns():
    """The doubles nearest to multiples of a quarter of π, where sine or cosine vanish or the reduction changes sides."""
    with TRUE:
        quarters = [gmpy2.const_pi() / 4 * k for k in [*range(1, 40), *range(5000, 5040)]]
    with BINARY64.context():
        return [BINARY64.bits(mpfr(q)) + step for q in quarters for step in (-1, 0, 1)]


EDGES = {
    "exp": [0x3F90000000000000, 0x407FFFFFFFFFFFFF, 0xC07FFFFFFFFFFFFF, 0x3FD62E42FEFA39EF, 0xBFD62E42FEFA39EF, 0x3FD62E42FEFA39F0],
    "log": [1 << 52, 0x7FEFFFFFFFFFFFFF, ONE + 1, ONE - 1, ONE + 2, ONE - 2, 0x3FE6A09E667F3BCC, 0x3FE6A09E667F3BCD, 0x3FF6A09E667F3BCC, 0x3FF6A09E667F3BCD],
    "sin": turns() + [0x40AFFFFFFFFFFFFF, 0x3FB0000000000000],
    "cos": turns() + [0x40AFFFFFFFFFFFFF, 0x3FB0000000000000],
}
FUNCTIONS = {
    "exp": (pinned.exp, gmpy2.exp),
    "log": (pinned.log, gmpy2.log),
    "sin": (lambda x: pinned.turn(x)[0], gmpy2.sin),
    "cos": (lambda x: pinned.turn(x)[1], gmpy2.cos),
}


def main() -> None:
    if sys.argv[1:] == ["--numbers"]:
        with BINARY64.context():
            for name in ("EXP", "LOG", "SIN", "COS"):
                print(name, *(f"0x{BINARY64.bits(c):016x}" for c in getattr(pinned, name)))
            for name in ("LN2_HIGH", "LN2_LOW", "PI_1", "PI_2", "PI_3", "LOG2_E", "TWO_OVER_PI"):
                print(name, f"0x{BINARY64.bits(mpfr(getattr(pinned, name))):016x}")
        return
    dice = random.Random(1841)
    with open("golden/tests/data/elementary.txt", "w", encoding="ascii") as out:
        for name, (ours, theirs) in FUNCTIONS.items():
            worst, at = 0.0, 0
            for i, bits in enumerate(points(name, dice, 100_000)):
                with BINARY64.context():
                    x = BINARY64.value(bits)
                    result = ours(x)
                    right = theirs(x)
                with TRUE:
                    exact = theirs(x)
                    place = gmpy2.exp2(mpfr(gmpy2.get_exp(exact) - 53))
                    error = float(abs(result - exact) / place)
                if error > worst:
                    worst, at = error, bits
                if i < 500:
                    print(name, f"{bits:016x} {BINARY64.bits(right):016x}", file=out)
            print(f"{name}: at most {worst:.3f} last places, at {at:016x}")


if __name__ == "__main__":
    main()
