"""vector.mask by numpy: all nets at once, floats compared as floats."""

import numpy as np

from operands import Stream

LIBRARIES = ["cryptography", "numpy"]
U = {w: np.dtype(f"<u{w // 8}") for w in (8, 16, 32, 64)}
S = {w: np.dtype(f"<i{w // 8}") for w in (8, 16, 32, 64)}
F = {32: np.dtype("<f4"), 64: np.dtype("<f8")}

PREDICATES = {
    "eq": np.equal,
    "lt": np.less,
    "le": np.less_equal,
    "unord": lambda a, b: np.isnan(a) | np.isnan(b),
    "neq": np.not_equal,
    "nlt": lambda a, b: ~(a < b),
    "nle": lambda a, b: ~(a <= b),
    "ord": lambda a, b: ~np.isnan(a) & ~np.isnan(b),
    "eq_uq": lambda a, b: (a == b) | np.isnan(a) | np.isnan(b),
    "nge": lambda a, b: ~(a >= b),
    "ngt": lambda a, b: ~(a > b),
    "never": lambda a, b: np.zeros(a.shape, bool),
    "neq_oq": lambda a, b: (a < b) | (a > b),
    "ge": np.greater_equal,
    "gt": np.greater,
    "always": lambda a, b: np.ones(a.shape, bool),
}


def out(x):
    return np.ascontiguousarray(x).view(np.uint8).reshape(4, 16)


def wrapping(width, f):
    return lambda a, b: out(f(a.view(U[width]), b.view(U[width])))


def selected(width):
    return lambda a, b, m: out(np.where(m.view(S[width]) < 0, b.view(U[width]), a.view(U[width])))


def compared(width, f):
    return lambda a, b: out(-f(a.view(F[width]), b.view(F[width])).astype(S[width]))


def operations():
    ops = {"and": np.bitwise_and, "or": np.bitwise_or, "xor": np.bitwise_xor, "andnot": lambda a, b: ~a & b}
    for w in (8, 16, 32, 64):
        ops[f"add{w}"], ops[f"sub{w}"], ops[f"select{w}"] = wrapping(w, np.add), wrapping(w, np.subtract), selected(w)
    for w in (32, 64):
        for name, f in PREDICATES.items():
            ops[f"{name}_f{w}"] = compared(w, f)
        for name in ("and", "or", "xor", "andnot"):
            ops[f"{name}_f{w}"] = ops[name]
        for kind in "if":
            select = ops[f"select{w}"]
            ops[f"keep_{kind}{w}"] = lambda line, m, select=select: select(np.zeros_like(line), line, m)
            ops[f"put_{kind}{w}"] = select
    by = {"select8_by_and": (8, lambda m, n, o: m & n ^ o), "select8_by_xnor": (8, lambda m, n, o: ~(m ^ n) & o)}
    by |= {"select16_by_or": (16, lambda m, n, o: (m | n) ^ o), "select32_by_andnot": (32, lambda m, n, o: ~m & n | o)}
    for name, (w, f) in by.items():
        select = ops[f"select{w}"]
        ops[name] = lambda a, b, m, n, o, select=select, f=f: select(a, b, f(m, n, o))
    return ops


# block that takes a result in, by which sum, the operation, its sources: x blocks, k lines, a to e results of steps before,
# which have that letter in place of a block; but a "put" stays in memory for a round before it is such a result.
STEPS = """
b - put_i64 x4 x5 k1
c - put_f32 x2 x4 k0
0 add8 select8 x4 x5 k0
1 sub16 select8_by_and x4 x2 x5 x3 k0
a - select32 x4 k1 x2
0 xor or a a
1 add32 eq_f32 a x4
0 sub64 lt_f32 k1 a
1 add16 le_f32 x5 x2
0 sub8 unord_f32 x3 k0
1 add64 keep_i32 k0 x4
0 sub32 and_f32 x4 x3
a - select64 x5 k0 x3
1 add8 or a a
0 sub16 le_f64 a x5
1 xor unord_f64 k0 a
0 add32 eq_f64 x4 x3
1 sub64 lt_f64 x2 k1
0 add16 and_f64 x5 x3
1 sub8 andnot x5 x2
d - put_f64 x7 x5 k3
2 add64 select8 x6 x7 k2
3 sub32 select16_by_or x7 x4 x6 x5 k3
a - select32 x6 k3 x4
2 add8 or a a
3 sub16 neq_f32 a x6
2 xor nlt_f32 k3 a
3 add32 nle_f32 x7 x4
2 sub64 ord_f32 x5 k2
3 add16 keep_i64 k3 x7
2 sub8 or_f32 x7 x4
a - select64 x7 k2 x5
3 add64 or a a
2 sub32 nle_f64 a x7
3 add8 ord_f64 k2 a
2 sub16 neq_f64 x6 x5
3 xor nlt_f64 x4 k3
2 add32 or_f64 x6 x4
3 sub64 or b b
2 add16 or c c
3 sub8 and x6 x7
e - put_i32 x7 x6 k4
4 add64 select8 x0 x1 k4
5 sub32 select8_by_xnor x0 x6 x1 x7 k4
a - select32 x0 k5 x6
4 add8 or a a
5 sub16 eq_uq_f32 a x0
4 xor nge_f32 k5 a
5 add32 ngt_f32 x1 x6
4 sub64 never_f32 x7 k4
5 add16 keep_f32 k4 x6
4 sub8 xor_f32 x6 x7
a - select64 x1 k4 x7
5 add64 or a a
4 sub32 ngt_f64 a x1
5 add8 never_f64 k4 a
4 sub16 eq_uq_f64 x0 x7
5 xor nge_f64 x6 k5
4 add32 xor_f64 x6 x0
5 sub64 or d d
4 add16 andnot x1 x6
7 sub8 select8 x2 x3 k6
6 add64 select32_by_andnot x3 x1 x2 x0 k7
a - select32 x2 k7 x0
7 sub32 or a a
6 add8 neq_oq_f32 a x2
7 sub16 ge_f32 k7 a
6 xor gt_f32 x3 x0
7 add32 always_f32 x1 k6
6 sub64 keep_f64 k7 x1
7 add16 andnot_f32 x1 x3
a - select64 x3 k6 x1
6 sub8 or a a
7 add64 gt_f64 a x3
6 sub32 always_f64 k6 a
7 add8 neq_oq_f64 x2 x1
6 sub16 ge_f64 x0 k7
7 xor andnot_f64 x2 x3
6 add32 or e e
7 sub64 and x2 x3
"""


def parsed():
    ops = operations()
    for line in STEPS.split("\n"):
        if line:
            into, by, name, *sources = line.split()
            yield into, ops.get(by), name.startswith("put"), ops[name], [(s[0], int(s[1:] or 0)) for s in sources]


def none(x, kind):
    """Where no element of a block has its top bit."""
    return ~(np.ascontiguousarray(x).view(kind) < 0).any(axis=1)


def gathered(flags):
    """Columns of bits, the first lowest, as 16 bits a net of one word."""
    values = sum(column.astype(np.uint64) << np.uint64(i) for i, column in enumerate(flags))
    return sum(int(v) << 16 * net for net, v in enumerate(values))


def words(seed: int, size: int) -> list[int]:
    stream = Stream("vector.mask", seed, size)

    def lines(count):
        return np.frombuffer(stream.bytes(64 * count), dtype=np.uint8).reshape(count, 4, 16)

    steps = list(parsed())
    x = list(lines(8))
    rounds = [list(lines(8)) for _ in range(32)]
    digest, memory = 0, dict.fromkeys("bcde", np.zeros((4, 16), np.uint8))
    with np.errstate(all="ignore"):
        for k in rounds * 3:
            kept = {}
            for into, by, put, op, sources in steps:
                value = op(*({"x": x, "k": k}[s][i] if s in "xk" else kept[s] for s, i in sources))
                if put:
                    value, memory[into] = memory[into], value
                if into in "abcde":
                    kept[into] = value
                else:
                    x[int(into)] = by(x[int(into)], value)
            m, n = np.bitwise_and.reduce(k[:6]), k[1] & k[6]
            first = gathered((out(x[0] - x[5]) >> 7).T)
            flags = list((x[0].view(S[32]) < 0).T) + list((x[3].view(S[64]) < 0).T)
            flags += [~(x[0] & m).any(axis=1), ~(~x[0] & m).any(axis=1)]
            flags += [none(x[0] & n, S[32]), none(~x[0] & n, S[32]), none(x[3] & n, S[64]), none(~x[3] & n, S[64])]
            for word in (first, gathered(flags)):
                turned = (digest << 29 | digest >> 35) & (1 << 64) - 1
                digest = turned * 0x9E3779B97F4A7C15 + word & (1 << 64) - 1
    for j, stored in enumerate(memory.values()):
        x[2 * j] = operations()["add64"](x[2 * j], stored)
    return [int(w) for block in x for w in block.reshape(64).view("<u8")] + [digest]
