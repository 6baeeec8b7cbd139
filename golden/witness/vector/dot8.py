"""vector.dot8 by numpy: bytes as 64-bit integers, all lanes' products contracted at once."""

import numpy as np

from operands import Stream

LIBRARIES = ["cryptography", "numpy"]


def unsigned(x):
    return x.view(np.uint8).reshape(16, 4).astype(np.int64)


def signed(x):
    return x.view(np.int8).reshape(16, 4).astype(np.int64)


def words(seed: int, size: int) -> list[int]:
    stream = Stream("vector.dot8", seed, size)

    def lines(count):
        return np.frombuffer(stream.bytes(64 * count), dtype="<u4").reshape(count, 16)

    x = list(lines(12))
    rounds = []
    for _ in range(16):
        k = lines(24)
        even, odd = [unsigned(line) for line in k], [signed(line) for line in k]
        # of two operands nothing changes from pass to pass: their products are known before
        known = [np.einsum("lb,lb->l", even[2 * t], odd[2 * t + 1]) for t in range(12)]
        rounds.append(([odd[2 * t] for t in range(12)], [even[2 * t + 1] for t in range(12)], known))
    for first, second, known in rounds * 16:
        for t in range(12):
            # sources are of other groups: they are the same for all four steps of a target
            near = x[(t // 3 * 3 + 3 + (t + 1) % 3) % 12]
            far = unsigned(x[(t + 6) % 12])
            total = (far * first[t] + second[t] * signed(near) + unsigned(near) * signed(x[(t + 6) % 12])).sum(axis=1)
            x[t] = (x[t] + total + known[t] & 0xFFFFFFFF).astype("<u4")
    return [int(w) for line in x for w in line.view("<u8")]
