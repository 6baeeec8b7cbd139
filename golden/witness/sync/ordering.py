"""sync.ordering by playing the shapes on a memory that keeps every order, in an order drawn by lot."""

import random

from operands import Stream

from sync.common_words import chain

LIBRARIES = ["cryptography"]
TIMES = 32
MARKS = (0, 0x9E3779B97F4A7C15, 0x6A09E667F3BCC908)

# W place value, R place; fences do nothing on such a memory
SHAPES = """
Wx1 Wy1 | Ry Rx
Wx1 Wy1 | Ry Rx
Wx1 Wy1 | Ry Rx
Wx1 Ry | Wy1 Rx
Wx1 Ry | Wy1 Rx
Wx1 Ry | Wy1 Rx
Wx1 Ry | Wy1 Rx
Rx Wy1 | Ry Wx1
Wx2 Wy1 | Ry Wx1
Wx1 Wy1 | Wy2 Rx
Wx1 Wy2 | Wy1 Wx2
Wx1 | Rx Rx
Wx1 Wx2 | Rx Rx
Rx Wx1 | Wx2
Wx1 Rx | Wx2
Wx1 Rx Ry | Wy1 Ry Rx
Wx1 Rx | Wx2 Rx
"""


def words(seed: int, size: int) -> list[int]:
    stream = Stream("sync.ordering", seed, size)
    lot = random.Random(seed)
    output: list[list[int]] = [[], []]
    for line in SHAPES.split("\n")[1:-1]:
        threads = [part.split() for part in line.split("|")]
        writers = {p: {i for i, t in enumerate(threads) for op in t if op[:2] == "W" + p} for p in "xy"}
        digests = [0, 0]
        for _ in range(TIMES):
            base = dict(zip("xy", stream.words(2)))
            values = {p: [word ^ mark for mark in MARKS] for p, word in base.items()}
            memory = dict(base)
            loaded: list[list[tuple[str, int]]] = [[], []]
            turns = [0] * len(threads[0]) + [1] * len(threads[1])
            lot.shuffle(turns)
            left = [iter(thread) for thread in threads]
            for role in turns:
                kind, place, *number = next(left[role])
                if kind == "W":
                    memory[place] = values[place][int(number[0])]
                else:
                    loaded[role].append((place, memory[place]))
            for role in range(2):
                for place, word in loaded[role]:
                    digests[role] = chain(digests[role], 0 if word in values[place] else word ^ base[place])
                for place in "xy":
                    word = memory[place]
                    if len(writers[place]) == 2:
                        # either may come last
                        word = 0 if word in values[place] else word ^ base[place]
                    digests[role] = chain(digests[role], word)
        for role in range(2):
            output[role] += [0, 0, digests[role]]
    return output[0] + output[1]
