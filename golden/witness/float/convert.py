"""float.convert: between formats by MPFR, to and from integers by exact rationals and unbounded integers."""

from fractions import Fraction

import gmpy2

from float.common_ieee import BFLOAT16, BINARY16, BINARY32, BINARY64
from operands import Stream

LIBRARIES = ["cryptography", "gmpy2"]
ITEMS = 256
PASSES = 24
MASK = (1 << 64) - 1


def boundary(z: int, places: int, cut: int, w: int) -> int:
    digits = f"{z & (1 << places) - 1:b}".rjust(places, "0") if places else ""
    if cut == 0:
        return int(digits or "0", 2)
    kept, rest = digits[: places - cut], digits[places - cut :]
    if (w >> 53) & 3 == 0:
        kept = "1" * len(kept)
    half = 1 << cut - 1
    choices = {0: 0, 1: 1, 2: half - 1, 3: half, 4: half + 1, 5: 2 * half - 1}
    low = choices.get((w >> 48) & 7, int(rest, 2)) & 2 * half - 1
    return (int(kept or "0", 2) << cut) + low


def number(form, negative: bool, exponent: int, fraction: int) -> int:
    significand = fraction | 1 << form.fraction_bits
    unit = exponent - form.fraction_bits
    lowest = form.emin - form.fraction_bits
    if unit < lowest:
        significand >>= lowest - unit
        unit = lowest
    return form.encode(negative, significand, unit)


def narrowing(source, target):
    def make(w: int, z: int) -> int:
        zone = (w >> 56) & 7
        if zone < 2:
            exponent = target.emin - 1 - w % (target.fraction_bits + 2)
        elif zone == 2:
            exponent = target.bias - 1 + w % 3
        else:
            exponent = target.emin + w % (target.bias - target.emin + 1)
        exponent = min(exponent, source.bias)
        cut = source.fraction_bits - target.fraction_bits + max(0, target.emin - exponent)
        fraction = boundary(z, source.fraction_bits, min(cut, source.fraction_bits), w)
        return number(source, w >> 63 == 1, exponent, fraction)

    return make


def anything(form):
    def make(w: int, z: int) -> int:
        exponents = (1 << form.exponent_bits) - (0 if form is BINARY16 else 1)
        magnitude = (w % exponents) << form.fraction_bits
        if magnitude != form.infinity:
            magnitude += z % (1 << form.fraction_bits)
        return magnitude + (form.sign_bit if w >> 63 else 0)

    return make


def to_integer(top: int, signed: bool):
    def make(w: int, z: int) -> int:
        exponent = w % (top + 2) - 2
        return number(BINARY64, signed and w >> 63 == 1, exponent, boundary(z, 52, min(max(52 - exponent, 0), 52), w))

    return make


def integer(longest: int, kept: int, signed: bool):
    def make(w: int, z: int) -> int:
        places = w % longest
        magnitude = (1 << places) + boundary(z, places, max(0, places + 1 - kept), w)
        return -magnitude if signed and w >> 63 else magnitude

    return make


def between(source, target):
    context = target.context()
    one = gmpy2.mpfr(1)
    return lambda x: target.bits(context.mul(source.value(x), one))


def exact(bits: int) -> Fraction:
    numerator, denominator = BINARY64.value(bits).as_integer_ratio()
    return Fraction(int(numerator), int(denominator))


def truncated(width: int):
    return lambda x: int(exact(x)) % (1 << width)


def nearest(width: int):
    # round() of a Fraction rounds halves to even
    return lambda x: round(exact(x)) % (1 << width)


def from_integer(target):
    """Rounding of an integer by a comparison with the midpoint of its two neighbours."""

    def convert(v: int) -> int:
        magnitude = abs(v)
        shift = max(0, magnitude.bit_length() - target.precision)
        floor = magnitude >> shift
        twice_rest = 2 * (magnitude - (floor << shift))
        if twice_rest > 1 << shift or (twice_rest == 1 << shift and shift and floor & 1):
            floor += 1
        return target.encode(v < 0, floor, shift)

    return convert


def sums(results: list[int], width: int) -> list[int]:
    image = b"".join(x.to_bytes(width // 8, "little") for x in results)
    words = [int.from_bytes(image[i : i + 8], "little") for i in range(0, len(image), 8)]
    first, second = [], []
    for lane in range(8):
        column = words[lane::8] * PASSES
        count = len(column)
        first.append(sum(column) & MASK)
        second.append(sum((count - i) * x for i, x in enumerate(column)) & MASK)
    return first + second + words[-1:]


ARRAYS = {
    "double_to_single": narrowing(BINARY64, BINARY32),
    "single": anything(BINARY32),
    "single_to_half": narrowing(BINARY32, BINARY16),
    "half": anything(BINARY16),
    "single_to_bfloat": narrowing(BINARY32, BFLOAT16),
    "bfloat": anything(BFLOAT16),
    "double_to_i32": to_integer(30, True),
    "i32": integer(31, 24, True),
    "u32": integer(32, 24, False),
    "double_to_i64": to_integer(62, True),
    "i64": integer(63, 53, True),
    "u64": integer(64, 53, False),
    "double_to_u32": to_integer(32, False),
}

TRACKS = [
    ("double_to_single", 32, between(BINARY64, BINARY32)),
    ("single", 64, between(BINARY32, BINARY64)),
    ("single_to_half", 16, between(BINARY32, BINARY16)),
    ("half", 32, between(BINARY16, BINARY32)),
    ("single_to_bfloat", 16, between(BINARY32, BFLOAT16)),
    ("bfloat", 32, between(BFLOAT16, BINARY32)),
    ("double_to_i32", 32, truncated(32)),
    ("double_to_i32", 32, nearest(32)),
    ("i32", 64, from_integer(BINARY64)),
    ("i32", 32, from_integer(BINARY32)),
    ("u32", 32, from_integer(BINARY32)),
    ("double_to_i64", 64, truncated(64)),
    ("i64", 64, from_integer(BINARY64)),
    ("u64", 64, from_integer(BINARY64)),
    ("double_to_u32", 32, truncated(32)),
]


def words(seed: int, size: int) -> list[int]:
    stream = Stream("float.convert", seed, size)
    arrays = {name: [make(*stream.words(2)) for _ in range(ITEMS)] for name, make in ARRAYS.items()}
    return [word for name, width, convert in TRACKS for word in sums([convert(x) for x in arrays[name]], width)]
