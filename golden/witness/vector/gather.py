"""vector.gather by numpy's take: the sums in one go, the chases a vector at a time."""

import numpy as np

from operands import Stream

LIBRARIES = ["cryptography", "numpy"]


def chase(table, start, turn, bits, steps):
    x = start
    for _ in range(steps):
        x = (x << turn | x >> bits - turn) + table[x & len(table) - 1]
    return x


def words(seed: int, size: int) -> list[int]:
    stream = Stream("vector.gather", seed, size)

    def draw(count):
        return np.frombuffer(stream.bytes(8 * count), dtype="<u8")

    key = stream.word()
    turns = (draw(4) & 0xFFFFFFFF).astype(np.uint32)
    half, full = draw(8).view("<u4"), draw(8)
    indices = draw(1024).view("<u4").reshape(128, 16)
    table = draw((size - 9) * 128).view("<u4")
    place = (np.arange(len(table), dtype=np.uint64) + np.uint64(key & 0xFFFF)).astype(np.uint32) & np.uint32(0xFFFF)
    table = table & np.uint32(0xFFFF0000) | place
    wide = table.view("<u8")

    at = indices ^ turns[:, None, None]
    narrow_sums = np.take(table, at & len(table) - 1).sum(axis=(0, 1), dtype=np.uint64) & 0xFFFFFFFF
    wide_sums = np.take(wide, at & len(wide) - 1).sum(axis=(0, 1), dtype=np.uint64)
    steps = at.shape[0] * at.shape[1]
    narrow = chase(table, half, 7, 32, steps)
    return [int(w) for part in (narrow_sums, wide_sums, narrow, chase(wide, full, 13, 64, steps)) for w in part]
