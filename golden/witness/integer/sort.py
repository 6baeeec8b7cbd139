"""integer.sort by numpy: merged blocks and passes by its stable argsort, rounds of the network on whole arrays at once."""

import numpy as np
from operands import Stream

LIBRARIES = ["cryptography", "numpy"]
COUNT = 512
M = 1 << 64


def digest(row: np.ndarray) -> list[int]:
    sums = [0] * 4
    for i, w in enumerate(row.tolist()):
        s = (sums[i % 4] + w) % M
        sums[i % 4] = ((s << 29) % M + (s >> 35)) * 0x9E3779B97F4A7C15 % M
    return sums


def rounds() -> list[tuple[np.ndarray, int]]:
    places = np.arange(COUNT)
    out = []
    for p in (2**e for e in range(8, -1, -1)):
        for d, r in [(p, 0)] + [(q - p, p) for q in (2**e for e in range(8, -1, -1)) if q > p]:
            out.append((places[(places + d < COUNT) & (places & p == r)], d))
    return out


ROUNDS = rounds()


def words(seed: int, size: int) -> list[int]:
    drawn = np.array(Stream("integer.sort", seed, size).words(2 * COUNT), dtype=np.uint64).reshape(COUNT, 2)
    keys, payloads = drawn[:, 0].copy(), drawn[:, 1]
    few = keys % np.uint64(4) == 0
    keys[few] -= keys[few] % np.uint64(1 << 57)

    def records(order: np.ndarray) -> list[int]:
        return digest(np.column_stack([payloads[order], keys[order]]).ravel())

    out = []
    for block in (16, COUNT):
        blocks = np.argsort(keys.reshape(-1, block), axis=1, kind="stable")
        out += records((blocks + np.arange(0, COUNT, block)[:, None]).ravel())
    order = np.arange(COUNT)
    for i in range(8):
        mask = np.uint64((1 << 8 * i + 8) - 1)
        order = np.argsort(keys & mask, kind="stable")
        out += digest(payloads[order])
    out += digest(keys[order])
    order = np.lexsort((payloads, keys))
    out += records(order)
    ranks = np.empty(COUNT, dtype=np.int64)
    ranks[order] = np.arange(COUNT)
    h = 0
    for i, d in ROUNDS:
        a, b = ranks[i], ranks[i + d]
        changed = a > b
        ranks[i], ranks[i + d] = np.minimum(a, b), np.maximum(a, b)
        # base 3 with digits 0 and 1
        h = (h * 3 ** len(i) + int("".join("01"[c] for c in changed.tolist()), 3)) % M
    return out + [h]
