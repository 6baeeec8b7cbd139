"""integer.multiply by Python's unbounded integers; the high halves of four steps at a time, summed with weights."""

from operands import Stream

LIBRARIES = ["cryptography"]
WORD = 1 << 64
HALF = 1 << 32


def chain(x: int, multipliers: list[int]) -> tuple[int, int, int]:
    a = s = 0
    for i in range(0, len(multipliers), 4):
        high = []
        for m in multipliers[i : i + 4]:
            h, x = divmod(x * m, WORD)
            high.append(h)
        upper, lower = divmod(a, HALF)
        a = lower * HALF + upper
        # the sum that the group begins with counts in all four steps, a high half in its own and those after it
        s += 4 * a + sum(weight * h for weight, h in zip((4, 3, 2, 1), high))
        a = (a + sum(high)) % WORD
    return x, a, s % WORD


def words(seed: int, size: int) -> list[int]:
    stream = Stream("integer.multiply", seed, size)
    starts = stream.words(8)
    multipliers = [m | 1 for m in stream.words(1024)]
    return [word for column in zip(*(chain(x, multipliers) for x in starts)) for word in column]
