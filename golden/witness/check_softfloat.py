"""Writes golden/tests/data/softfloat.txt: IEEE operations and their exceptions by MPFR, for golden/tests/softfloat.rs.

`python3 golden/witness/check_softfloat.py` from the repository's root. One line a case: operation, format, rounding,
operands, result, flags (the bits of softfloat's `Flags`). Tininess is judged after rounding: MPFR rounds once with an
unbounded exponent to tell, once with the format's own for the result. Exactness is judged by exact rationals.
"""

import standard  # noqa: F401, I001

import random
from fractions import Fraction

import gmpy2

from float.common_ieee import BFLOAT16, BINARY16, BINARY32, BINARY64

FORMATS = {"binary16": BINARY16, "bfloat16": BFLOAT16, "binary32": BINARY32, "binary64": BINARY64}
ROUNDINGS = {
    "NearestEven": gmpy2.RoundToNearest,
    "TowardZero": gmpy2.RoundToZero,
    "Up": gmpy2.RoundUp,
    "Down": gmpy2.RoundDown,
}
OPERANDS = {"add": 2, "sub": 2, "mul": 2, "div": 2, "sqrt": 1, "fma": 3}
INVALID, DIVIDE_BY_ZERO, OVERFLOW, UNDERFLOW, INEXACT = 1, 2, 4, 8, 16
EACH = 30


def rational(x) -> Fraction:
    numerator, denominator = x.as_integer_ratio()
    return Fraction(int(numerator), int(denominator))


def is_exact(op: str, operands, result) -> bool:
    values = [rational(x) for x in operands]
    r = rational(result)
    match op:
        case "add":
            return r == values[0] + values[1]
        case "sub":
            return r == values[0] - values[1]
        case "mul":
            return r == values[0] * values[1]
        case "div":
            return r * values[1] == values[0]
        case "sqrt":
            return r * r == values[0]
        case "fma":
            return r == values[0] * values[1] + values[2]
    raise ValueError(op)


def answer(op: str, form, rounding, bits: list[int]) -> tuple[int, int]:
    operands = [form.value(b) for b in bits]
    result = getattr(form.context(rounding), op)(*operands)
    if gmpy2.is_nan(result):
        quiet = form.infinity | 1 << form.fraction_bits - 1
        return quiet, 0 if any(gmpy2.is_nan(x) for x in operands) else INVALID
    if not all(gmpy2.is_finite(x) for x in operands):
        return form.bits(result), 0
    if op == "div" and gmpy2.is_zero(operands[1]):
        return form.bits(result), DIVIDE_BY_ZERO
    unbounded = gmpy2.context(precision=form.precision, round=rounding, emin=-(1 << 20), emax=1 << 20)
    free = getattr(unbounded, op)(*operands)
    size = abs(rational(free))
    if size >= Fraction(2) ** (form.bias + 1):
        return form.bits(result), OVERFLOW | INEXACT
    if is_exact(op, operands, result):
        return form.bits(result), 0
    tiny = size < Fraction(2) ** form.emin
    return form.bits(result), INEXACT | (UNDERFLOW if tiny else 0)


def operand(dice: random.Random, form) -> int:
    top = (1 << form.exponent_bits) - 1
    biased = dice.choice([0, 1, 2, top - 1, top - 2, form.bias - 1, form.bias, form.bias + 1, dice.randrange(top)])
    place = dice.randrange(form.fraction_bits + 1)
    mask = (1 << form.fraction_bits) - 1
    fraction = mask & dice.choice([0, (1 << place) - 1, -1 << place, 1 << place, dice.getrandbits(52), dice.getrandbits(52)])
    if dice.random() < 0.04:
        biased, fraction = top, 0
    return dice.getrandbits(1) * form.sign_bit | biased << form.fraction_bits | fraction


def near_smallest_normal(dice: random.Random, op: str, form) -> list[int]:
    """Operands whose exact result is within a few last places of the smallest normal number."""
    smallest = 1 << form.fraction_bits
    one = form.bias << form.fraction_bits
    sign = dice.getrandbits(1) * form.sign_bit
    below_one, above_one = one - dice.randrange(1, 6), one + dice.randrange(4)
    a = smallest + dice.randrange(-4, 4) | sign
    match op:
        case "mul":
            return [a, dice.choice([below_one, above_one])]
        case "div":
            return [a, dice.choice([below_one, above_one])]
        case "fma":
            return [a, dice.choice([below_one, above_one]), dice.randrange(3) | dice.getrandbits(1) * form.sign_bit]
        case "add" | "sub":
            return [a, dice.randrange(4) | dice.getrandbits(1) * form.sign_bit]
    return [dice.randrange(1, 2 * smallest)]


def near_largest(dice: random.Random, op: str, form) -> list[int]:
    largest = form.infinity - 1
    one = form.bias << form.fraction_bits
    sign = dice.getrandbits(1) * form.sign_bit
    a = largest - dice.randrange(3) | sign
    half_place = form.infinity - ((form.fraction_bits + 2) << form.fraction_bits)
    small = half_place + dice.randrange(-2, 3) | dice.getrandbits(1) * form.sign_bit
    match op:
        case "mul" | "div":
            return [a, one + dice.randrange(-3, 4)]
        case "fma":
            return [a, one + dice.randrange(-1, 2), small]
        case "add" | "sub":
            return [a, small]
    return [a & ~form.sign_bit]


def main() -> None:
    dice = random.Random(754)
    with open("golden/tests/data/softfloat.txt", "w", encoding="ascii") as out:
        for op, count in OPERANDS.items():
            for name, form in FORMATS.items():
                for rounding, mode in ROUNDINGS.items():
                    for i in range(EACH):
                        if i % 5 == 0:
                            bits = near_smallest_normal(dice, op, form)
                        elif i % 5 == 1:
                            bits = near_largest(dice, op, form)
                        else:
                            bits = [operand(dice, form) for _ in range(count)]
                        result, flags = answer(op, form, mode, bits)
                        print(op, name, rounding, *(f"{b:x}" for b in bits), f"{result:x}", flags, file=out)


if __name__ == "__main__":
    main()
