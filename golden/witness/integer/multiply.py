"""integer.multiply by Python's unbounded integers."""

from operands import Stream

LIBRARIES = ["cryptography"]
MASK = (1 << 64) - 1


def words(seed: int, size: int) -> list[int]:
    stream = Stream("integer.multiply", seed, size)
    chains = stream.words(8)
    for m in stream.words(1024):
        m |= 1
        products = [x * m for x in chains]
        chains = [low + (before >> 64) & MASK for low, before in zip(products, products[-1:] + products[:-1])]
    return chains
