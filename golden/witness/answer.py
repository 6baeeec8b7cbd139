"""Answers for one kernel: `answer.py KERNEL`, questions "seed size" on stdin, answers "seed size hexwords" on stdout.

The first line of the answer names the libraries. Each witness module has `words(seed, size) -> list[int]`
(unsigned 64-bit) and `LIBRARIES`, the modules it leans on.
"""

import standard  # noqa: F401, I001

import importlib
import sys
from importlib.metadata import version


def main() -> int:
    kernel = sys.argv[1]
    module = importlib.import_module(kernel)
    questions = [tuple(map(int, line.split())) for line in sys.stdin if line.strip()]
    print(", ".join(f"{name} {version(name)}" for name in module.LIBRARIES))
    for seed, size in questions:
        words = module.words(seed, size)
        print(seed, size, "".join(f"{w:016x}" for w in words))
    return 0


if __name__ == "__main__":
    sys.exit(main())
