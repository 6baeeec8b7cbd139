"""memory.march without a memory: what a sound memory gives back is an arithmetic progression for each background, element
and half, digested in closed form."""

import numpy as np
from memory.common_digest import closed
from operands import Stream

LIBRARIES = ["cryptography", "numpy"]
# (downwards, value read) of the elements that read: ⇑r0 ⇑r1 ⇓r0 ⇓r1 ⇕r0
READS = [(False, 0), (False, 1), (True, 0), (True, 1), (False, 0)]
WORD = 1 << 64


def words(seed: int, size: int) -> list[int]:
    stream = Stream("memory.march", seed, size)
    starts, pattern, seeded = stream.words(8), stream.words(8), stream.words(8)
    step = stream.word() | 1
    both = (1 << 32) + 1
    grounds = [(pattern, 0), ([8 * lane * both for lane in range(8)], 64 * both), (seeded, step)]
    half = size * 16 // 2
    index = np.arange(half, dtype=np.uint64)[:, None]
    out = []
    for g, (ground, d) in enumerate(grounds):
        for h in range(2):
            zero = np.array(ground, dtype=np.uint64) + (index + np.uint64(h * half)) * np.uint64(d)
            for r, (down, read) in enumerate(READS):
                begin = np.array([(p + 10 * g + 2 * r + h) % WORD for p in starts], dtype=np.uint64)
                seen = ~zero if read else zero
                out.append(((g, r, h), closed(begin, seen[::-1] if down else seen)))
    return [int(w) for _, digest in sorted(out, key=lambda entry: entry[0]) for w in digest]
