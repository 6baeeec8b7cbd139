"""integer.divide by Python's unbounded integers and its own floor division."""

from operands import Stream

LIBRARIES = ["cryptography"]
WORD = 1 << 64
MASK = WORD - 1
HALF = (1 << 32) - 1


def truncated(n: int, d: int) -> tuple[int, int]:
    """Division that rounds towards zero, from one that rounds down."""
    q, r = divmod(n, d)
    if r and (n < 0) != (d < 0):
        q, r = q + 1, r - d
    return q, r


def signed(value: int, bits: int) -> int:
    return value - (value >> bits - 1 << bits)


def absorb(x: int, q: int, r: int) -> int:
    s = x + q & MASK
    return ((s << 29 | s >> 35) * 0x9E3779B97F4A7C15 + r) % WORD


def words(seed: int, size: int) -> list[int]:
    stream = Stream("integer.divide", seed, size)
    chains = stream.words(4)
    for _ in range(128):
        w0, addend, w2, w3, w4, shape = stream.words(6)
        wide = (w0 | 1 << 63) >> (shape & 63)
        long = (w2 | 1 << 63) >> (shape >> 6 & 63)
        whole = (w3 | 1 << 63) >> 1 + min(shape >> 12 & 63, 61)
        short = (w4 & HALF | 1 << 31) >> (shape >> 19 & 31)
        half = (w4 >> 32 | 1 << 31) >> 1 + min(shape >> 24 & 31, 29)
        if shape & 1 << 18:
            whole = -whole
        if shape & 1 << 29:
            half = -half
        for i, x in enumerate(chains):
            high = x >> 65 - wide.bit_length()
            low = (x << 32 | x >> 32) & MASK ^ addend
            x = absorb(x, *divmod(high << 64 | low, wide))
            x = absorb(x, *divmod(x, long))
            x = absorb(x, *(v & MASK for v in truncated(signed(x, 64), whole)))
            x = absorb(x, *divmod(x & HALF, short))
            chains[i] = absorb(x, *(v & HALF for v in truncated(signed(x >> 32, 32), half)))
    return chains
