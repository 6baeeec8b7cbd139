"""The lane digest of the memory kernels, over many digests side by side."""

import numpy as np

FACTOR = np.uint64(0xA24BAED4963EE407)


class Digests:
    """a ← rotl(a, 8) + v, b ← b + a for every element of an array; closed by a + F·b."""

    def __init__(self, start: np.ndarray):
        self.a = start.copy()
        self.b = np.zeros_like(start)
        self._high = np.zeros_like(start)

    def push(self, v: np.ndarray) -> None:
        np.right_shift(self.a, np.uint64(56), out=self._high)
        np.left_shift(self.a, np.uint64(8), out=self.a)
        np.bitwise_or(self.a, self._high, out=self.a)
        np.add(self.a, v, out=self.a)
        np.add(self.b, self.a, out=self.b)

    def finish(self) -> np.ndarray:
        return self.a + self.b * FACTOR
