"""memory.march without a memory: what a sound memory gives back is an arithmetic progression for each background, element
and half, so all 240 digests advance side by side."""

import numpy as np
from memory.common_digest import Digests
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
    begin, value, change = [], [], []
    for g, (ground, d) in enumerate(grounds):
        for r, (down, read) in enumerate(READS):
            for h in range(2):
                line = h * half + (half - 1 if down else 0)
                for lane in range(8):
                    v = (ground[lane] + line * d) % WORD
                    delta = -d if down else d
                    begin.append((starts[lane] + 10 * g + 2 * r + h) % WORD)
                    value.append(WORD - 1 - v if read else v)
                    change.append((-delta if read else delta) % WORD)
    value, change = np.array(value, dtype=np.uint64), np.array(change, dtype=np.uint64)
    digests = Digests(np.array(begin, dtype=np.uint64))
    for _ in range(half):
        digests.push(value)
        np.add(value, change, out=value)
    return [int(w) for w in digests.finish()]
