"""fma.mixed: operands by numpy and ml_dtypes, fused operations by MPFR in binary32, narrowing by numpy and ml_dtypes."""

import gmpy2
import ml_dtypes
import numpy

from operands import Stream

LIBRARIES = ["cryptography", "gmpy2", "ml_dtypes", "numpy"]
COLUMNS = ROWS = PASSES = 64
BINARY32 = gmpy2.ieee(32)


def numbers(raw, fraction_bits: int, top, kind):
    """Exact doubles first: they hold every number drawn, but for what is cut below binary16's normal numbers."""
    raw = raw.astype(numpy.int64)
    exponent = top - (raw >> fraction_bits & 3)
    fraction = raw & (1 << fraction_bits) - 1
    significand = fraction + (1 << fraction_bits)
    unit = exponent - fraction_bits
    lowest = numpy.full_like(unit, -24 if kind is numpy.float16 else -133)
    significand >>= numpy.maximum(lowest - unit, 0)
    value = numpy.ldexp(significand.astype(numpy.float64), numpy.maximum(unit, lowest))
    value = numpy.where(raw >> 15, -value, value)
    short = value.astype(kind)
    assert (short.astype(numpy.float64) == value).all()
    return short.astype(numpy.float32)


def sums(patterns):
    """Columns of 32-bit patterns, a row a segment: last running sum, and the sum of all running sums."""
    running = numpy.cumsum(patterns, axis=0, dtype=numpy.uint32)
    return running[-1], running.sum(axis=0, dtype=numpy.uint32)


def words(seed: int, size: int) -> list[int]:
    stream = Stream("fma.mixed", seed, size)
    raw = [numpy.frombuffer(stream.bytes(2 * ROWS * COLUMNS), "<u2").reshape(ROWS, COLUMNS) for _ in range(2)]
    level = numpy.array([w % 35 - 20 for w in stream.words(COLUMNS)]) * (seed % 2)
    half = numbers(raw[0], 10, level - 1, numpy.float16)
    bfloat = numbers(raw[1], 7, -level, ml_dtypes.bfloat16)
    with BINARY32:
        h = [[gmpy2.mpfr(float(x)) for x in row] for row in half]
        b = [[gmpy2.mpfr(float(x)) for x in row] for row in bfloat]
        minus_h = [[-x for x in row] for row in h]
        fma, neg = gmpy2.fma, lambda xs: [-x for x in xs]
        ends = []
        for shift in range(PASSES):
            for first in range(0, ROWS, 8):
                x = [gmpy2.mpfr(0)] * COLUMNS
                for step in range(8):
                    row = first + step
                    match step:
                        case 1 | 3:
                            x = neg(x)
                        case 4:
                            x[::2] = neg(x[::2])
                        case 5:
                            x[1::2] = neg(x[1::2])
                    left = minus_h[row] if step in (2, 3, 6) else h[row]
                    x = list(map(fma, left, b[(row + shift) % ROWS], x))
                ends.append([float(y) for y in x])
    x = numpy.array(ends, dtype=numpy.float32)
    narrow = [x.astype(kind).view("<u2") for kind in (numpy.float16, ml_dtypes.bfloat16)]
    pairs = numpy.ascontiguousarray(numpy.concatenate(narrow, axis=1)).view("<u4")
    out = numpy.concatenate([*sums(x.view("<u4")), *sums(pairs)])
    return [int(w) for w in out.view("<u8")]
