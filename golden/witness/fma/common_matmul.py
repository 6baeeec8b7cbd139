"""The closed matrix products by MPFR: rank-one updates of whole rows, digests by numpy's running sums."""

import struct
from itertools import repeat

import gmpy2
import numpy
from gmpy2 import mpfr, mpq

from operands import Stream

ORDER = 96


class Matmul:
    """One kernel in one binary format of `bits` bits."""

    def __init__(self, kernel: str, bits: int, span: int):
        self.kernel, self.bits, self.span = kernel, bits, span
        self.near = gmpy2.ieee(bits)
        self.fraction = self.near.precision - 1
        self.lanes = 512 // bits
        self.unsigned = numpy.dtype(f"<u{bits // 8}")
        self.real = numpy.dtype(f"<f{bits // 8}")

    def _element(self, raw: int) -> mpfr:
        fraction = raw % (1 << self.fraction)
        size = (1 + mpq(fraction, 1 << self.fraction)) / (2 << (raw >> self.fraction & 3))
        return mpfr(-size if raw >> self.bits - 1 else size)

    def _matrix(self, stream: Stream, rows: int, columns: int) -> list[list[mpfr]]:
        raw = struct.unpack(f"<{rows * columns}{'Q' if self.bits == 64 else 'I'}", stream.bytes(rows * columns * self.bits // 8))
        numbers = list(map(self._element, raw))
        return [numbers[i * columns : (i + 1) * columns] for i in range(rows)]

    @staticmethod
    def _sum(numbers):
        total = mpfr(0)
        for x in numbers:
            total += x
        return total

    def _row_sum(self, row):
        parts = [self._sum(row[lane :: self.lanes]) for lane in range(self.lanes)]
        while len(parts) > 1:
            half = len(parts) // 2
            parts = [x + y for x, y in zip(parts[:half], parts[half:])]
        return parts[0]

    def _digest(self, numbers) -> list[int]:
        # every number is one of the format: the conversion to it is exact
        patterns = numpy.array([float(x) for x in numbers], dtype=self.real).view(self.unsigned)
        running = numpy.cumsum(patterns.reshape(-1, self.lanes), axis=0, dtype=self.unsigned)
        s, t = running[-1], running.sum(axis=0, dtype=self.unsigned)
        return [int(w) for w in numpy.concatenate([s, t]).view("<u8")]

    def _beyond(self, sums) -> int:
        bounds = [mpq(4_400_000 * (96 if i == ORDER - 1 else 1), 2 << self.fraction) for i in range(ORDER)]
        return sum(not abs(x) <= bound for x, bound in zip(sums, bounds))

    def words(self, seed: int, size: int) -> list[int]:
        stream = Stream(self.kernel, seed, size)
        with self.near:
            a = self._matrix(stream, ORDER - 1, ORDER)
            b = self._matrix(stream, ORDER, ORDER - 1)
            a.append([-self._sum(column) for column in zip(*a)])
            for row in b:
                row.append(-self._sum(row))
            scales = [w % (2 * self.span + 1) - self.span for w in stream.words(ORDER)]
            if seed % 2:
                a = [[gmpy2.mul(x, mpq(2) ** s) for x, s in zip(row, scales)] for row in a]
                b = [[gmpy2.mul(x, mpq(2) ** -s) for x in row] for row, s in zip(b, scales)]
            fma = gmpy2.fma
            c = []
            for left in a:
                row = [mpfr(0)] * ORDER
                for x, right in zip(left, b):
                    row = list(map(fma, repeat(x), right, row))
                c.append(row)
            rows = [self._row_sum(row) for row in c]
            columns = [self._sum(column) for column in zip(*c)]
            everything = [x for row in c for x in row]
        alarms = [self._beyond(rows), self._beyond(columns)]
        return alarms + self._digest(everything) + self._digest(rows) + self._digest(columns)
