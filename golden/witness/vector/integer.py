"""vector.integer by numpy: all nets at once, elements as arrays of their own type, wider where a result is."""

import numpy as np

from operands import Stream

LIBRARIES = ["cryptography", "numpy"]
WIDTHS = (8, 16, 32, 64)
U = {w: np.dtype(f"<u{w // 8}") for w in WIDTHS}
S = {w: np.dtype(f"<i{w // 8}") for w in WIDTHS}
KINDS = {"u": U, "s": S}


def out(x):
    return np.ascontiguousarray(x).view(np.uint8).reshape(4, 16)


def wrapping(width, f):
    return lambda a, b: out(f(a.view(U[width]), b.view(U[width])))


def saturated(x, kind):
    info = np.iinfo(kind)
    return np.clip(x, info.min, info.max).astype(kind)


def saturating(kind, f):
    wide = np.int32
    return lambda a, b: out(saturated(f(a.view(kind).astype(wide), b.view(kind).astype(wide)), kind))


def chosen(kind, f):
    return lambda a, b: out(f(a.view(kind), b.view(kind)))


def compared(kind, width, f):
    return lambda a, b: out(-f(a.view(kind), b.view(kind)).astype(S[width]))


def average(width):
    return lambda a, b: out(((a.view(U[width]).astype(np.uint32) + b.view(U[width]) + 1) >> 1).astype(U[width]))


def packed(width, kind):
    return lambda a, b: out(saturated(np.concatenate([a.view(S[width]), b.view(S[width])], axis=1), kind))


def zipped(width, high):
    def op(a, b):
        half = 64 // width
        return out(np.stack([x.view(U[width])[:, high * half :][:, :half] for x in (a, b)], axis=2))

    return op


def neighbours(kind, f):
    return lambda a, b: out(f(*(np.concatenate([x.view(kind)[:, i::2] for x in (a, b)], axis=1) for i in (0, 1))))


def shift(a, kind, count, f):
    """Shifts by as many as the width or more are done in two steps, which numpy defines."""
    x, bits = a.view(kind), kind.itemsize * 8
    whole = count >= bits
    return out(f(f(x, kind.type(count - 1)), kind.type(1)) if whole else f(x, kind.type(count)))


def each(a, counts, kind, f):
    return out(f(a.view(kind), counts.view(kind)))


def sign(width):
    # -b would not change the sign of the most negative b, its signum does
    return lambda a, b: out(a.view(S[width]) * np.sign(b.view(S[width])))


def absolute(width):
    return lambda a: out(np.abs(a.view(S[width])))


def products(kind, drop):
    width = kind.itemsize * 8
    return lambda a, b: out((a.view(kind).astype(np.int64) * b.view(kind).astype(np.int64) >> drop).astype(U[width]))


def wide_products(kind, wide):
    return lambda a, b: out(a.view(kind)[:, ::2].astype(wide) * b.view(kind)[:, ::2].astype(wide))


def madd16(a, b):
    p = a.view(S[16]).astype(np.int64) * b.view(S[16])
    return out((p[:, ::2] + p[:, 1::2]).astype(np.uint32))


def madd8(a, b):
    p = a.astype(np.int32) * b.view(np.int8)
    return out(saturated(p[:, ::2] + p[:, 1::2], S[16]))


def mul_round16(a, b):
    return out(((a.view(S[16]).astype(np.int64) * b.view(S[16]) + 0x4000) // 0x8000).astype(np.uint16))


def sad8(a, b):
    return out(np.abs(a.astype(np.int64) - b).reshape(4, 2, 8).sum(axis=2))


def sad_window(a, b):
    windows = np.lib.stride_tricks.sliding_window_view(a[:, 4:15].astype(np.int32), 4, axis=1)
    return out(np.abs(windows - b[:, None, 4:8]).sum(axis=2).astype(np.uint16))


def least_u16(a):
    x, r = a.view(U[16]), np.zeros((4, 8), U[16])
    r[:, 1] = x.argmin(axis=1)
    r[:, 0] = x.min(axis=1)
    return out(r)


def left_bytes(a, n):
    return np.concatenate([np.zeros((4, n), np.uint8), a[:, : 16 - n]], axis=1)


def right_bytes(a, n):
    return np.concatenate([a[:, n:], np.zeros((4, n), np.uint8)], axis=1)


def widened(kinds, narrow, wide):
    """The narrow elements at the line's start, as many as fill four blocks when wide."""
    return lambda line: out(line.reshape(64)[: 64 * narrow // wide].view(kinds[narrow]).astype(kinds[wide]))


def operations():
    ops = {}
    for w in WIDTHS:
        ops[f"add{w}"], ops[f"sub{w}"] = wrapping(w, np.add), wrapping(w, np.subtract)
        ops[f"eq{w}"], ops[f"gt{w}"] = compared(U[w], w, np.equal), compared(S[w], w, np.greater)
        ops[f"low{w}"], ops[f"high{w}"] = zipped(w, 0), zipped(w, 1)
    for w in (8, 16):
        ops[f"avg{w}"] = average(w)
        for letter, kinds in KINDS.items():
            ops[f"adds_{letter}{w}"] = saturating(kinds[w], np.add)
            ops[f"subs_{letter}{w}"] = saturating(kinds[w], np.subtract)
    for w in (8, 16, 32):
        ops[f"abs{w}"], ops[f"sign{w}"] = absolute(w), sign(w)
        for letter, kinds in KINDS.items():
            ops[f"min_{letter}{w}"], ops[f"max_{letter}{w}"] = chosen(kinds[w], np.minimum), chosen(kinds[w], np.maximum)
    for w in (16, 32):
        for letter, kinds in KINDS.items():
            ops[f"pack_{letter}{w}"] = packed(w, kinds[w // 2])
    for w in (16, 32, 64):
        for name, kind, f in (("left", U, np.left_shift), ("right", U, np.right_shift), ("right_s", S, np.right_shift)):
            ops[f"{name}{w}"] = ops[f"{name}{w}_by"] = lambda a, n, kind=kind[w], f=f: shift(a, kind, n, f)
            ops[f"{name.replace('_s', '')}_each{'_s' if 's' in name else ''}{w}"] = (
                lambda a, c, kind=kind[w], f=f: each(a, c, kind, f)
            )
    for narrow in WIDTHS:
        for wide in (w for w in WIDTHS if w > narrow):
            ops[f"zero{narrow}to{wide}"], ops[f"sign{narrow}to{wide}"] = widened(U, narrow, wide), widened(S, narrow, wide)
    ops |= {"and": np.bitwise_and, "or": np.bitwise_or, "xor": np.bitwise_xor, "andnot": lambda a, b: ~a & b}
    ops |= {"mul_low16": products(S[16], 0), "mul_low32": products(S[32], 0)}
    ops |= {"mul_high_s16": products(S[16], 16), "mul_high_u16": products(U[16], 16)}
    ops |= {"mul_u32": wide_products(U[32], np.uint64), "mul_s32": wide_products(S[32], np.int64)}
    ops |= {"madd16": madd16, "madd8": madd8, "mul_round16": mul_round16}
    ops |= {"pairs_add16": neighbours(S[16], np.add), "pairs_add32": neighbours(S[32], np.add)}
    ops |= {"pairs_sub16": neighbours(S[16], np.subtract), "pairs_sub32": neighbours(S[32], np.subtract)}

    def near(f):
        return lambda x, y: saturated(f(x.astype(np.int32), y), S[16])

    ops |= {"pairs_adds16": neighbours(S[16], near(np.add)), "pairs_subs16": neighbours(S[16], near(np.subtract))}
    ops |= {"sad8": sad8, "sad_window": sad_window, "least_u16": least_u16}
    return ops | {"left_bytes": left_bytes, "right_bytes": right_bytes}


# block that takes a result in, by which sum, the operation, its sources: x blocks, k lines, n numbers, c counts, a the
# result of the step before. Steps of no block only give the next ones their a.
STEPS = """
0 add8 adds_s8 x4 k0
1 sub16 adds_s16 x5 k1
0 add32 adds_u8 x2 k2
1 sub64 adds_u16 x3 k3
0 xor subs_s8 x5 k2
1 add64 subs_s16 x2 k3
0 sub8 subs_u8 x3 k0
1 add16 subs_u16 x4 k1
0 sub32 avg8 x4 x5
1 add8 avg16 x2 x3
0 sub16 mul_low16 x4 x3
1 add32 mul_high_s16 x5 x2
0 add64 mul_high_u16 x2 x4
1 sub8 mul_u32 x3 x5
0 xor madd16 x4 x2
1 sub64 mul_low32 x5 x3
0 add16 mul_s32 x2 x5
1 add32 madd8 x3 x4
0 add64 mul_round16 x5 x4
- - min_u8 x4 x5
1 sub8 or a a
0 sub64 eq8 a x5
- - max_u16 x2 x3
1 xor or a a
0 add8 eq16 a x2
- - min_s32 x5 x3
1 sub32 or a a
0 sub8 eq32 a x3
1 sub64 max_u8 x2 x4
0 sub32 min_s16 x3 x5
1 xor max_s16 x4 x2
0 add32 gt8 x3 x2
1 add16 gt16 x4 x5
0 sub64 gt32 x5 x2
1 add8 gt64 x2 x4
0 sub16 pack_s16 x4 x2
2 sub32 pack_s32 x7 x5
3 add16 pack_u16 x4 x7
2 add64 pack_u32 x5 x6
3 xor low8 x7 x5
2 add8 low16 x4 x6
3 sub8 low32 x5 x7
- - low64 x6 x4
2 sub16 or a a
3 add8 eq64 a x6
2 sub16 abs8 x4
3 add32 abs16 x5
2 xor abs32 x6
3 sub32 sign8 x7 x4
2 add64 sign16 x4 x5
3 sub16 sign32 x5 x6
2 add16 pairs_add16 x6 x5
3 add64 pairs_sub32 x7 x6
2 sub8 pairs_adds16 x4 x7
3 xor left16_by x5 n3
2 sub64 left32_by x6 n11
3 add16 left64_by x7 n23
2 add32 left_bytes x4 n5
3 add64 and x6 x5
2 add32 zero8to16 k1
3 sub64 zero8to32 k2
2 xor zero8to64 k3
3 add8 sign16to32 k0
2 sub32 sign16to64 k1
3 sub8 sign32to64 k2
2 sub64 left16 x6 c0
3 sub32 left32 x7 c1
2 add8 left64 x4 c2
3 add32 right_s16 x5 c3
2 add16 left_each32 x7 k9
3 sub64 left_each64 x4 k10
2 sub8 sad8 x5 x4
4 sub64 adds_s8 x1 k4
5 add8 adds_u16 x6 k5
4 xor subs_u8 x7 k6
5 add32 subs_s16 x0 k7
4 add16 avg8 x6 k7
5 sub32 mul_low16 x7 k4
4 add64 mul_high_u16 x0 k5
5 sub8 madd16 x1 k6
4 add32 mul_low32 x7 x0
5 sub16 madd8 x0 x6
4 add8 mul_u32 x1 x7
- - max_s8 x0 x1
5 xor or a a
4 sub8 eq8 a x0
- - max_u32 x6 x7
5 add64 or a a
4 sub32 eq32 a x7
- - min_u16 x1 x6
5 sub64 or a a
4 add8 eq16 a x6
5 xor min_s8 x0 x7
4 add16 max_s32 x1 x0
5 add8 min_u32 x7 x6
4 sub16 gt8 x0 x6
5 add32 gt16 x1 x7
4 sub8 gt32 x6 x0
5 sub16 gt64 x7 x1
4 xor high8 x0 x1
5 sub64 high16 x1 x6
4 add32 high32 x6 x7
- - high64 x1 x2
6 add64 or a a
7 add64 eq64 a x2
6 add16 pairs_add32 x3 x1
7 sub16 pairs_sub16 x0 x3
6 sub32 pairs_subs16 x1 x2
7 sub32 right16_by x2 n5
6 sub8 right32_by x3 n9
7 sub64 right64_by x0 n21
6 add16 right_s16_by x1 n4
7 add8 right_s32_by x3 n13
6 xor right_bytes x2 n7
7 add64 or x1 x3
6 sub8 andnot x0 x2
7 sub64 sign8to16 k4
6 add8 sign8to32 k5
7 xor sign8to64 k6
6 add32 zero16to32 k7
7 add16 zero16to64 k5
6 sub32 zero32to64 k6
7 add8 right16 x2 c4
6 xor right32 x3 c5
7 add32 right64 x0 c6
6 add64 right_s32 x1 c7
7 sub32 right_each32 x3 k9
6 sub64 right_each64 x0 k10
7 sub8 right_each_s32 x1 k9
6 sub16 sad_window x2 x1
7 add16 least_u16 x3
6 add8 sad8 x0 x3
"""


def parsed():
    ops = operations()
    for line in STEPS.split("\n"):
        if line:
            into, by, name, *sources = line.split()
            yield None if into == "-" else int(into), ops.get(by), ops[name], [(s[0], int(s[1:] or 0)) for s in sources]


def words(seed: int, size: int) -> list[int]:
    stream = Stream("vector.integer", seed, size)

    def lines(count):
        return np.frombuffer(stream.bytes(64 * count), dtype=np.uint8).reshape(count, 4, 16)

    steps = list(parsed())
    x = list(lines(8))
    rounds = []
    for _ in range(32):
        k = list(lines(11))
        counts = [int(n) % (1 + w) for n, w in zip(k[8].reshape(64).view("<u8"), (16, 32, 64, 16, 16, 32, 64, 32))]
        k[9] = out(k[9].view("<u4") & 31)
        k[10] = out(k[10].view("<u8") & 63)
        rounds.append((k, counts))
    digest = 0
    for k, counts in rounds * 3:
        a = None
        for into, by, op, sources in steps:
            value = op(*(a if s == "a" else {"x": x, "k": k, "c": counts}[s][i] if s in "xkc" else i for s, i in sources))
            if into is None:
                a = value
            else:
                x[into] = by(x[into], value)
        signs = np.packbits(out(x[0] - x[5]).reshape(64) >> 7, bitorder="little").view("<u8")[0]
        digest = ((digest << 29 | digest >> 35) & (1 << 64) - 1) * 0x9E3779B97F4A7C15 + int(signs) & (1 << 64) - 1
    return [int(w) for block in x for w in block.reshape(64).view("<u8")] + [digest]
