"""The operand stream of a case by the `cryptography` package's ChaCha20 (RFC 8439)."""

import struct

from cryptography.hazmat.primitives.ciphers import Cipher, algorithms


class Stream:
    """Little-endian 64-bit words of the key stream keyed by (seed, size, kernel id)."""

    def __init__(self, kernel: str, seed: int, size: int):
        key = struct.pack("<QI20s", seed, size, kernel.encode("ascii"))
        self._cipher = Cipher(algorithms.ChaCha20(key, bytes(16)), mode=None).encryptor()

    def bytes(self, count: int) -> bytes:
        return self._cipher.update(bytes(count))

    def words(self, count: int) -> list[int]:
        return list(struct.unpack(f"<{count}Q", self.bytes(8 * count)))

    def word(self) -> int:
        return self.words(1)[0]
