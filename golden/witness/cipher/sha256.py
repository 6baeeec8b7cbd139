"""cipher.sha256 by hashlib."""

import hashlib
import struct

from operands import Stream

LIBRARIES = ["cryptography"]


def words(seed: int, size: int) -> list[int]:
    stream = Stream("cipher.sha256", seed, size)
    digests = b"".join(hashlib.sha256(stream.bytes(255 * 8)[:-1]).digest() for _ in range(8))
    return list(struct.unpack(">32Q", digests))
