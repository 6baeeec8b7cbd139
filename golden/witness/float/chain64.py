"""float.chain64 by MPFR."""

import gmpy2

from float.common_chain import Recipe
from float.common_ieee import BINARY64
from operands import Stream

LIBRARIES = ["cryptography", "gmpy2"]
RECIPE = Recipe(BINARY64, span=256, shallow=4, deep=16)


def words(seed: int, size: int) -> list[int]:
    with gmpy2.context(BINARY64.context()):
        starts, rows = RECIPE.draw(Stream("float.chain64", seed, size), 64, seed % 2 == 1)
        return [BINARY64.bits(x) for x in RECIPE.walk(starts, rows, 16)]
