"""float.x87 by MPFR at 24, 53 and 64 bits in all four directions; remainders by exact rationals."""

import gmpy2
from gmpy2 import mpfr, mpq

from float.common_ieee import BINARY32, BINARY64
from operands import Stream

LIBRARIES = ["cryptography", "gmpy2"]
MASK = (1 << 64) - 1
ROUNDINGS = [gmpy2.RoundToNearest, gmpy2.RoundDown, gmpy2.RoundUp, gmpy2.RoundToZero]
EXACT = gmpy2.context(precision=64)


def number(negative: bool, exponent: int, significand: int):
    x = EXACT.mul(mpfr(significand, 64), gmpy2.exp2(mpfr(exponent - 63)))
    return -x if negative else x


def image(x) -> tuple[int, int]:
    """Significand, and sign with biased exponent."""
    sign = 0x8000 if gmpy2.is_signed(x) else 0
    if gmpy2.is_zero(x):
        return 0, sign
    mantissa, exponent = (int(v) for v in x.as_mantissa_exp())
    mantissa = abs(mantissa)
    places = mantissa.bit_length()
    assert places <= 64
    return mantissa << 64 - places, sign | exponent + places - 1 + 16383


def signed(v: int, bits: int) -> int:
    v %= 1 << bits
    return v - (1 << bits) if v >> bits - 1 else v


def significand(word: int, choice: int) -> int:
    digits = f"{word | 1 << 63:b}"
    match choice % 4:
        case 0:
            digits = digits[:53] + "1" + "0" * 10
        case 1:
            digits = digits[:24] + "1" + "0" * 39
    return int(digits, 2)


def draw(stream, wide: bool) -> dict:
    a, b, e, long, ints, single, double, m, f = stream.words(9)
    exponent = e % 14001 - 7000 if wide else e % 41 - 20
    below = min(e >> 16 & 63, 62) if wide else e >> 16 & 7
    integral = []
    for i, span in enumerate((16, 32, 64)):
        power = (f >> 8 * i) % span - 2
        digits = f"{m | 1 << 63:b}"
        # integer part of power + 1 digits, then the half
        if f >> 40 & 3 == 0 and power >= 0 and power + 2 < 64:
            digits = (digits[: power + 1] + "1").ljust(64, "0")
        integral.append(number(f >> 48 + i & 1 == 1, power, int(digits, 2)))
    return {
        "a": number(e >> 63 == 1, exponent, significand(a, e >> 32)),
        "b": number(e >> 62 & 1 == 1, exponent - below, significand(b, e >> 34)),
        "n": integral,
        "long": signed(long, 64),
        "int": signed(ints, 32),
        "short": signed(ints >> 32 | 1, 16),
        "scale": (ints >> 48) % 2001 - 1000,
        "single": BINARY32.value(single & 0x807FFFFF | 120 + (single >> 23 & 15) << 23),
        "double": BINARY64.value(double & 0x800FFFFFFFFFFFFF | 1015 + (double >> 52 & 15) << 52),
    }


def remainder(a, b):
    """Remainder with the dividend's sign, and the quotient's size cut to an integer."""
    x, y = mpq(a), mpq(b)
    quotient = abs(x) // abs(y)
    rest = abs(x) - quotient * abs(y)
    rest = mpfr(rest, 64)
    return (-rest if gmpy2.is_signed(a) else rest), int(quotient)


def constants(context):
    """π, log2 e, log2 10, log10 2, ln 2: from 200 digits, so that the one rounding is the last."""
    with gmpy2.context(precision=700):
        two, ten, e = mpfr(2), mpfr(10), gmpy2.exp(1)
        exact = [gmpy2.const_pi(), gmpy2.log2(e), gmpy2.log2(ten), gmpy2.log10(two), gmpy2.log(two)]
    return [context.plus(x) for x in exact]


def results(p: dict, bits: int, rounding) -> list[tuple[int, int]]:
    a, b = p["a"], p["b"]
    c = gmpy2.context(precision=bits, round=rounding)
    full = gmpy2.context(precision=64, round=rounding)
    rest, quotient = remainder(a, b)
    status = 0x100 * bool(quotient & 4) | 0x4000 * bool(quotient & 2) | 0x200 * (quotient & 1)
    below, equal = a < b, a == b
    flags = below + 256 * equal
    with full:
        integral = gmpy2.rint(a)
        whole = [int(gmpy2.rint(n)) for n in p["n"]]
    exponent = gmpy2.get_exp(a) - 1
    unit = EXACT.mul(a, gmpy2.exp2(mpfr(-exponent)))
    integer = lambda v: mpfr(v, 64)  # noqa: E731
    return [
        *map(image, [c.add(a, b), c.sub(a, b), c.sub(b, a), c.mul(a, b), c.div(a, b), c.div(b, a), c.sqrt(abs(a)), -a]),
        image(integral),
        image(EXACT.mul(a, gmpy2.exp2(mpfr(p["scale"])))),
        image(unit),
        image(integer(exponent)),
        image(rest),
        (status, 0),
        (0x100 * below | 0x4000 * equal, 0),
        (flags | flags << 32, 0),
        *(image(b if taken else a) for taken in
          [below, not below, a <= b, a > b, equal, not equal, False, True]),
        image(c.sub(b, a)),
        image(c.add(a, p["single"])),
        image(c.mul(a, p["double"])),
        image(c.add(a, integer(p["int"]))),
        image(c.div(a, integer(p["short"]))),
        (BINARY32.bits(BINARY32.context(rounding).mul(a, 1)), 0),
        (BINARY64.bits(BINARY64.context(rounding).mul(a, 1)), 0),
        *((v % (1 << width), 0) for v, width in zip(whole, (16, 32, 64))),
        *((int(gmpy2.trunc(n)) % (1 << width), 0) for n, width in zip(p["n"], (16, 32, 64))),
        *(image(integer(p[name])) for name in ("short", "int", "long")),
        image(integer(1)),
        *map(image, constants(full)),
        (0, 0),
        image(p["single"]),
        image(p["double"]),
    ]


def words(seed: int, size: int) -> list[int]:
    gmpy2.set_context(gmpy2.context(precision=64))
    stream = Stream("float.x87", seed, size)
    pairs = [draw(stream, seed % 2 == 1) for _ in range(8)]
    every = [results(pair, bits, rounding) for rounding in ROUNDINGS for bits in (24, 53, 64) for pair in pairs]
    out = []
    for column in zip(*every):
        flat = [word for item in column for word in item]
        out += [sum(flat) & MASK, sum((len(flat) - i) * word for i, word in enumerate(flat)) & MASK]
    return out
