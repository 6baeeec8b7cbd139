"""cache.evict on a real array of lines, visited through reshaped index arrays, the digests as weighted sums with numpy."""

import numpy as np
from operands import Stream

LIBRARIES = ["cryptography", "numpy"]
SHAPES = {512: (8, 8), 4096: (4, 4), 32768: (2, 3)}
FACTOR = np.uint64(0xA24BAED4963EE407)
WORD = 1 << 64


def words(seed: int, size: int) -> list[int]:
    groups, rounds = SHAPES[size]
    pages = size // 4
    stream = Stream("cache.evict", seed, size)
    starts, first, update = (np.array(stream.words(8), dtype=np.uint64) for _ in range(3))
    column, step, round_step = stream.word() % 64, stream.word() | 1, stream.word() | 1

    # only the lines of a page that are used, by their place in it
    places = [(column + 9 * g) % 64 for g in range(groups)]
    rows = {place: row for row, place in enumerate(sorted(places))}
    memory = np.zeros((pages, groups, 8), dtype=np.uint64)
    for g, place in enumerate(places):
        index = np.arange(pages, dtype=np.uint64) * np.uint64(groups) + np.uint64(g)
        memory[:, rows[place]] = first + index[:, None] * np.uint64(step)
    out = []
    for r in range(rounds):
        stride = min((1, 16, 256)[r % 3], pages // 2)
        way = np.arange(pages).reshape(-1, stride).T.ravel()
        pairs = [(way, rows[place]) for place in places]
        if r % 2:
            pairs = [(q[::-1], row) for q, row in pairs[::-1]]
        v = np.concatenate([memory[q, row] for q, row in pairs])
        u = v ^ (v >> np.uint64(32))
        count = len(u)
        start = starts + np.uint64(r)
        a = start + u.sum(axis=0, dtype=np.uint64)
        b = start * np.uint64(count)
        b = b + (u * np.arange(count, 0, -1, dtype=np.uint64)[:, None]).sum(axis=0, dtype=np.uint64)
        out += [int(w) for w in a + b * FACTOR]
        memory += update + np.uint64(r * round_step % WORD)
    return out
