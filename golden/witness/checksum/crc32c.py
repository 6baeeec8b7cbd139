"""checksum.crc32c as a sum over all one bits of the message of the powers of x that they stand for, by numpy."""

import numpy as np
from operands import Stream

LIBRARIES = ["cryptography", "numpy"]
# the Castagnoli polynomial, lowest bit for the highest power
POLYNOMIAL = 0x82F63B78


def powers(count: int) -> np.ndarray:
    """x^0, x^1 ... mod the polynomial, in reflected order."""
    out, x = np.empty(count, dtype=np.uint32), 1 << 31
    for k in range(count):
        out[k] = x
        x = x >> 1 ^ POLYNOMIAL * (x & 1)
    return out


POWERS = powers(8 * 4 * 1024 + 32)


def bits(of: bytes) -> np.ndarray:
    return np.unpackbits(np.frombuffer(of, dtype=np.uint8), bitorder="little")


def extend(state: int, message: bytes) -> int:
    terms = bits(message + bytes(4))
    terms[:32] ^= bits(state.to_bytes(4, "little"))
    return int(np.bitwise_xor.reduce(POWERS[: len(terms)][::-1][terms == 1]))


def words(seed: int, size: int) -> list[int]:
    stream = Stream("checksum.crc32c", seed, size)
    data = stream.bytes(16384)
    groups = []
    for _ in range(32):
        length, first, second = stream.words(3)
        groups += [(length % 1024, first), (1023 - length % 1024, second)]
    state = [0xFFFFFFFF] * 4
    out = []
    for start in range(0, len(groups), 4):
        for chain in range(4):
            message = b""
            for length, offsets in groups[start : start + 4]:
                at = (offsets >> 14 * chain) % 16384 % 15361
                message += data[at : at + length]
            state[chain] = extend(state[chain], message)
        a, b, c, d = (x ^ 0xFFFFFFFF for x in state)
        out += [a | b << 32, c | d << 32]
    return out
