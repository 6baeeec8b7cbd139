"""memory.walk without a walk: all borders at once as rows of bytes, the order of each lap by doubling of the cycle's affine map,
the digests as dot products with powers of the multiplier."""

import numpy as np
from operands import Stream

LIBRARIES = ["cryptography", "numpy"]
SHAPES = {256: (32, 1), 4096: (4, 8), 32768: (2, 16)}
M = 0xD1342543DE82EF95
WORD = 1 << 64


def orbit(a: int, c: int, count: int) -> np.ndarray:
    """0, f(0), f(f(0)) … under f(i) = a·i + c mod count (a power of two)."""
    order = np.zeros(1, dtype=np.uint64)
    while len(order) < count:
        # f applied len(order) times is the affine map (a, c); squaring it doubles the known part
        order = np.concatenate([order, order * np.uint64(a) + np.uint64(c)])
        a, c = a * a % WORD, (a + 1) * c % WORD
    return (order % np.uint64(count)).astype(np.int64)


def words(seed: int, size: int) -> list[int]:
    laps, segments = SHAPES[size]
    pages = size // 4
    stream = Stream("memory.walk", seed, size)
    orders = [orbit(stream.word() & ~3 | 1, stream.word() | 1, pages) for _ in range(4)]
    tag, step = stream.word(), stream.word() | 1
    updates = stream.words(8)

    page = np.arange(pages)
    index = page.astype(np.uint64)[:, None] * np.uint64(512) + np.arange(504, 520, dtype=np.uint64)
    memory = (np.uint64(tag) + index * np.uint64(step)).astype("<u8").view(np.uint8)

    def bump(at: np.ndarray, count: int, update: int) -> np.ndarray:
        columns = at[:, None] + np.arange(8 * count)
        was = np.ascontiguousarray(memory[page[:, None], columns]).view("<u8")
        memory[page[:, None], columns] = (was + np.uint64(update)).view(np.uint8)
        return was

    factors = np.array([pow(M, j, WORD) for j in range(1, 5)], dtype=np.uint64)
    weights = np.array([pow(M, n, WORD) for n in range(pages // segments - 1, -1, -1)], dtype=np.uint64)
    out = []
    for lap in range(laps):
        # borders share no byte, so only the digests care for the order
        x = bump(63 - (page + lap) % 7, 1, updates[lap % 8])[:, 0]
        y = (bump(63 - (page + 3 * lap) % 31, 4, updates[lap % 8]) * factors).sum(axis=1, dtype=np.uint64)
        pair = [(v[orders[lap % 4]].reshape(segments, -1) * weights).sum(axis=1, dtype=np.uint64) for v in (x, y)]
        out += [int(w) for w in np.stack(pair, axis=1).ravel()]
    return out
