"""memory.copy by real moves of bytes: one bytearray, slices copied at the very offsets, every hop's source read back."""

import numpy as np
from memory.common_digest import closed
from operands import Stream

LIBRARIES = ["cryptography", "numpy"]
SHAPES = {24: (1, 128), 384: (16, 16), 3072: (128, 8)}
SLOT, LINES, GROUPS = 12288, 190, 16
BYTES = 64 * LINES


def place(t: int) -> tuple[int, int]:
    if t < 64:
        return t % 2, 27 * t % 64
    u = t - 64
    return 1, (63 - (u - 1) // 2 if u % 2 else u // 2)


def words(seed: int, size: int) -> list[int]:
    payloads, rounds = SHAPES[size]
    stream = Stream("memory.copy", seed, size)
    starts = np.array(stream.words(8), dtype=np.uint64)
    first = np.array(stream.words(8), dtype=np.uint64)
    step = np.uint64(stream.word() | 1)
    memory = bytearray(size * 1024)

    def at(r: int, turn: int) -> int:
        side, offset = place((r * 128 // payloads + turn) % 128)
        return (side * payloads + r) * SLOT + offset

    data = first + np.arange(payloads * LINES, dtype=np.uint64)[:, None] * step
    for r in range(payloads):
        memory[at(r, 0) : at(r, 0) + BYTES] = data[LINES * r : LINES * (r + 1)].astype("<u8").tobytes()

    moved = []
    for turn in range(rounds):
        for r in range(payloads):
            source, target = at(r, turn), at(r, turn + 1)
            loaded = memory[source : source + BYTES]
            lines = np.frombuffer(loaded, dtype="<u8").reshape(LINES, 8)
            moved.append(lines[::-1] if source < target < source + BYTES else lines)
            memory[target : target + BYTES] = loaded
    groups = np.stack(moved).reshape(GROUPS, -1, 8)
    begins = starts + np.arange(GROUPS, dtype=np.uint64)[:, None]
    sources = [at(r, rounds) for r in range(payloads)]
    last = np.frombuffer(b"".join(memory[s : s + BYTES] for s in sources), dtype="<u8").reshape(-1, 8)
    digests = [*closed(begins, groups).ravel(), *closed(starts + np.uint64(GROUPS), last)]
    return [int(w) for w in digests]
