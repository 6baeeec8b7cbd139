"""The chains by MPFR in the format's own precision and exponent range."""

import gmpy2

from float.common_ieee import Format

ROWS = 8


class Recipe:
    def __init__(self, form: Format, span: int, shallow: int, deep: int):
        self.form, self.span, self.shallow, self.deep = form, span, shallow, deep

    def number(self, word: int, negative: bool, lead: str, exponent: int):
        """lead (binary digits), then the word's low bits; `exponent` is the leading digit's."""
        free = self.form.fraction_bits - len(lead) + 1
        significand = int(lead, 2) << free | word % (1 << free)
        unit = exponent - self.form.fraction_bits
        lowest = self.form.emin - self.form.fraction_bits
        if unit < lowest:
            significand >>= lowest - unit
            unit = lowest
        return self.form.value(self.form.encode(negative, significand, unit))

    def plan(self, row: int, word: int, x: int, lost: int):
        """(M, Y, X', places lost in X')."""
        emin, span = self.form.emin, self.span
        kind = word >> 59
        m = 2 * ((word >> 12) % (2 * span) - span)
        y = (word >> 24) % (2 * span) - span
        following = word % (2 * span) - span
        low = -2 * span - 1 - (word >> 24) % (span // 8)
        if lost:
            return -(lost & ~1), y, following, 0
        if kind == 0 and row < ROWS - 1:
            cut = 1 + (word >> 36) % self.shallow
            return m, -span // 4 - (word >> 24) % (span // 2), emin - cut, cut
        if kind < 3 and x <= 0:
            return emin - 2 * ((word >> 36) % (self.shallow // 2 + 1)), low, following, 0
        if kind < 12 and x >= self.deep + 3:
            m = x + emin - 2 - (word >> 36) % self.deep
            return m - m % 2, low, following, 0
        return m, y, following, 0

    def draw(self, stream, count: int, full: bool):
        """(starts, rows); each row has (u, v, c, w, a) for each chain."""
        starts, homes, at = [], [], []
        for _ in range(count):
            word, scale = stream.words(2)
            home = (scale % (2 * self.span) - self.span if full else 0), word >> 63 == 1
            starts.append(self.number(word, home[1], "1", home[0] - 1))
            homes.append(home)
            at.append((*home, 0))
        rows = []
        for row in range(ROWS):
            operands = []
            for chain in range(count):
                e, u, v, c, w, a = stream.words(6)
                x, before, lost = at[chain]
                middle, after = v >> 63 == 1, w >> 63 == 1
                m, y, following, cut = self.plan(row, e, x, lost) if full else (0, 0, 0, 0)
                if row == ROWS - 1:
                    following, after = homes[chain]
                operands.append((
                    self.number(u, before, "1111", m - x - 1),
                    self.number(v, middle, "10000", 3 * m // 2 - y - 1),
                    self.number(c, middle, "101001", y),
                    self.number(w, after, "10100", following - y - 1),
                    self.number(a, after, "100000", following - 1),
                ))
                at[chain] = following, after, cut
            rows.append(operands)
        return starts, rows

    @staticmethod
    def step(x, operands):
        u, v, c, w, a = operands
        n = gmpy2.mul(x, u)
        q = gmpy2.mul(n, gmpy2.div(gmpy2.sqrt(n), v))
        d = gmpy2.sub(c, q)
        return gmpy2.add(a, gmpy2.mul(abs(d), w))

    def walk(self, starts, rows, rounds: int):
        states = list(starts)
        for _ in range(rounds):
            for row in rows:
                states = [self.step(x, operands) for x, operands in zip(states, row)]
        return states
