"""Writes an initramfs: initramfs.py ARCHIVE NAME=FILE...

The format is "newc", as the Linux kernel's documentation describes it (Documentation/driver-api/early-userspace/
buffer-format.rst): per entry the magic 070701, thirteen fields of eight hexadecimal digits, the name with a zero byte,
the content; name and content are padded to four bytes. A console node is added, which needs no rights this way.
"""

import sys

FOLDER, PROGRAM, CHARACTER_DEVICE = 0o040755, 0o100755, 0o020600


def entry(number, name, mode, content=b"", device=(0, 0)):
    links = 2 if mode == FOLDER else 1
    fields = [number, mode, 0, 0, links, 0, len(content), 0, 0, *device, len(name) + 1, 0]
    head = b"070701" + b"".join(b"%08X" % f for f in fields) + name.encode() + b"\0"
    return head + b"\0" * (-len(head) % 4) + content + b"\0" * (-len(content) % 4)


def main(archive, *files):
    entries = [("bin", FOLDER), ("dev", FOLDER), ("dev/console", CHARACTER_DEVICE, b"", (5, 1))]
    for file in files:
        name, path = file.split("=", 1)
        with open(path, "rb") as f:
            entries.append((name, PROGRAM, f.read()))
    entries.append(("TRAILER!!!", 0))
    with open(archive, "wb") as out:
        for number, e in enumerate(entries, 1):
            out.write(entry(number, *e))


main(*sys.argv[1:])
