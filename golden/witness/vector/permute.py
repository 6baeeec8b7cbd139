"""vector.permute by numpy: a round as one index array, made by reshaping and transposing; twelve passes by composition."""

import numpy as np

from operands import Stream

LIBRARIES = ["cryptography", "numpy"]


def shuffled(random: bytes) -> list[int]:
    places = list(range(16))
    for i in range(15, 0, -1):
        j = random[i] % (i + 1)
        places[i], places[j] = places[j], places[i]
    return places


def zipped(a, b, size):
    """Elements of the lanes alternately of a and b, then the lower and the upper halves of the doubled lanes."""
    both = np.stack([x.reshape(4, 16 // size, size) for x in (a, b)], axis=2).reshape(4, 2, 16)
    return both[:, 0].reshape(64), both[:, 1].reshape(64)


def changed(a, b, places):
    a, b = a.reshape(4, 16).copy(), b.reshape(4, 16).copy()
    a[:, places], b[:, places] = b[:, places].copy(), a[:, places].copy()
    return a.reshape(64), b.reshape(64)


def first(a, size):
    r = a.reshape(2, 2, 16).copy()
    r[:, :, :size] = r[:, ::-1, :size].copy()
    return r.reshape(64)


def quarters(a, order):
    return a.reshape(2, 4, 8)[:, order].reshape(64)


def aligned(high, low, count):
    return np.concatenate([low.reshape(4, 16), high.reshape(4, 16)], axis=1)[:, count : count + 16].reshape(64)


def in_lanes(a, *shifts):
    """Each lane cut into equal parts, and each part rolled by its shift in bytes."""
    parts = np.split(a.reshape(4, 16), len(shifts), axis=1)
    return np.concatenate([np.roll(part, shift, axis=1) for part, shift in zip(parts, shifts)], axis=1).reshape(64)


def round_index(orders):
    a, b, c, d = (x.reshape(16, 4)[o].reshape(64) for x, o in zip(np.arange(256).reshape(4, 64), orders))
    a, b, c, d = in_lanes(a, 4, 4), in_lanes(b, 8), in_lanes(c, -4), in_lanes(d, 2, -2)
    (a, b), (c, d) = zipped(a, b, 4), zipped(c, d, 8)
    a, b, c = quarters(a, [1, 2, 3, 0]), quarters(b, [3, 0, 1, 2]), quarters(c, [0, 2, 1, 3])
    d = d.reshape(2, 2, 16)[:, ::-1].reshape(64)
    (a, c), (b, d) = changed(a, c, slice(0, 4)), changed(b, d, slice(0, 8))
    a, b, c, d = first(a, 4), first(b, 8), np.roll(c, -4), d.reshape(4, 16)[[2, 0, 3, 1]].reshape(64)
    a, d = changed(a, d, slice(6, 8))
    b, c = aligned(b, c, 5), aligned(c, b, 5)
    split = np.concatenate([x.reshape(4, 2, 2, 4) for x in (a, b)], axis=1)
    a, b = split[:, :, 0].reshape(64), split[:, :, 1].reshape(64)
    pairs = np.stack([x.reshape(2, 2, 16) for x in (c, d)], axis=2)
    c, d = pairs[:, 0].reshape(64), pairs[:, 1].reshape(64)
    a, c = aligned(c, a, 8), aligned(a, c, 8)
    b, d = zipped(b, d, 4)
    return np.concatenate([a, b, c, d])


def words(seed: int, size: int) -> list[int]:
    stream = Stream("vector.permute", seed, size)
    keys = [key & 255 for key in stream.words(2)]
    sets = [(np.arange(256) ^ key).astype(np.uint8) for key in keys]
    sets += [np.frombuffer(stream.bytes(256), dtype=np.uint8) for _ in range(2)]
    once = np.arange(256)
    for _ in range(16):
        once = once[round_index([shuffled(stream.bytes(16)) for _ in range(4)])]
    index = once
    for _ in range(11):
        index = index[once]
    return [int(w) for x in sets for w in np.ascontiguousarray(x[index]).view("<u8")]
