"""sync.lock by playing it: updates of whole records one by one, in an order drawn by lot, with numpy's 64-bit words."""

import random

import numpy as np

from operands import Stream

from sync.common_words import M, chain, mix

LIBRARIES = ["cryptography", "numpy"]
LOCKS, ROUNDS = 5, 48


class Record:
    def __init__(self, setup: list[int]):
        self.start = np.array(setup[:30], dtype=np.uint64)
        self.words = self.start.copy()
        self.first = self.sum = setup[30]
        self.numbers = np.array(setup[31:], dtype="<u8").view("<u4").astype(np.uint64)
        self.count = 0
        self.telescoped = 0

    def torn(self) -> int:
        whole = self.start + np.uint64(self.sum - self.first & M) + np.uint64(self.count) * self.numbers
        return int(np.count_nonzero(whole != self.words))

    def update(self, x: int) -> int:
        torn = self.torn()
        self.words += self.numbers + np.uint64(x)
        self.count += 1
        before, self.sum = self.sum, self.sum + x & M
        self.telescoped += mix(self.sum) - mix(before)
        return torn + self.torn()


def words(seed: int, size: int) -> list[int]:
    stream = Stream("sync.lock", seed, size)
    records = [Record(stream.words(46)) for _ in range(LOCKS)]
    operands = [[stream.words(LOCKS) for _ in range(ROUNDS)] for _ in range(2)]
    torn = [[0] * LOCKS for _ in range(2)]
    turns = [0] * ROUNDS + [1] * ROUNDS
    lot = random.Random(seed)
    for lock, record in enumerate(records):
        lot.shuffle(turns)
        lists = [iter(role) for role in operands]
        for role in turns:
            torn[role][lock] += record.update(next(lists[role])[lock])
    output = []
    for role in range(2):
        for lock, record in enumerate(records):
            digest = 0
            for word in record.words:
                digest = chain(digest, int(word))
            added = sum(x[lock] for x in operands[role]) & M
            output += [torn[role][lock], added, record.count, record.sum, digest, record.telescoped & M]
    return output
