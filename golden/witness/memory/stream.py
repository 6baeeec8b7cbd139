"""memory.stream by stretches of lines that fit into a cache: the closed digest of each, put together by how a sum of sums
grows over the lines that follow."""

import numpy as np
from operands import Stream

LIBRARIES = ["cryptography", "numpy"]
PASSES = {24: 8, 384: 4, 4096: 2, 32768: 2}
FACTOR = 0xA24BAED4963EE407
WORD = 1 << 64
STRETCH = 2048


def words(seed: int, size: int) -> list[int]:
    stream = Stream("memory.stream", seed, size)
    starts, first = stream.words(8), stream.words(8)
    step, pass_step = stream.word() | 1, stream.word() | 1
    lines = size * 16
    out = []
    for turn in range(PASSES[size]):
        # both sums, lane by lane
        a, b = [(r + turn) % WORD for r in starts], [0] * 8
        for begin in range(0, lines, STRETCH):
            count = min(STRETCH, lines - begin)
            index = np.arange(begin, begin + count, dtype=np.uint64)
            if turn % 2:
                index = np.uint64(lines - 1) - index
            base = np.array([(s + turn * pass_step) % WORD for s in first], dtype=np.uint64)
            v = base[:, None] + (index * np.uint64(step))[None, :]
            u = v ^ (v >> np.uint64(32))
            total = u.sum(axis=1, dtype=np.uint64)
            weighted = (u * np.arange(count, 0, -1, dtype=np.uint64)).sum(axis=1, dtype=np.uint64)
            b = [(y + count * x + int(w)) % WORD for x, y, w in zip(a, b, weighted)]
            a = [(x + int(t)) % WORD for x, t in zip(a, total)]
        out += [(x + FACTOR * y) % WORD for x, y in zip(a, b)]
    return out
