"""cache.forward on byte arrays, the loads collected first and digested afterwards."""

import struct

from operands import Stream

LIBRARIES = ["cryptography"]
M = 0xD1342543DE82EF95
WIDTHS = (1, 2, 4, 8, 16, 32)


def words(seed: int, size: int) -> list[int]:
    operands = Stream("cache.forward", seed, size).bytes(512)
    z, h = seed % 64, seed // 64
    borders = [bytearray(operands[:256]), bytearray(operands[:256])]
    loads = [[] for _ in range(72)]
    for turn in range(4):
        n = 0
        for i, w in enumerate(WIDTHS):
            for j, v in enumerate(WIDTHS):
                for distance in range(-v, w + 1):
                    memory = borders[(n + turn + h) % 2]

                    def store(at: int, count: int, index: int) -> None:
                        memory[at : at + count] = operands[8 * index : 8 * index + count]

                    a = 64 + (z + 16 * turn + 11 * n) % 64
                    load = slice(a + distance, a + distance + v)
                    store(a, w, (5 * n + 17 * turn) % 61)
                    loads[12 * i + 2 * j].append(bytes(memory[load]))
                    store(a, w, (7 * n + 23 * turn) % 61)
                    u = 2 ** ((n + turn) % 6)
                    store(a + distance - u + 1 + (z + 3 * n + 5 * turn) % (v + u - 1), u, (11 * n + 29 * turn) % 61)
                    loads[12 * i + 2 * j + 1].append(bytes(memory[load]))
                    n += 1
    out = []
    for pair in loads:
        loaded = b"".join(part.ljust(-len(part) % 8 + len(part), b"\0") for part in pair)
        digest = 0
        for word in struct.unpack(f"<{len(loaded) // 8}Q", loaded):
            digest = (digest * M + word) % (1 << 64)
        out.append(digest)
    return out
