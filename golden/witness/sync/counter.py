"""sync.counter by playing it: both roles' operations one by one on common counters, in an order drawn by lot.

The reference sums up what commutes; here every operation is done for itself, the old values are really handed out, and
another order is drawn for each case.
"""

import random

from operands import Stream

from sync.common_words import M, chain, mix

LIBRARIES = ["cryptography"]
ROUNDS = 32
WIDTHS = (8, 16, 32, 64)


class Cell:
    def __init__(self, bits: int, value: int):
        self.mask = (1 << bits) - 1
        self.value = value & self.mask

    def replace(self, function) -> int:
        old = self.value
        self.value = function(old) & self.mask
        return old


class Width:
    def __init__(self, bits: int, starts: list[int]):
        self.bits = bits
        cells = [Cell(bits, word) for word in starts]
        self.up, self.down, self.row, self.inverted, self.negated, self.taken, self.compared, self.swapped = cells[:8]
        self.pieces = cells[8:]


class Role:
    def __init__(self, number: int):
        self.number = number
        self.own = 0x5555555555555555 << number
        self.rising = self.foreign = 0
        self.last = None
        self.digests, self.pieces = [0] * 4, [0] * 4
        self.added = [[0] * 4 for _ in WIDTHS]
        self.sums = [0] * 16

    def width(self, place: int, w: Width, x: list[int]):
        """One step at a time: each yield lets the partner in."""
        add, adc, sub, sbb, set_, keep, change, numbers, take, compare, swap = x
        for amount in (add, 1, adc + 1):
            w.up.replace(lambda v: v + amount)
            yield

        def look(old: int):
            seen = w.row.value & self.own | old << (63 - self.number)
            self.digests[place] = chain(self.digests[place], seen)

        w.row.replace(lambda v: v | set_ & self.own)
        look(0)
        yield
        w.row.replace(lambda v: v & (keep | ~self.own))
        look(0)
        yield
        w.row.replace(lambda v: v ^ change & self.own)
        look(0)
        yield
        for which in range(3):
            bit = 1 << (numbers >> 8 * which & 0xFFFFFFFF) % (w.bits // 2) * 2 + self.number
            old = w.row.replace((lambda v: v | bit, lambda v: v & ~bit, lambda v: v ^ bit)[which])
            look(int(old & bit != 0))
            yield
        for amount in (sub, 1, sbb + 1):
            w.down.replace(lambda v: v - amount)
            yield
        before = w.inverted.replace(lambda v: ~v)
        self.foreign += w.inverted.value not in (before, before ^ w.inverted.mask)
        yield
        before = w.negated.replace(lambda v: -v)
        self.foreign += w.negated.value not in (before, -before & w.negated.mask)
        yield
        piece = w.pieces[self.number]
        for function in (lambda v: ~v, lambda v: -v):
            piece.replace(function)
            self.pieces[place] = chain(self.pieces[place], piece.value)
            yield
        for slot, cell, amount in ((0, w.taken, take), (1, w.compared, compare)):
            old = cell.replace(lambda v: v + amount)
            self.sums[3 * place + slot] += mix(cell.value) - mix(old)
            yield
        self.sums[3 * place + 2] += mix(w.swapped.replace(lambda v: swap))
        yield
        for i, amount in enumerate((add + adc + 2, sub + sbb + 2, take, compare)):
            self.added[place][i] = self.added[place][i] + amount & w.up.mask

    def play(self, widths: list[Width], wide: list[Cell], rounds: list[list[int]]):
        for x in rounds:
            for place, w in enumerate(widths):
                yield from self.width(place, w, x[11 * place : 11 * place + 11])
            for i, (cell, amount) in enumerate(zip(wide, [1] + x[44:])):
                old = cell.replace(lambda v: v + amount)
                self.sums[12 + i] += mix(cell.value) - mix(old)
                if i == 0:
                    self.rising += self.last is not None and (old - self.last & M) >> 63
                    self.last = old
                yield


def words(seed: int, size: int) -> list[int]:
    stream = Stream("sync.counter", seed, size)
    starts = stream.words(44)
    rounds = [[stream.words(47) for _ in range(ROUNDS)] for _ in range(2)]
    widths = [Width(bits, starts[10 * i : 10 * i + 10]) for i, bits in enumerate(WIDTHS)]
    wide = [Cell(64, word) for word in starts[40:]]
    roles = [Role(0), Role(1)]
    plays = [role.play(widths, wide, list_) for role, list_ in zip(roles, rounds)]
    lot = random.Random(seed)
    while plays:
        play = lot.choice(plays)
        for _ in range(lot.randrange(1, 9)):
            if next(play, plays) is plays:
                plays.remove(play)
                break
    sums = [sum(both) for both in zip(*(role.sums for role in roles))]
    for i, w in enumerate(widths):
        sums[3 * i + 2] += mix(w.swapped.value)
    sums = [total & M for total in sums]
    ends = [
        cell.value
        for w in widths
        for cell in (w.up, w.down, w.row, w.inverted, w.negated, w.taken, w.compared)
    ]
    common = ends + sums[:12]
    common += [wide[0].value, sums[12], wide[1].value, sums[13], wide[2].value, wide[3].value, sums[14], sums[15]]
    output = []
    for role in roles:
        output += [role.rising, role.foreign, *role.digests, *role.pieces]
        output += [amount for amounts in role.added for amount in amounts]
        output += common
    return output
