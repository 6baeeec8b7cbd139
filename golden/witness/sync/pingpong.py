"""sync.pingpong with numpy: the players in turn, each a generator that waits for its ball."""

import numpy as np

from operands import Stream

from sync.common_words import chain

LIBRARIES = ["cryptography", "numpy"]
STEPS = 32
LENGTHS = (7, 32, 32, 32)


def player(role: int, balls: list, moves: list, output: list[int]):
    digests = [0, 0]
    for step in range(STEPS):
        ball = balls[(step + role) % 2]
        while ball["turn"] != step:
            yield
        received = ball["words"]
        operand = np.resize(np.array(moves[step][role], dtype=np.uint64), received.size)
        total = np.roll(received, -1) + operand
        made = np.left_shift(total, np.uint64(23)) | np.right_shift(total, np.uint64(41))
        for i, words in enumerate((received, made)):
            for word in words.tolist():
                digests[i] = chain(digests[i], word)
        ball["words"], ball["turn"] = made, step + 1
        if step % 8 == 7:
            output += digests
            digests = [0, 0]


def words(seed: int, size: int) -> list[int]:
    stream = Stream("sync.pingpong", seed, size)
    games = [
        [{"words": np.array(stream.words(n), dtype=np.uint64), "turn": 0} for _ in range(2)] for n in LENGTHS
    ]
    output: list[list[int]] = [[], []]
    for balls in games:
        moves = [[stream.words(8), stream.words(8)] for _ in range(STEPS)]
        players = [player(role, balls, moves, output[role]) for role in (1, 0)]
        while players:
            players = [p for p in players if next(p, p) is not p]
    return output[0] + output[1]
