"""integer.compress by the library's search for byte strings: a match grows as long as its string occurs earlier. The stream is
one integer; it is read back by characters."""

from operands import Stream

LIBRARIES = ["cryptography"]
LENGTH, WINDOW = 8192, 2048
M = 1 << 64


def make_text(stream: Stream) -> bytes:
    entries = []
    for _ in range(64):
        u = stream.bytes(8)
        v = stream.bytes(8)
        entries.append((v + u[1:])[: 3 + u[0] % 8])
    data = stream.bytes(8 * 512)
    pieces = []
    for i in range(0, len(data), 2):
        f = int.from_bytes(data[i : i + 2], "little")
        pieces.append(entries[(f >> 4 & f >> 10) % 64] if f % 16 else bytes([f >> 8]))
    text = b"".join(pieces)
    return (text * (1 + LENGTH // len(text)))[:LENGTH]


def digest(words: list[int], count: int) -> list[int]:
    sums = [0] * count
    for i, w in enumerate(words):
        s = (sums[i % count] + w) % M
        sums[i % count] = ((s << 29) % M + (s >> 35)) * 0x9E3779B97F4A7C15 % M
    return sums


def tokens_of(text: bytes) -> list[tuple[int, int]]:
    """(length, distance), or (0, byte)."""
    out, i = [], 0
    while i < LENGTH:
        lowest, length, found = max(0, i - WINDOW), 3, -1
        while length < min(259, LENGTH - i):
            # the last occurrence that begins before i
            at = text.rfind(text[i : i + length + 1], lowest, i + length)
            if at < 0:
                break
            length, found = length + 1, at
        out.append((0, text[i]) if found < 0 else (length, i - found))
        i += 1 if found < 0 else length
    return out


def read_back(bits: str) -> bytes:
    """Bits as characters, in the order of the stream."""
    text, at = bytearray(), 0

    def take(count: int) -> int:
        nonlocal at
        at += count
        return int("0" + bits[at - count : at][::-1], 2)

    while len(text) < LENGTH:
        if take(1) == 0:
            text.append(take(8))
            continue
        k = bits.index("1", at) - at
        at += k + 1
        length = (1 << k) + take(k) + 3
        distance = take(11) + 1
        row = text[-distance:]
        text += (row * (length // distance + 1))[:length]
    return bytes(text)


def words(seed: int, size: int) -> list[int]:
    text = make_text(Stream("integer.compress", seed, size))
    tokens = tokens_of(text)
    bits = ""
    for length, rest in tokens:
        if length == 0:
            bits += "0" + f"{rest:08b}"[::-1]
        else:
            gamma = f"{length - 3:b}"
            bits += "1" + "0" * (len(gamma) - 1) + "1" + gamma[1:][::-1] + f"{rest - 1:011b}"[::-1]
    back = read_back(bits)
    assert back == text
    stream = int(bits[::-1], 2)
    stream_words = [stream >> at & M - 1 for at in range(0, len(bits), 64)]
    text_words = [int.from_bytes(back[i : i + 8], "little") for i in range(0, LENGTH, 8)]
    matches = sum(length > 0 for length, _ in tokens)
    (h,) = digest([rest if length == 0 else length + 65536 * rest for length, rest in tokens], 1)
    return [len(bits), len(tokens) - matches, matches, h, *digest(stream_words, 8), *digest(text_words, 8)]
