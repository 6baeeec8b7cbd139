"""Answers for one kernel: `answer.py KERNEL`, questions "seed size" on stdin, answers "seed size hexwords" on stdout.

The first line of the answer names the libraries. Each witness module has `words(seed, size) -> list[int]`
(unsigned 64-bit) and `LIBRARIES`, the modules it leans on.
"""

import sys

# last, not first: families may have the names of the library's own modules, such as `string`
sys.path.append(sys.path.pop(0))

from importlib.metadata import version
from importlib.util import module_from_spec, spec_from_file_location


def main() -> int:
    kernel = sys.argv[1]
    spec = spec_from_file_location(kernel.replace(".", "_"), f"{sys.path[-1]}/{kernel.replace('.', '/')}.py")
    module = module_from_spec(spec)
    spec.loader.exec_module(module)
    questions = [tuple(map(int, line.split())) for line in sys.stdin if line.strip()]
    print(", ".join(f"{name} {version(name)}" for name in module.LIBRARIES))
    for seed, size in questions:
        words = module.words(seed, size)
        print(seed, size, "".join(f"{w:016x}" for w in words))
    return 0


if __name__ == "__main__":
    sys.exit(main())
