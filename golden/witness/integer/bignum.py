"""integer.bignum by GMP: whole products, and the power in one formula out of modular powers and an inverse."""

from gmpy2 import invert, mpz, powmod
from operands import Stream

LIBRARIES = ["cryptography", "gmpy2"]
BITS = 2048
R = mpz(1) << BITS


def limbs(x: mpz, count: int) -> list[int]:
    return [int(x >> 64 * i) & (1 << 64) - 1 for i in range(count)]


def words(seed: int, size: int) -> list[int]:
    stream = Stream("integer.bignum", seed, size)

    def drawn() -> bytes:
        return stream.bytes(BITS // 8)

    def number(data: bytes) -> mpz:
        return mpz(int.from_bytes(data, "little"))

    a, b = number(drawn()), number(drawn())
    p = mpz(0)
    for _ in range(16):
        mask = drawn()
        backwards = b"".join(mask[i : i + 8] for i in range(len(mask) - 8, -1, -8))
        p = a * b
        a, b = p % R ^ number(mask), p // R ^ number(backwards)
    out = limbs(p, 64)

    n = number(drawn()) | 1 | 1 << BITS - 1
    y, zero, one = (number(drawn()) % (R // 2) for _ in range(3))
    (exponent,) = stream.words(1)
    inverse = invert(R, n)
    for count in (12, 24):
        ones = (exponent % (1 << 24)) >> 24 - count
        full = (1 << count) - 1
        # every bit squares, which brings one R below, and multiplies by a base, which brings one more
        power = powmod(y, 1 << count, n) * powmod(one, ones, n) * powmod(zero, full - ones, n)
        out += limbs(power * powmod(inverse, 2 * full, n) % n, 32)
    return out
