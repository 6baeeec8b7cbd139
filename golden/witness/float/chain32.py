"""float.chain32 by MPFR."""

import gmpy2

from float.common_chain import Recipe
from float.common_ieee import BINARY32
from operands import Stream

LIBRARIES = ["cryptography", "gmpy2"]
RECIPE = Recipe(BINARY32, span=32, shallow=2, deep=8)


def words(seed: int, size: int) -> list[int]:
    with gmpy2.context(BINARY32.context()):
        starts, rows = RECIPE.draw(Stream("float.chain32", seed, size), 128, seed % 2 == 1)
        states = [BINARY32.bits(x) for x in RECIPE.walk(starts, rows, 16)]
    return [low | high << 32 for low, high in zip(states[::2], states[1::2])]
