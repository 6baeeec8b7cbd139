#!/usr/bin/env python3
"""Writes the example ledgers beside it, from the documented layout alone (src/ledger/record.rs, folder.rs,
recover.rs) and with hashlib, so that the reader is held to a second implementation. They are committed and stay as
they are: programs of every later version must read them as this one does. `check DIR` verifies the chain of any
ledger that is whole, and prints its lines and head."""

import hashlib
import json
import pathlib
import re
import sys

HERE = pathlib.Path(__file__).parent
MARKER = b'{"schema":"proofhouse/ledger/1","name":"000102030405060708090a0b0c0d0e0f","created_ms":1700000000000}\n'
LINE = re.compile(rb'\{"v":1,"seq":(0|[1-9][0-9]*),"prev":"([0-9a-f]{64})","sha":"([0-9a-f]{64})","body":(.*)\}')


def sha(data):
    return hashlib.sha256(data).hexdigest()


def what(slice_, cpu=1):
    return {"slice": slice_, "cpu": cpu, "core": cpu, "kernel": "integer.multiply", "variant": "portable",
            "condition": "solo, steady 100 %"}


def planned(*which):
    return {**what(*which), "purpose": "plan"}


def events():
    at = 1700000000000
    yield {"kind": "opened", "job_id": 1, "job": "window", "wall_ms": at, "budget_s": 60.0, "seed": 7,
           "host": "machine-id:0011", "part": "0x1f 0x2a", "virtualised": True, "program": "0.1.0",
           "golden": "00ff", "cpus": [0, 1]}
    yield {"kind": "intent", "job_id": 1, "job": "window", "wall_ms": at + 10,
           "assignments": [planned(1), planned(2, 0), planned(3)]}
    tail = {"wall_ms": at + 20, "span_ns": 1000000000, "busy_ns": 990000000, "cases": 4, "runs": 80000,
            "operations": 81920000, "unit": "multiply", "fold": "right", "checked_on": 0, "surroundings": {}}
    yield {"kind": "mismatch", "job_id": 1, "job": "window", "purpose": "plan", **what(1), "seed": 11, "size": 0, "wall_ms": at + 500,
           "run": 17, "noticed_by": "comparison", "wrong_words": 1,
           "words": [{"index": 3, "expected": "00000000000000ff", "actual": "00000000000000fe",
                      "xor": "0000000000000001", "difference": "-1"}],
           "neighbours": [[0, "integer.multiply portable"]], "surroundings": {"celsius": 61.5, "khz": 3200000}}
    yield {"kind": "slice", "job_id": 1, "job": "window", "purpose": "plan", **what(1), **tail, "mismatches": 1,
           "mismatch_ms": [at + 500, at + 500]}
    yield {"kind": "slice", "job_id": 1, "job": "window", "purpose": "plan", **what(2, 0), **tail, "mismatches": 0,
           "void": "ran on cpu 1"}
    yield {"kind": "lost", "job_id": 1, "job": "window", **what(3), "wall_ms": at + 2000, "how": {"signal": 4}}
    yield {"kind": "finding", "job_id": 1, "job": "window", **{k: v for k, v in what(1).items() if k != "slice"},
           "seed": 11, "size": 0, "wall_ms": at + 3000, "confirmed": True, "confirmation": "repeated",
           "mismatches": 1, "recomputed_on": [0], "suspect": [{"cpu": 1, "runs": 1000, "mismatches": 2}],
           "controls": [{"cpu": 0, "runs": 1000, "mismatches": 0}], "counters": [], "lacking": [],
           "statement": "cpu 1 gave a wrong product"}
    yield {"kind": "novelty", "of_a_later_program": [1, {"deep": None}]}
    yield {"kind": "remark", "job_id": 1, "wall_ms": at + 3500, "text": "grüße, \"quoted\" \\ and\ttabbed"}
    yield {"kind": "closed", "job_id": 1, "job": "window", "wall_ms": at + 4000, "wall_s": 4.0, "ending": "budget",
           "verdict": "withdraw", "slices": 2}
    yield {"kind": "opened", "job_id": 2, "job": "window", "wall_ms": at + 90000, "budget_s": 0.1, "seed": 8,
           "host": "machine-id:0011", "part": "0x1f 0x2a", "virtualised": True, "program": "0.1.0",
           "golden": "00ff", "cpus": [0, 1]}
    yield {"kind": "intent", "job_id": 2, "job": "window", "wall_ms": at + 90010, "assignments": [planned(1, 0), planned(2, 1)]}
    yield {"kind": "slice", "job_id": 2, "job": "window", "purpose": "plan", **what(1, 0), **tail, "mismatches": 0}


def chain(bodies, seq=0, prev=None, version=1):
    prev = prev or sha(MARKER)
    lines = []
    for body in bodies:
        if isinstance(body, dict):
            body = json.dumps(body, ensure_ascii=False, separators=(",", ":")).encode()
        line = b'{"v":%d,"seq":%d,"prev":"%s","sha":"%s","body":%s}' % (
            version, seq, prev.encode(), sha(body).encode(), body)
        lines.append(line)
        seq, prev = seq + 1, sha(line)
    return lines


def put(name, *segments, marker=MARKER, **others):
    folder = HERE / name
    folder.mkdir(exist_ok=True)
    if marker:
        (folder / "ledger.json").write_bytes(marker)
    for number, data in enumerate(segments, 1):
        (folder / f"segment-{number:06}.jsonl").write_bytes(data)
    for file, data in others.items():
        (folder / file.replace("_", ".")).write_bytes(data)


def text(lines):
    return b"".join(line + b"\n" for line in lines)


def make():
    bodies = list(events())
    lines = chain(bodies)
    cut = 9
    put("clean", text(lines[:cut]), text(lines[cut:]))
    torn = lines[-1][:100]
    put("torn", text(lines[:cut]), text(lines[cut:-1]) + torn)
    first = text(lines[:3])
    prefix = ("torn tail kept: segment-000001.jsonl@%d+%d sha256:%s, segment-000002.jsonl@0+4 sha256:%s;"
              % (len(first), len(torn), sha(torn), sha(b"\0" * 4)))
    named = {"kind": "remark", "job_id": 0, "wall_ms": 1700000100000, "text": prefix + " words for people"}
    rest = chain([named] + bodies[3:], 3, sha(lines[2]))
    put("salvaged", first + torn, b"\0" * 4, text(rest))
    put("broken", text(lines[:5] + lines[6:]))
    put("changed", text(lines).replace(b'"runs":80000,', b'"runs":90000,', 1))
    put("newer-marker", text(lines), marker=MARKER.replace(b"ledger/1", b"ledger/2"))
    put("newer-line", text(lines + chain([{"anything": 1}], len(lines), sha(lines[-1]), version=2)))
    put("foreign", marker=None, notes_txt=b"work of another program\n")


def check(folder):
    folder = pathlib.Path(folder)
    prev, seq = sha((folder / "ledger.json").read_bytes()), 0
    for segment in sorted(folder.glob("segment-*.jsonl")):
        *lines, after = segment.read_bytes().split(b"\n")
        assert after == b"", "a torn tail"
        for line in lines:
            number, before, own, body = LINE.fullmatch(line).groups()
            assert int(number) == seq, "seq"
            assert before.decode() == prev, "prev"
            assert own.decode() == sha(body), "sha"
            json.loads(body)
            prev, seq = sha(line), seq + 1
    print(seq, prev)


if __name__ == "__main__":
    check(sys.argv[2]) if sys.argv[1:2] == ["check"] else make()
