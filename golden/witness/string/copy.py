"""string.copy by slices of byte strings, their own searches for whole elements, and the digest in closed form with numpy."""

import struct

import numpy as np
from operands import Stream

LIBRARIES = ["cryptography", "numpy"]
FACTOR = 0xA24BAED4963EE407
WORD = 1 << 64


def digest(starts: list[int], group: int, data: bytes) -> list[int]:
    """Sums of u = v xor (v >> 32) and of u weighted by its distance from the end, lane by lane."""
    v = np.frombuffer(data, dtype="<u8").reshape(-1, 8)
    u = v ^ (v >> np.uint64(32))
    weights = np.arange(len(u), 0, -1, dtype=np.uint64)[:, None]
    plain, weighted = u.sum(axis=0, dtype=np.uint64), (u * weights).sum(axis=0, dtype=np.uint64)
    start = [(s + group) % WORD for s in starts]
    return [(s + int(a) + FACTOR * (s * len(u) + int(b))) % WORD for s, a, b in zip(start, plain, weighted)]


def split(data: bytes, w: int) -> list[bytes]:
    return [data[i : i + w] for i in range(0, len(data) // w * w, w)]


def words(seed: int, size: int) -> list[int]:
    stream = Stream("string.copy", seed, size)
    page = list(range(256))
    for i in range(255, 0, -1):
        k = stream.word() % (i + 1)
        page[i], page[k] = page[k], page[i]
    key, key_step = stream.word(), stream.word() | 1
    factor, first = 1 + stream.word() % 256, stream.word() % 257
    starts = stream.words(8)
    book = b"".join(bytes((p + key + i * key_step) % 256 for p in page) for i in range(16))

    slots = [bytes(512)] * 32
    groups = [[] for _ in range(16)]
    used = 0
    for j in range(257):
        n = (factor * j + first) % 257
        draw, value = stream.words(2)
        x, y, p, q = draw % 57, draw // 2**16 % 2**16 % 55, draw // 2**32 % 2**16 % (n + 1), draw // 2**48 % (n + 1)
        taken = groups[16 * j // 257]

        def shape(form: int) -> tuple[int, int, int, int, int]:
            s = (seed + 5 * n + 9 * form) % 64
            t = (27 * seed + seed // 64 + 11 * n + 23 * form) % 64
            return s, t, 2 ** ((n + t + form + seed // 64) % 4), 64 * ((x + 5 * form) % 57), 64 * ((x + 1 + y + 5 * form) % 57)

        compared = [0, 0]
        for form in range((n + seed) % 3, 9, 3):
            s, t, w, source, cover = shape(form)
            slot = book[cover : cover + 512]
            at, moved = 64 + t, book[source + s : source + s + n]
            if form in (3, 4):
                at = 64 + s + (t - s - 1) % 64 + 1
                moved = slot[64 + s : 64 + s + n]
            elif form in (5, 6):
                begin = 64 + t + (s - t - 1) % 64 + 1
                moved = slot[begin : begin + n]
            elif form in (7, 8):
                moved = struct.pack("<Q", value)[:w] * (n // w)
            slot = bytearray(slot[:at] + moved + slot[at + len(moved) :])
            if form == 2:
                slot[at + p] ^= 255
                slot[at + q] = (slot[at + q] + 1) % 256
                pairs = zip(split(bytes(slot[at : at + n]), w), split(moved, w))
                unequal = [i for i, (a, b) in enumerate(pairs) if a != b]
                compared = [unequal[0], unequal[-1] + 1] if unequal else [n // w, 0]
            slots[used % 32] = bytes(slot)
            taken.append(slots[used % 32])
            used += 1

        s, _, w, source, _ = shape(9)
        found, read = [], []
        if (n + seed) % 3:
            found, read = [0] * 4, [0] * 2
        e = value // 2**32 % (n // w + 1)
        for w in () if (n + seed) % 3 else (w, 1 if w == 8 else 2 * w):
            begin, count = source + s, n // w
            elements = split(book[begin : begin + n], w)
            k = e % (count + 1)
            wanted = book[begin + k * w : begin + k * w + w]
            where = [i for i, element in enumerate(elements) if element == wanted]
            found += [where[0], where[-1] + 1] if where else [count, 0]
            values = [int.from_bytes(element, "little") for element in elements]
            read.append((sum(values) + FACTOR * sum(v * (count - i) for i, v in enumerate(values))) % WORD)
        taken.append(struct.pack("<8Q", *compared, *found, *read))
    out = []
    for g, taken in enumerate(groups):
        out += digest(starts, g, b"".join(taken))
    return out + digest(starts, 16, book + b"".join(slots))
