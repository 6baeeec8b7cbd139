"""The FMA chains by MPFR: operands as exact rationals rounded toward zero, then correctly rounded fused operations."""

import struct
from itertools import repeat

import gmpy2
from gmpy2 import mpfr, mpq

from operands import Stream

ROWS, REPEATS, ACCUMULATORS = 64, 8, 12


class Chains:
    """One kernel in one binary format of `bits` bits."""

    def __init__(self, kernel: str, bits: int):
        self.kernel, self.bits = kernel, bits
        self.near = gmpy2.ieee(bits)
        self.cut = gmpy2.ieee(bits)
        self.cut.round = gmpy2.RoundToZero
        self.fraction = self.near.precision - 1
        # exponent of the smallest normal number, counted as 1.f * 2^e
        self.least = 2 - self.near.emax

    def _significand(self, raw: int, top: str = "") -> mpq:
        """1.top… with the raw word's low bits behind the fixed ones."""
        free = self.fraction - len(top)
        return 1 + mpq(int(top or "0", 2) << free | raw % (1 << free), 1 << self.fraction)

    def _sign(self, raw: int) -> int:
        return -1 if raw >> (self.bits - 1) else 1

    def _swing(self, raw: int, odd: bool, row: int) -> tuple[int, int]:
        if not odd:
            return 0, 0
        if row % 4 == 3:
            return 0, -self.least - 1 - raw % 4
        high, low = divmod(raw, 1 << self.bits // 2)
        up = 16 + low % (-self.least - 38)
        return up, 16 + high % (-self.least - 16 - up)

    def _row(self, raw: tuple[int, ...], odd: bool, row: int) -> list[mpfr]:
        c, u, b, w, e = raw
        up, down = self._swing(e, odd, row)
        two = mpq(2)
        scale = self._significand(u) / 2
        # 1/|u| is cut to the fraction's last place, below 2, before 1 is taken from it
        unit = 1 << self.fraction
        inverse = min(mpq(unit * scale.denominator // scale.numerator, unit), 2 - mpq(1, unit))
        values = [
            -self._significand(c, "1111110") / 4,
            inverse * two**up if up else inverse - 1,
            self._sign(u) * scale / two ** (up + down),
            self._sign(b) * self._significand(b) / two ** (9 + down),
            self._significand(w, "111110") * two**down if down else self._significand(w, "11110") / 2,
        ]
        return [mpfr(value) for value in values]

    def _vector(self, stream: Stream) -> list[int]:
        count = 8 * 64 // self.bits
        return list(struct.unpack(f"<{count}{'Q' if self.bits == 64 else 'I'}", stream.bytes(64)))

    def _bits(self, values) -> tuple[int, ...]:
        floats = [float(value) for value in values]
        kinds = "dQ" if self.bits == 64 else "fI"
        return struct.unpack(f"<{len(floats)}{kinds[1]}", struct.pack(f"<{len(floats)}{kinds[0]}", *floats))

    def words(self, seed: int, size: int) -> list[int]:
        stream = Stream(self.kernel, seed, size)
        with self.cut:
            starts = [
                [mpfr(self._sign(r) * self._significand(r) / 2) for r in self._vector(stream)]
                for _ in range(ACCUMULATORS)
            ]
            rows = []
            for i in range(ROWS):
                lanes = zip(*[self._vector(stream) for _ in range(5)])
                rows.append([self._row(raw, seed % 2 == 1, i) for raw in lanes])
        with self.near:
            fma = gmpy2.fma
            x = [list(column) for column in zip(*starts)]
            sums = [0] * len(x)
            for row in rows * REPEATS:
                for lane, (c, v, u, b, w) in enumerate(row):
                    chains = x[lane]
                    chains = list(map(fma, chains, chains, repeat(c)))
                    chains = list(map(fma, chains, repeat(v), chains))
                    chains = list(map(fma, chains, repeat(u), repeat(b)))
                    x[lane] = list(map(fma, chains, repeat(w), chains))
                    sums[lane] += sum(self._bits(x[lane]))
        ends = [*self._bits(value for column in zip(*x) for value in column), *(s % (1 << self.bits) for s in sums)]
        if self.bits == 32:
            ends = [low | high << 32 for low, high in zip(ends[::2], ends[1::2])]
        return ends
