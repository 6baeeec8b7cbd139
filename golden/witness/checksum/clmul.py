"""checksum.clmul: CRC-32 by zlib, CRC-64 out of an .xz container by liblzma; the accumulators by integer products of numbers
whose digits are the bits, each digit wide enough that no carry leaves it (Kronecker substitution)."""

import lzma
import zlib

import numpy as np
from operands import Stream

LIBRARIES = ["cryptography", "numpy"]


def crc64(message: bytes) -> int:
    """The check field of a container: eight bytes before the index, whose length is in the footer (.xz format 2.1.2)."""
    box = lzma.compress(message, format=lzma.FORMAT_XZ, check=lzma.CHECK_CRC64, preset=0)
    index = 4 * (1 + int.from_bytes(box[-8:-4], "little"))
    return int.from_bytes(box[-12 - index - 8 : -12 - index], "little")


def spread(bits: bytes | np.ndarray) -> int:
    """Digits of 16 bits, highest power first."""
    return int.from_bytes(np.asarray(bits, dtype=">u2").tobytes(), "big")


def gather(number: int, count: int) -> np.ndarray:
    """The parities of the lowest `count` digits, highest power first."""
    return (np.frombuffer(number.to_bytes(2 * count, "big"), dtype=">u2") & 1).astype(np.uint8)


def power(polynomial: int, degree: int, k: int) -> int:
    """x^k mod polynomial * x^(64 - degree), spread."""
    polynomial <<= 64 - degree
    x = 1
    for _ in range(k):
        x <<= 1
        if x >> 64:
            x ^= polynomial
    return spread([x >> 63 - i & 1 for i in range(64)])


CHECKS = [
    (zlib.crc32, 32, 1 << 32 | 0x04C11DB7),
    (crc64, 64, 1 << 64 | 0x42F0E1EBA9EA3693),
]
POWERS = [(power(p, degree, 575), power(p, degree, 511)) for _, degree, p in CHECKS]


def accumulators(message: bytes, state: int, far: int, near: int) -> list[int]:
    bits = np.unpackbits(np.frombuffer(message[: len(message) // 64 * 64], dtype=np.uint8), bitorder="little")
    bits = bits.reshape(-1, 4, 128)
    bits[0, 0, :64] ^= np.unpackbits(np.frombuffer(state.to_bytes(8, "little"), dtype=np.uint8), bitorder="little")
    out = []
    for j in range(4):
        total = bits[0, j]
        for block in bits[1:, j]:
            # products of reflected words lie one place lower, hence one digit up
            product = spread(total[:64]) * far + spread(total[64:]) * near << 16
            total = gather(product, 128) ^ block
        out += np.packbits(total, bitorder="little").view("<u8").tolist()
    return out


def words(seed: int, size: int) -> list[int]:
    stream = Stream("checksum.clmul", seed, size)
    data = stream.bytes(8 * 1536)
    messages = []
    for v in stream.words(4):
        blocks = 4 + v % 512
        for count, field in ((blocks, v >> 16), (519 - blocks, v >> 32)):
            at = field % 65536 % 4049
            messages.append(data[at : at + 16 * count])
    out = []
    for (check, degree, _), (far, near) in zip(CHECKS, POWERS):
        ones = (1 << degree) - 1
        state, all_so_far = ones, b""
        for message in messages:
            sums = accumulators(message, state, far, near)
            all_so_far += message
            checksum = check(all_so_far)
            state = checksum ^ ones
            out += [checksum, *sums]
    return out
