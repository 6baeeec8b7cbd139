"""integer.carry by Python's unbounded integers: whole 1,024-bit numbers, no limbs."""

from operands import Stream

LIBRARIES = ["cryptography"]
BITS = 1024
ALL = (1 << BITS) - 1
TURN = 5 * 64


def turned(x: int) -> int:
    return (x << TURN | x >> BITS - TURN) & ALL


def mask(stream: Stream) -> int:
    count, *fields = stream.words(4)
    places = [word >> 10 * k & 1023 for word in fields for k in range(6)]
    return sum(1 << place for place in set(places[: 1 + count % 16]))


def words(seed: int, size: int) -> list[int]:
    stream = Stream("integer.carry", seed, size)

    def number() -> int:
        return int.from_bytes(stream.bytes(BITS // 8), "little")

    pairs = [(number(), number(), 0), (number(), number(), 0)]
    steps = [(mask(stream), mask(stream), number(), number()) for _ in range(48)]
    for m, n, b, c in steps * 4:

        def step(p: int, q: int, carry: int) -> tuple[int, int, int]:
            def settle(x: int) -> int:
                """The result mod 2^1024; what lies outside, above or below, is the next carry or borrow."""
                nonlocal carry
                carry = int(not 0 <= x <= ALL)
                return turned(x & ALL)

            t = settle(q + (ALL ^ q ^ m) + carry)
            p = settle(p - t - carry)
            u = settle((p ^ n) - p - carry)
            p = settle(p + b + carry)
            q = settle(q + u + carry)
            q = settle(q - c - carry)
            return p, q, carry

        pairs = [step(*pair) for pair in pairs]
    out = []
    for p, q, _ in pairs:
        for x in (p, q):
            out += [x >> 64 * i & (1 << 64) - 1 for i in range(16)]
    return out + [pairs[0][2] | pairs[1][2] << 1]
