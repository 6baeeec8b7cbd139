"""cache.walk without a walk: the order of each lap by doubling of the cycle's affine map, the digests as dot products with
powers of the multiplier, the tags' updates counted per line."""

import numpy as np
from operands import Stream

LIBRARIES = ["cryptography", "numpy"]
SHAPES = {16: (32, 4), 256: (8, 16), 4096: (2, 64)}
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


def powers(count: int) -> np.ndarray:
    """M^(count-1) … M, 1."""
    return np.array([pow(M, n, WORD) for n in range(count - 1, -1, -1)], dtype=np.uint64)


def words(seed: int, size: int) -> list[int]:
    laps, segments = SHAPES[size]
    count = size * 16
    stream = Stream("cache.walk", seed, size)
    pairs = [(stream.word() & ~3 | 1, stream.word() | 1) for _ in range(4)]
    orders = [orbit(a, c, count) for a, c in pairs]
    first = stream.words(4)
    step = stream.word() | 1
    updates = stream.words(8)
    index = np.arange(count, dtype=np.uint64)
    tag = np.stack([np.uint64(t) + index * np.uint64(step) for t in first])
    weights = powers(count // segments)
    out = []
    for lap in range(laps):
        line = orders[lap % 4]
        read = tag[(line + lap) % 4, line]
        rewritten = tag[(line + lap + 1) % 4, line]
        a = (read.reshape(segments, -1) * weights).sum(axis=1, dtype=np.uint64)
        b = (rewritten.reshape(segments, -1) * weights).sum(axis=1, dtype=np.uint64)
        out += [int(w) for w in np.stack([a, b], axis=1).ravel()]
        tag[(line + lap + 1) % 4, line] = rewritten + np.uint64(updates[lap % 8])
    return out
