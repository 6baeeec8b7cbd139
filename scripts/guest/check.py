"""Judges what scripts/boot-eight-cpus brought home: check.py FOLDER SHARE ARRANGEMENTS OFFLINE_EXIT OFFLINE_REMARK

SHARE is the percentage of the host's processors that the guest had. The last three may be empty, and are then printed instead of asserted. What is expected of the survey follows from the
command line of the emulator alone: threads of a core have neighbouring numbers, cpus 0-3 are socket and node 0.
"""

import collections
import glob
import json
import re
import sys

CPUS = set(range(8))
LOST = 5

folder, host_share, arrangements, offline_exit, offline_remark = sys.argv[1:6]
problems = []


def expect(right, what):
    if not right:
        problems.append(what)


def text(name):
    with open(f"{folder}/{name}") as f:
        return f.read()


def document(name):
    try:
        return json.loads(text(name))
    except ValueError:
        sys.exit(f"boot-eight-cpus: {name} is no JSON document; the program said: {text(name.replace('.json', '.err'))}")


def ledger(name):
    """All bodies of a ledger, straight from the lines of its segments."""
    bodies = []
    for path in sorted(glob.glob(f"{folder}/{name}/segment-*.jsonl")):
        with open(path) as f:
            bodies += [json.loads(line)["body"] for line in f]
    return bodies


def print_remarks(bodies):
    """Prints remarks that differ in more than a number once each; gives all."""
    remarks = [b["text"] for b in bodies if b["kind"] == "remark"]
    alike = collections.Counter(re.sub(r"\d+\.\d+", "…", r) for r in remarks)
    for remark, times in alike.items():
        print(f"  remark: {remark}" + (f" ({times} times)" if times > 1 else ""))
    return remarks


def threads(name):
    """(ordered cpu, thread name, allowed cpus, last cpu, processor time) of every thread of a worker."""
    found = []
    for block in text(name).split("thread of ")[1:]:
        command, comm, allowed, stat = block.splitlines()[:4]
        ordered = int(re.search(r"--cpu[ =](\d+)", command)[1])
        fields = stat[stat.rindex(")") + 2:].split()
        # proc(5): fields 14, 15 are the times, 39 is the cpu last run on; the first one here is field 3
        found.append((ordered, comm.split("\t")[1], allowed.split("\t")[1], int(fields[36]), int(fields[11]) + int(fields[12])))
    return found


def check_survey():
    survey = document("survey.json")
    expect(text("survey.code").strip() == "0", f"survey ended with {text('survey.code').strip()}")
    cpus = {c["cpu"]: c for c in survey["cpus"]}
    expect(set(cpus) == CPUS, f"survey names cpus {sorted(cpus)}")
    expect(survey["offline"] == [], f"survey says offline: {survey['offline']}")
    expect(survey["smt_active"] is True, f"survey says smt_active: {survey['smt_active']}")
    expect(survey["virtualised"] is True, "survey does not see that this is a virtual machine")
    for n, c in cpus.items():
        pair = {n & ~1, n | 1}
        expect(set(c["siblings"]) == pair, f"cpu {n}: siblings {c['siblings']}")
        expect({m for m in cpus if cpus[m]["core"] == c["core"]} == pair, f"cpu {n}: core {c['core']} is not its pair's alone")
        expect((c["socket"], c["node"]) == (n // 4, n // 4), f"cpu {n}: socket {c['socket']}, node {c['node']}")
        expect(c["allowed"] is True and c["isolated"] is False, f"cpu {n}: allowed {c['allowed']}, isolated {c['isolated']}")
    cores = {c["core"] for c in cpus.values()}
    expect(len(cores) == 4, f"survey counts {len(cores)} cores")
    keys = {c["key"]["key"] for c in cpus.values()}
    expect(len(keys) == 8, f"{len(keys)} keys for 8 cpus")
    for cache in survey["caches"]:
        first = cache["cpus"][0]
        # the emulator gives every thread a first level of its own, every core a second, every socket a third
        shared = {1: [first], 2: [first & ~1, first | 1], 3: [n for n in sorted(CPUS) if n // 4 == first // 4]}
        expect(4 <= cache["kib"] <= 1 << 20, f"level {cache['level']} cache of {cache['kib']} KiB")
        expect(cache["cpus"] == shared.get(cache["level"]), f"level {cache['level']} cache shared by {cache['cpus']}")
    processors = survey["identity"]["processors"]
    expect([sorted(p["cpus"]) for p in processors] == [sorted(CPUS)], f"{len(processors)} kinds of processor")
    for sensor in survey["sensors"]:
        expect(sensor["value"] is None or sensor["value"] > 0, f"sensor {sensor['name']} reads {sensor['value']}")
    for c in survey["counters"]:
        expect(c["total"] == 0, f"counter {c['counter']} stands at {c['total']} on a machine without faults")
    caches = collections.Counter((c["level"], c["kib"]) for c in survey["caches"])
    print(f"survey: {len(cpus)} cpus, {len(cores)} cores, {len({c['socket'] for c in cpus.values()})} sockets, "
          f"{len({c['node'] for c in cpus.values()})} nodes; caches "
          + ", ".join(f"{n} x L{level} {kib} KiB" for (level, kib), n in sorted(caches.items()))
          + f"; {sum(len(k['variants']) for k in survey['kernels'])} kernel variants can run, "
          f"{len(survey['unreadable'])} readings named as missing")
    return {n: c["core"] for n, c in cpus.items()}


def overlaps(slices, core_of):
    """For each arrangement, the share of its slices' time during which each relation of the tested cpu was at work too."""
    spans = [(s["wall_ms"], s["wall_ms"] + s["span_ns"] / 1e6, s) for s in slices]
    time, shared = collections.Counter(), collections.defaultdict(collections.Counter)
    for begin, end, s in spans:
        word = s["condition"].split()[0]
        time[word] += end - begin
        for b, e, other in spans:
            both = min(end, e) - max(begin, b)
            if other["cpu"] != s["cpu"] and both > 0:
                relation = ("sibling" if core_of[other["cpu"]] == core_of[s["cpu"]]
                            else "same socket" if other["cpu"] // 4 == s["cpu"] // 4 else "other socket")
                shared[word][relation] += both
    # so many cpus stand in each relation to any one
    per = {"sibling": 1, "same socket": 2, "other socket": 4}
    return {w: {r: shared[w][r] / per[r] / time[w] for r in per} for w in time if time[w] > 0}


def check_whole(core_of):
    window, bodies = document("whole.json"), ledger("whole")
    slices = [b for b in bodies if b["kind"] == "slice"]
    ran = [s for s in slices if s["runs"] > 0]
    code = int(text("whole.code"))
    expect(code == 0 and window["verdict"] == "clear", f"window ended with {code}, verdict {window['verdict']}")
    expect({c["cpu"] for c in window["cores"] if c["runs"] > 0} == CPUS, "not every cpu has runs in the report")
    expect({c["cpu"]: c["core"] for c in window["cores"]} == core_of, "the report's cores are not the survey's")
    by_cpu = collections.Counter(s["cpu"] for s in ran)
    expect(set(by_cpu) == CPUS, f"only cpus {sorted(by_cpu)} have slices in the ledger")
    for s in slices:
        if s.get("void") and s["runs"] > 0:
            problems.append(f"slice {s['slice']} of cpu {s['cpu']} is void: {s['void']}")
        if not s.get("void"):
            expect(s["core"] == core_of[s["cpu"]], f"slice {s['slice']}: cpu {s['cpu']} as core {s['core']}")
            expect(s["fold"] == "right" and s["mismatches"] == 0, f"slice {s['slice']} of cpu {s['cpu']}: fold {s['fold']}, {s['mismatches']} wrong")
            expect(core_of.get(s.get("checked_on")) not in (None, s["core"]), f"slice {s['slice']} of cpu {s['cpu']} was checked on {s.get('checked_on')}")
    for b in bodies:
        if b["kind"] in ("mismatch", "lost", "finding"):
            problems.append(f"ledger holds a {b['kind']} of cpu {b['cpu']}: {json.dumps(b.get('how') or b.get('statement') or b.get('words'))}")
    expect(text("whole.show.code").strip() == "0", "`ledger show` does not accept the ledger: " + text("whole.show.err"))
    units = {(s["kernel"], s["variant"]) for s in ran}
    cells = {(s["cpu"], s["kernel"], s["variant"]) for s in ran}
    cut = sum(1 for s in slices if s.get("void") and s["runs"] == 0)
    print(f"window: {window['wall_s']:.1f} of {window['budget_s']:.0f} s, exit {code}, {len(ran)} slices "
          f"({min(by_cpu.values(), default=0)} to {max(by_cpu.values(), default=0)} a cpu), {sum(s['runs'] for s in ran)} runs, "
          f"{len(cells)} of {len(units) * 8} cells, {window['kernel_share']:.1%} inside kernels, {cut} slices cut off before their first run")
    print_remarks(bodies)
    conditions = collections.Counter(s["condition"] for s in ran)
    words = collections.Counter(s["condition"].split()[0] for s in ran)
    print("conditions: " + "; ".join(f"{c} ({n})" for c, n in sorted(conditions.items())))
    for word, share in overlaps(ran, core_of).items():
        print(f"  {word}: {words[word]} slices; at the same time busy: " + ", ".join(f"{r} {s:.0%}" for r, s in share.items()))
    for word in filter(None, arrangements.split(",")):
        expect(words[word] > 0, f"no slice of arrangement {word}")


def check_places():
    pinned = collections.Counter()
    moved = 0
    for ordered, name, allowed, last, ticks in threads("places"):
        if ticks == 0:
            continue
        if allowed == str(ordered) and last == ordered:
            pinned[ordered] += 1
        else:
            moved += 1
            expect(False, f"thread {name} of the worker for cpu {ordered} may run on {allowed} and was last on {last}")
    expect(set(pinned) == CPUS, f"worker threads were seen on cpus {sorted(pinned)} alone")
    print(f"kernel's word: {sum(pinned.values())} looks at working threads of {len(pinned)} cpus, {moved} not where they were ordered")


def check_memory():
    """Each worker's mappings have the policy of its own node."""
    right = set()
    for line in text("memory").splitlines():
        command, _, policies = line.partition("|")
        cpu = int(re.search(r"--cpu (\d+)", command)[1])
        node = re.search(r"--node=(\d+)", command)
        expect(node and int(node[1]) == cpu // 4, f"worker for cpu {cpu} was started as {command}")
        others = [p for p in policies.split() if p.startswith("bind:") and p != f"bind:{cpu // 4}"]
        if f"bind:{cpu // 4}" in policies and not others:
            right.add(cpu)
        else:
            expect(False, f"memory of the worker for cpu {cpu}: {policies}")
    expect(right == CPUS, f"memory is bound to the right node for cpus {sorted(right)} alone")
    print(f"memory: bound to their own node for {len(right)} of {len(CPUS)} workers")


def check_leaving():
    window, bodies = document("leaving.json"), ledger("leaving")
    code = int(text("leaving.code"))
    gone = float(text("offline.at")) * 1000
    expect("5" not in text("online.then"), f"cpu {LOST} did not go offline: online {text('online.then')}")
    on_it = [b for b in bodies if b["kind"] == "slice" and b["cpu"] == LOST]
    counted = [s for s in on_it if not s.get("void") and s["runs"] > 0]
    void = [s for s in on_it if s.get("void") and s["runs"] > 0]
    print(f"offline: cpu {LOST} left {(gone - bodies[0]['wall_ms']) / 1000:.0f} s into a window of {window['budget_s']:.0f} s (online then: "
          f"{text('online.then').strip()}); exit {code}, verdict {window['verdict']}, took {window['wall_s']:.1f} s")
    print(f"  cpu {LOST}: {len(counted)} slices count, {len(void)} void, {len(on_it) - len(counted) - len(void)} never begun")
    late = [s for s in counted if s["wall_ms"] > gone + 1000]
    expect(not late, f"{len(late)} slices count for cpu {LOST} that began after it had left")
    for s in void[:3]:
        print(f"    void: {s['void']}")
    for kind in ("lost", "finding", "mismatch"):
        for b in bodies:
            if b["kind"] == kind:
                print(f"  {kind}: cpu {b['cpu']}: " + json.dumps(b.get("how") or b.get("statement") or b.get("words")))
                expect(kind == "lost", f"a {kind} for cpu {b['cpu']}, on a machine without faults")
    remarks = print_remarks(bodies)
    for c in window["cores"]:
        if c["cpu"] == LOST or c["verdict"] != "clear":
            print(f"  verdict on cpu {c['cpu']}: {c['verdict']}, because {c['because']}")
        expect(c["verdict"] in (("clear", "untested") if c["cpu"] == LOST else ("clear",)), f"cpu {c['cpu']} is called {c['verdict']}")
    for ordered, name, allowed, last, ticks in threads("places.then"):
        if ordered == LOST:
            print(f"  worker for cpu {LOST} four seconds later: thread {name} may run on {allowed}, last on {last}")
    said = text("leaving.err").strip()
    if said:
        print("  standard error: " + said[-300:])
    if offline_exit:
        expect(code == int(offline_exit), f"the window that lost a cpu ended with {code}, not {offline_exit}")
    if offline_remark:
        expect(any(re.search(offline_remark, r) for r in remarks), f"no remark matches {offline_remark}")


core_of = check_survey()
check_whole(core_of)
check_places()
check_memory()
check_leaving()
for problem in problems[:20]:
    print(f"boot-eight-cpus: {problem}", file=sys.stderr)
if len(problems) > 20:
    print(f"boot-eight-cpus: and {len(problems) - 20} more", file=sys.stderr)
if problems and int(host_share) < 70:
    print(f"boot-eight-cpus: the guest had {host_share} % of the host's processors; workers that were late because of that "
          "look hung from inside, so run it again on an idle host before believing such a line", file=sys.stderr)
sys.exit(1 if problems else 0)
