"""cipher.aes by the `cryptography` package (its AES is OpenSSL's): CBC encryption, ECB decryption of all chains at once."""

import struct

from cryptography.hazmat.primitives.ciphers import Cipher, algorithms, modes
from operands import Stream

LIBRARIES = ["cryptography"]


def words(seed: int, size: int) -> list[int]:
    stream = Stream("cipher.aes", seed, size)
    out = b""
    for key_bytes, encrypt in [(16, True), (16, False), (32, True), (32, False)]:
        key = stream.bytes(key_bytes)
        state = stream.bytes(24 * 16)
        plain = stream.bytes(64 * 16)
        aes = algorithms.AES(key)
        if encrypt:
            # the last block of CBC with the start block as its initialisation vector
            for c in range(24):
                out += Cipher(aes, modes.CBC(state[16 * c : 16 * c + 16])).encryptor().update(plain)[-16:]
        else:
            decryptor = Cipher(aes, modes.ECB()).decryptor()
            for i in range(0, len(plain), 16):
                mask = int.from_bytes(plain[i : i + 16] * 24, "little")
                state = decryptor.update((int.from_bytes(state, "little") ^ mask).to_bytes(24 * 16, "little"))
            out += state
    return list(struct.unpack(f"<{len(out) // 8}Q", out))
