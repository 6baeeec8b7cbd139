"""vector.shuffle by numpy's general indexing.

The tags' rounds are turned into index arrays: each layer is applied to the numbers 0 to 255 once a round, and the rest
is composition of permutations. The sums are computed on whole arrays of both nets.
"""

import numpy as np

from operands import Stream

LIBRARIES = ["cryptography", "numpy"]
ORDERS = [0x93, 0x4E, 0x39, 0x1B, 0xB1, 0xD2, 0x2D, 0x87]


def shuffle_bytes(a, control):
    lanes = a.reshape(*a.shape[:-1], 2, 16)
    c = control.reshape(2, 16)
    taken = np.take_along_axis(lanes, np.broadcast_to(c & 15, lanes.shape).astype(np.intp), axis=-1)
    return np.where(c & 128, 0, taken).astype(a.dtype).reshape(a.shape)


def permute_elements(a, index):
    return a.reshape(*a.shape[:-1], 8, 4)[..., index & 7, :].reshape(a.shape)


def permute_words(a, order):
    return a.reshape(*a.shape[:-1], 4, 8)[..., [order >> 2 * i & 3 for i in range(4)], :].reshape(a.shape)


def align(a, low, count):
    both = np.concatenate([x.reshape(*x.shape[:-1], 2, 16) for x in (low, a)], axis=-1)
    return both[..., count : count + 16].reshape(a.shape)


def zipped(a, b, size, high):
    """Low or high halves of the lanes, elements of both alternating."""
    halves = [x.reshape(*x.shape[:-1], 2, 2, 8 // size, size)[..., :, int(high), :, :] for x in (a, b)]
    return np.stack(halves, axis=-2).reshape(a.shape)


def lanes(a, b, which):
    return np.concatenate([x[..., 16 * which : 16 * which + 16] for x in (a, b)], axis=-1)


def pack(a, b):
    numbers = [np.ascontiguousarray(x).view("<i2").reshape(*x.shape[:-1], 2, 8) for x in (a, b)]
    return np.clip(np.concatenate(numbers, axis=-1), 0, 255).astype(np.uint8).reshape(a.shape)


def add(a, *others):
    total = np.ascontiguousarray(a).view("<u8")
    for other in others:
        total = total + np.ascontiguousarray(other).view("<u8")
    return total.view(np.uint8)


def shuffled(random: bytes) -> list[int]:
    places = list(range(len(random)))
    for i in range(len(random) - 1, 0, -1):
        j = random[i] % (i + 1)
        places[i], places[j] = places[j], places[i]
    return places


def tags_index(s, e, m):
    """Where each of the 256 bytes comes from in one round."""
    x = np.arange(256, dtype=np.int64).reshape(8, 32)
    x = np.array([shuffle_bytes(x[k], s[k % 4]) for k in range(8)])
    for k, size in ((0, 1), (2, 2), (4, 4), (6, 8)):
        x[k], x[k + 1] = zipped(x[k], x[k + 1], size, False), zipped(x[k], x[k + 1], size, True)
    x = np.array([permute_elements(x[k], e[k % 4]) for k in range(8)])
    x = np.array([permute_words(x[k], ORDERS[k]) for k in range(8)])
    for a, b in ((0, 2), (1, 3), (4, 6), (5, 7)):
        other = m[a // 4] >= 128
        x[a], x[b] = np.where(other, x[b], x[a]), np.where(other, x[a], x[b])
    for a, count in ((0, 5), (1, 11)):
        x[a], x[a + 4] = align(x[a], x[a + 4], count), align(x[a + 4], x[a], count)
    for a in (2, 3):
        x[a], x[a + 4] = lanes(x[a], x[a + 4], 0), lanes(x[a], x[a + 4], 1)
    return x.reshape(256)


def sums_round(x, s, e, m):
    """x[block, net, byte] after one round."""
    near = np.tile(np.array([255, 1], dtype=np.uint8), 16)
    a, b, c, d, p, q, r, t = x
    a, b, c, d = (
        add(a, shuffle_bytes(p, s[0]), align(q, r, 7)),
        add(b, permute_elements(q, e[0]), zipped(t, p, 2, True)),
        add(c, zipped(r, t, 1, False), permute_words(p, 0x1E)),
        add(d, np.where(m[0] >= 128, r, p), pack(q & near, t & near)),
    )
    p, q, r, t = (
        add(p, shuffle_bytes(a, s[1]), align(c, b, 9)),
        add(q, permute_elements(b, e[1]), zipped(d, a, 4, False)),
        add(r, zipped(c, d, 1, True), permute_words(a, 0xB1)),
        add(t, np.where(m[1] >= 128, d, b), lanes(b, c, 0)),
    )
    return a, b, c, d, p, q, r, t


def words(seed: int, size: int) -> list[int]:
    stream = Stream("vector.shuffle", seed, size)

    def blocks(count):
        return np.frombuffer(stream.bytes(32 * count), dtype=np.uint8).reshape(count, 32)

    keys = [key & 255 for key in stream.words(2)]
    sums = tuple(np.stack([blocks(8) for _ in range(2)], axis=1))
    index = np.arange(256)
    rounds = []
    for _ in range(24):
        s = np.array([shuffled(stream.bytes(16)) + shuffled(stream.bytes(16)) for _ in range(4)])
        e = np.array([shuffled(stream.bytes(8)) for _ in range(4)])
        index = index[tags_index(s, e, blocks(2))]
        raw = blocks(2)
        s = np.where(raw >> 4 & 7 == 7, 128 | raw & 15, raw & 15)
        e = np.frombuffer(stream.bytes(16), dtype=np.uint8).reshape(2, 8)
        rounds.append((s, e, blocks(2)))
    once = index
    for _ in range(11):
        index = index[once]
    for _ in range(12):
        for s, e, m in rounds:
            sums = sums_round(sums, s, e, m)
    parts = [(index ^ key).astype(np.uint8).tobytes() for key in keys]
    parts += [np.stack([x[net] for x in sums]).tobytes() for net in range(2)]
    return [int(w) for w in np.frombuffer(b"".join(parts), dtype="<u8")]
