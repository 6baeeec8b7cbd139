"""integer.bits by unbounded integers: shifts are products and quotients with powers of two, bits are characters, counts are
gmpy2's."""

import operator

from gmpy2 import bit_scan1, mpz, popcount, t_divmod
from operands import Stream

LIBRARIES = ["cryptography", "gmpy2"]
M = 1 << 64


def signed(x: int, width: int) -> int:
    x %= 1 << width
    return x - (x >> width - 1 << width)


def text(x: int, width: int = 64) -> str:
    return format(x % (1 << width), f"0{width}b")


def left(x: str, count: int) -> str:
    count %= len(x)
    return x[count:] + x[:count]


def right(x: str, count: int) -> str:
    return left(x, -count)


def set_bit(x: int, i: int, to: str) -> int:
    digits = list(text(x))
    digits[63 - i] = to
    return int("".join(digits), 2)


def conditions(e: int, f: int, width: int, combine) -> list[bool]:
    """By ranges and comparisons: overflow and carry are results that the width cannot hold."""
    result, with_sign, modulus = combine(e, f), combine(signed(e, width), signed(f, width)), 1 << width
    overflow = not -modulus // 2 <= with_sign < modulus // 2
    carry = not 0 <= result < modulus
    zero = result % modulus == 0
    sign = result % modulus >= modulus // 2
    parity = bin(result % 256).count("1") % 2 == 0
    less = with_sign < 0
    pairs = (overflow, carry, zero, carry or zero, sign, parity, less, less or zero)
    return [yes == wanted for yes in pairs for wanted in (True, False)]


def thin(x: int, width: int) -> int:
    return x & (3 << width - 2 | 1)


def results(a: int, b: int, c: int) -> list[int]:
    k, l = c % 64, c // 64 % 64
    two_k, two_l = 1 << k, 1 << l
    bit = [c >> i & 1 for i in range(64)]
    z, t = (a | 1 << 63) // two_k, (b | 1) * two_l % M
    a32, b32 = a % (1 << 32), b % (1 << 32)
    k5, l5 = 1 << k % 32, 1 << l % 32
    out = [a * two_k % M, b // two_k, signed(b, 64) // two_l % M]
    out += [a32 * k5 % (1 << 32), b32 // k5, signed(a, 32) // l5 % (1 << 32)]
    out += [(a * M + b) * two_k // M % M, (b * M + a) // two_l % M]
    turns = [left(text(a), k), right(text(b), l), left(text(a, 32), k), right(text(b, 32), l)]
    turns += [left(text(a, 16), k), right(text(b, 8), l)]
    ring_a, ring_b = left(str(bit[12]) + text(a), k), right(str(bit[13]) + text(b), l)
    out += [int(x, 2) for x in turns + [ring_a[1:], ring_b[1:]]]

    z32, t32 = z % (1 << 32), t % (1 << 32)
    low = bit_scan1(mpz(t))
    out += [popcount(a), popcount(a32), 64 - z.bit_length(), 32 - z32.bit_length()]
    out += [z.bit_length() - 1, low, low, 32 if t32 == 0 else bit_scan1(mpz(t32))]
    source = iter(reversed(text(a)))
    spread = [next(source) if place == "1" else "0" for place in reversed(text(b))]
    gathered = [x for x, place in zip(text(b), text(a)) if place == "1"]
    out += [int("".join(reversed(spread)), 2), int("0" + "".join(gathered), 2)]
    out += [a // two_k % two_l, b % two_k, 1 << low, t - (1 << low), (2 << low) - 1]
    out += [b - (a & b), int(right(text(a), 27), 2)]
    out += [int.from_bytes((x % (1 << 8 * n)).to_bytes(n, "little"), "big") for x, n in ((a, 8), (b, 4), (b, 8), (a, 4), (a, 2))]
    out += [set_bit(a, k, "1"), set_bit(b, k, "0"), set_bit(a, l, str(1 - (a >> l & 1)))]

    powers = [9 ** (15 - i) for i in range(16)]
    moves = conditions(thin(a, 64), thin(b, 64), 64, operator.sub)
    out.append(sum(p * (a if c else b) for p, c in zip(powers, moves)) % M)
    sets = conditions(thin(a, 32), thin(b, 32), 32, operator.add)
    out += [int.from_bytes(bytes(sets[:8]), "little"), int.from_bytes(bytes(sets[8:]), "little")]
    jumps = conditions(thin(a >> 16, 16), thin(b >> 16, 16), 16, operator.sub)
    out.append(sum(p * (0 if c else i) for p, c, i in zip(powers, jumps, range(1, 17))))

    out += [(b + c) % M, (a - c) % M]
    equal = []
    for held, wanted, new in (
        (a if bit[14] else b, a, c),
        (b if bit[15] else c, b, a),
        ((a, b) if bit[16] else (a, c), (a, b), (c, a)),
    ):
        equal.append(held == wanted)
        after = new if held == wanted else held
        out += after if isinstance(after, tuple) else (after, held)

    total, rest = a + b + bit[17], b - a - bit[18]
    out += [-a % M, M - 1 - b, total % M, rest % M]
    out.append((a + 1 + (a != M - 2)) % M)
    out += [(a % 256) * (b % 256), signed(a, 16) * signed(b, 16) % (1 << 32)]
    q, r = t_divmod(a % 256, b % 256 | 1)
    out.append(int(q + 256 * r))
    q, r = t_divmod(signed(a, 16), b % (1 << 15) | 1)
    out.append(int(q % (1 << 16) + (r % (1 << 16)) * (1 << 16)))
    out += [(a + 8 * b + 0x1234567) % M, (a + 4 * b - 77) % (1 << 32)]
    out.append((signed(a, 8) + 3 * signed(b, 16) + 9 * signed(a, 32)) % M)
    out += [a % 256 + b % 65536, signed(b, 8) % M]
    out.append(((M - 1) * (a >> 63) + ((1 << 32) - 1) * (b >> 31 & 1)) % M)
    out.append((a * 3 ** (k % 8) + c.to_bytes(8, "little")[k % 8]) % M)
    tests = [x >> i & 1 for x, i in ((a, l), (a, k), (b, k), (a, l))]
    carries = [int(ring_a[0]), int(ring_b[0]), *tests, int(total >= M), int(rest < 0), *equal]
    out.append(sum(int(x) << i for i, x in enumerate(carries)) + ((c >> 12) % 256 & 0xD5 | 2) * 65536)
    return [int(x) for x in out]


def words(seed: int, size: int) -> list[int]:
    stream = Stream("integer.bits", seed, size)
    x, y, *sums = stream.words(6)
    out = []
    for step in range(48):
        m, n, c = stream.words(3)
        for i, r in enumerate(results((x + m) % M, y ^ n, c)):
            sums[i % 4] = int(left(text(sums[i % 4] + r), 29), 2) * 0x9E3779B97F4A7C15 % M
        x, y = (sums[0] + sums[1]) % M, (sums[2] + sums[3]) % M
        if step % 8 == 7:
            out += sums
    return out
