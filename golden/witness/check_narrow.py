"""Writes golden/tests/data/narrow.txt: digests of whole conversions by numpy and ml_dtypes, for golden/tests/softfloat.rs.

`python3 golden/witness/check_narrow.py` from the repository's root. One line a conversion: its name and the SHA-256 of all
results, little endian, in the order of the operands. Widening: all 65,536 encodings. Narrowing: every upper half of a
binary32 with each of the lower halves below, next to numbers and midpoints of both 16-bit formats; infinities included,
NaN operands left out. A NaN result is the canonical one (sign clear, top fraction bit set).
"""

import standard  # noqa: F401, I001

import hashlib

import ml_dtypes
import numpy

LOWER = [0, 1, 0xFFF, 0x1000, 0x1001, 0x1FFF, 0x7FFF, 0x8000, 0x8001, 0xEFFF, 0xF000, 0xF001, 0xFFFF]


def digest(array) -> str:
    return hashlib.sha256(array.astype(array.dtype.newbyteorder("<")).tobytes()).hexdigest()


def main() -> None:
    every = numpy.arange(1 << 16, dtype=numpy.uint16)
    singles = (every.astype(numpy.uint32)[:, None] << 16 | numpy.array(LOWER, dtype=numpy.uint32)).ravel().view(numpy.float32)
    singles = singles[~numpy.isnan(singles)]
    with open("golden/tests/data/narrow.txt", "w", encoding="ascii") as out, numpy.errstate(over="ignore"):
        for name, kind in [("half", numpy.float16), ("bfloat", ml_dtypes.bfloat16)]:
            wide = every.view(kind).astype(numpy.float32)
            bits = numpy.where(numpy.isnan(wide), numpy.uint32(0x7FC00000), wide.view(numpy.uint32))
            print(f"{name}-to-single {digest(bits)}", file=out)
            print(f"single-to-{name} {digest(singles.astype(kind).view(numpy.uint16))}", file=out)


if __name__ == "__main__":
    main()
