"""integer.multiply by Python's unbounded integers."""

from operands import Stream

LIBRARIES = ["cryptography"]
MASK = (1 << 64) - 1


def words(seed: int, size: int) -> list[int]:
    stream = Stream("integer.multiply", seed, size)
    chains = stream.words(8)
    for m in stream.words(1024):
        m |= 1
        chains = [(p & MASK ^ p >> 64) + m & MASK for p in (x * m for x in chains)]
    return chains
