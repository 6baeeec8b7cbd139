"""The digests of this family on unbounded integers."""

M = (1 << 64) - 1


def chain(digest: int, word: int) -> int:
    product = (digest ^ word) * 0x9E3779B97F4A7C15 & M
    return (product << 29 & M) + (product >> 35)


def mix(word: int) -> int:
    z = (word ^ word >> 30) * 0xBF58476D1CE4E5B9 & M
    z = (z ^ z >> 27) * 0x94D049BB133111EB & M
    return z ^ z >> 31
