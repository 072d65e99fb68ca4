"""Random problems: verdicts of the program against closed forms evaluated with python-flint balls.

    venv/bin/python campaign.py KEEPOUT [PROBLEMS] [SEED]

KEEPOUT is the program's path; keepout-check is taken from the same folder. PROBLEMS is the number of problems (default 100), or FIRST:LAST to
repeat some of them; each is a random system of at most six states (`random_problem.py`) with ten zones, most of them at a known distance from an extreme of
their polynomial along the trajectory. Two processes run at a time. A verdict is wrong if
  - `clear`: a time is in the zone for certain, or the supremum, attained or approached again and again, is beyond the level for certain;
    or the trusted extreme says that the zone is entered; or the margin is more than the distance to a value that is taken or approached;
  - `enters`: the whole bracket is outside the zone for certain, or nothing in it can be confirmed and the zone is expected to be clear; or, for a
    first entry, an earlier time is in the zone for certain;
  - `inseparable`: the level is beyond the supremum, which is trusted;
  - keepout-check refuses a certificate.
For every ninth problem margins are looked for, and must be within a millionth of the reference distance; for two of nine all certificates are re-checked.

Wrong, unsettled and slow problems are written as model files to the folder campaign-SEED below the working folder. Exits with 1 if anything is wrong.
"""

import json
import os
import re
import statistics
import subprocess
import sys
import tempfile
import time
from collections import Counter
from concurrent.futures import ProcessPoolExecutor
from fractions import Fraction as F
from pathlib import Path

sys.dont_write_bytecode = True

import numpy as np
from flint import arb

from motion import ball
from random_problem import KINDS, is_consistent, model, problem

EFFORT = "3000"
PROCESSES = 2
SECONDS, SECONDS_ALONE = 12, 4  # for one model of ten zones, and for a zone alone if that is not enough
SLOW = 10.0


def holds(tree, t):
    """True, False, or None where the balls do not decide, at a rational time or over a ball of times."""
    kind, *rest = tree
    if kind == "atom":
        trace, relation = rest
        value = trace.at(t)
        if relation == "=":
            return True if value == 0 else (False if value != 0 else None)
        if value > 0 or (relation == ">=" and value >= 0):
            return True
        return False if value < 0 or (relation == ">" and value <= 0) else None
    parts = [holds(part, t) for part in rest]
    end = kind == "or"
    return end if end in parts else (None if None in parts else not end)


def floats(tree, times):
    """How far inside, in floating point: positive inside."""
    kind, *rest = tree
    if kind == "atom":
        trace, relation = rest
        value = trace.floats(times)
        return -np.abs(value) if relation == "=" else value
    parts = np.stack([floats(part, times) for part in rest])
    return parts.max(axis=0) if kind == "or" else parts.min(axis=0)


def inside_before(zone, end):
    """A time of the window before `end` (None: any) that is in the zone for certain, or None."""
    stop = zone.end if zone.end is not None else zone.start + 120
    stop = stop if end is None else min(stop, end)
    if stop <= zone.start:
        return None
    times = np.linspace(float(zone.start), float(stop), 6001)
    depth = floats(zone.tree, times)
    order = [int(np.argmax(depth)), *np.flatnonzero(depth > 0)[:1]]
    tried = [F(times[i]) for i in order if depth[i] > -1e-9 * (1 + np.abs(depth).max())]
    if zone.extreme is not None and zone.extreme.at is not None:
        tried.append(zone.extreme.at)
    for t in tried:
        if zone.start <= t <= stop and (end is None or t < end) and holds(zone.tree, t) is True:
            return t
    return None


def clear_fault(zone, answer):
    t = inside_before(zone, None)
    if t is not None:
        return f"clear, but inside at t = {float(t)}"
    if is_crossed_somewhere(zone):
        return "clear, but the equation is met between two times"
    if zone.expected == "enters":
        return "clear, and expected to be entered"
    extreme, distance = zone.extreme, zone.distance
    if distance is None or extreme is None:
        return None
    # the value of the trace of the distance at the extreme: from above, the distance
    least = reference_distance(zone)
    if least < 0:
        return f"clear, but the supremum is beyond the level by {least}"
    if "margin" in answer and ball(answer["margin"]) > least:
        return f"margin {answer['margin']} above the distance {least}"
    return None


def is_crossed_somewhere(zone):
    """Whether a single equation has certain opposite signs at two times of the window."""
    if zone.tree[0] != "atom" or zone.tree[2] != "=":
        return False
    times = np.linspace(float(zone.start), float(zone.end if zone.end is not None else zone.start + 120), 6001)[1:-1]
    values = zone.tree[1].floats(times)
    low, high = zone.tree[1].at(F(times[values.argmin()])), zone.tree[1].at(F(times[values.argmax()]))
    return bool(low < 0) and bool(high > 0)


def reference_distance(zone):
    """Level less supremum."""
    if zone.extreme.at is not None:
        return zone.distance.at(zone.extreme.at)
    return ball(zone.level) - zone.extreme.value


def is_short(zone, answer):
    """Whether the margin is less than the reference distance by more than a millionth."""
    if "margin" not in answer or zone.distance is None or zone.extreme is None or not zone.extreme.known:
        return False
    least = reference_distance(zone)
    scale = arb("1e-22") * (1 + abs(zone.extreme.value))
    return bool(ball(answer["margin"]) < least * (1 - ball(F(1, 10**6))) - scale)


def enters_fault(zone, answer):
    """The fault, or None; and whether an entry in the bracket is confirmed."""
    first, last = F(answer["time"]["from"]), F(answer["time"]["to"])
    if not zone.start <= first <= last or (zone.end is not None and last > zone.end):
        return "the bracket is not in the window", False
    if answer["time"]["first"]:
        t = inside_before(zone, first)
        if t is not None:
            return f"first entry at {float(first)}, but inside at t = {float(t)}", False
    tried = [last, first, (first + last) / 2] + [first + (last - first) * F(k, 16) for k in range(1, 16)]
    answers = [holds(zone.tree, t) for t in tried]
    if True in answers or is_crossed(zone.tree, first, last):
        return None, True
    if all(outside(zone.tree, first, last, 12)):
        return f"entered in [{float(first)}, {float(last)}], but outside throughout", False
    touched = zone.extreme is not None and zone.extreme.at is not None and first - F(1, 10**6) <= zone.extreme.at <= last + F(1, 10**6)
    if zone.label.startswith("touch") and (touched or holds(zone.tree, last) is None):
        return None, False
    if zone.expected == "clear":
        return f"entered in [{float(first)}, {float(last)}], not confirmed, and expected to be clear", False
    return None, False


def is_crossed(tree, first, last):
    """Whether an equation is met between the ends, by opposite signs."""
    if tree[0] != "atom" or tree[2] != "=":
        return False
    a, b = tree[1].at(first), tree[1].at(last)
    return bool(a * b < 0 or a == 0 or b == 0)


def outside(tree, first, last, depth):
    """Whether a stretch is outside for certain, piece by piece."""
    middle, radius = (first + last) / 2, (last - first) / 2
    answer = holds(tree, arb(ball(middle), ball(radius)))
    if answer is False:
        yield True
    elif answer is True or depth == 0 or holds(tree, middle) is not False:
        yield False
    else:
        yield from outside(tree, first, middle, depth - 1)
        yield from outside(tree, middle, last, depth - 1)


def inseparable_fault(zone):
    if zone.end is not None:
        return "inseparable in a window that ends"
    if zone.distance is not None and zone.extreme is not None and zone.extreme.known and reference_distance(zone) > arb("1e-15"):
        return "inseparable, but the supremum is short of the level"
    return None


def reason(answer):
    return re.sub(r"-?\d[\d./e+-]*", "#", answer["reason"].split(";")[0])[:90]


def settled_together(program, p, folder, options):
    """The answers for all zones from one run; zone by zone if that takes too long."""
    zones = range(len(p.zones))
    answers = run(program, model(p, zones), folder, options, SECONDS)
    if answers is None:
        answers = [(run(program, model(p, [i]), folder, options, SECONDS_ALONE) or [{"name": f"z{i}", "verdict": "timeout", "reason": ""}])[0] for i in zones]
    return answers


def run(program, text, folder, options, seconds):
    """The answers for the zones of a model; None if it takes longer."""
    path = Path(folder) / "model.toml"
    path.write_text(text)
    command = [program, "certify", str(path), "--json", *options]
    try:
        done = subprocess.run(command, capture_output=True, text=True, timeout=seconds, env={**os.environ, "RAYON_NUM_THREADS": "1"})
    except subprocess.TimeoutExpired:
        return None
    if done.returncode not in (0, 1, 2):
        return [{"name": name, "verdict": "failed", "reason": f"exit status {done.returncode}: {done.stderr[-300:]}"} for name in re.findall(r'^name = "(.*)"', text, re.M)]
    return json.loads(done.stdout)["zones"]


def examine(arguments):
    """Runs one problem; returns rows (kind, label, expected, verdict, note, fault), the seconds, and model files to keep."""
    program, seed, number = arguments
    p = problem(seed, number)
    if not is_consistent(p):
        return number, [(p.kind, "", "", "reference", "", "the closed form contradicts the matrix exponential")], 0.0, {"reference": model(p, range(len(p.zones)))}
    with tempfile.TemporaryDirectory() as folder:
        evidence = Path(folder) / "evidence"
        options = ["--effort", EFFORT, *([] if number % 9 == 0 else ["--no-margins"]), *(["--out", str(evidence)] if number % 9 < 2 else [])]
        begin = time.monotonic()
        answers = settled_together(program, p, folder, options)
        seconds = time.monotonic() - begin
        rows, kept = [], {}
        for i, (zone, answer) in enumerate(zip(p.zones, answers)):
            row = compared(p.kind, zone, answer)
            if number % 9 < 2 and answer["verdict"] in ("clear", "enters", "inseparable") and row[-1] is None:
                row = (*row[:-1], refused(program, evidence, answer["name"]))
            rows.append(row)
            word = "wrong" if row[-1] else next((w for w in ("unsettled", "timeout", "short", "unconfirmed") if w in row[3:5]), None)
            if zone.expected and row[3] in ("clear", "enters", "inseparable") and row[3] != zone.expected and not word:
                word = "surprising"
            if word:
                kept[f"{word}-z{i}"] = f"# {row[-1] or row[4]}; {zone.label}, expected {zone.expected}\n" + model(p, [i])
        if seconds > SLOW:
            kept["slow"] = f"# {seconds:.1f} s\n" + model(p, range(len(p.zones)))
    return number, rows, seconds, kept


def compared(kind, zone, answer):
    verdict, note, fault = answer["verdict"], "", None
    if verdict == "clear":
        fault = clear_fault(zone, answer)
        note = "" if "margin" not in answer else ("no margin" if answer["margin"] == "0" else ("short" if is_short(zone, answer) else "with margin"))
    elif verdict == "enters":
        fault, confirmed = enters_fault(zone, answer)
        note = ("first" if answer["time"]["first"] else "not the first") if confirmed else "unconfirmed"
    elif verdict == "inseparable":
        fault = inseparable_fault(zone)
    else:
        note = reason(answer)
        fault = note if verdict == "failed" else None
    return kind, zone.label, zone.expected, verdict, note, fault


def refused(program, evidence, name):
    checker = Path(program).with_name("keepout-check")
    run = subprocess.run([checker, evidence / f"{name}.statement.json", evidence / f"{name}.certificate.json"], capture_output=True, text=True)
    return None if run.returncode == 0 else f"keepout-check: {run.stdout[-200:]}{run.stderr[-200:]}"


def table(title, counts):
    print(f"\n{title}")
    for key, n in sorted(counts.items(), key=lambda item: str(item[0])):
        print(f"  {n:6}  " + "  ".join(f"{word!s:20}" for word in (key if isinstance(key, tuple) else (key,))).rstrip())


def report(results, folder):
    rows = [row for _, rows, _, _ in results for row in rows]
    table("verdicts by kind of spectrum", Counter((k, v) for k, _, _, v, _, _ in rows))
    table("verdicts by place of the border, and what was expected", Counter((label, e, v) for _, label, e, v, _, _ in rows))
    table("unsettled by kind and reason", Counter((k, note) for k, _, _, v, note, _ in rows if v in ("unsettled", "timeout")))
    table("notes", Counter((v, note) for _, _, _, v, note, _ in rows if v in ("clear", "enters")))
    table("seconds a problem by kind: median, greatest, sum", Counter())
    for kind in KINDS:
        own = [s for _, rows, s, _ in results if rows[0][0] == kind]
        if own:
            print(f"  {kind:22}{statistics.median(own):8.2f}{max(own):8.2f}{sum(own):8.0f}")
    seconds = [s for _, _, s, _ in results]
    wrong = sum(fault is not None for *_, fault in rows)
    settled = sum(v in ("clear", "enters", "inseparable") for _, _, _, v, _, _ in rows)
    print(f"\nseconds a problem: median {statistics.median(seconds):.2f}, 99 % {sorted(seconds)[int(0.99 * (len(seconds) - 1))]:.2f}, max {max(seconds):.2f}, sum {sum(seconds):.0f}")
    print(f"{len(results)} problems, {len(rows)} zones, {settled} settled, {wrong} wrong" + (f"; models in {folder}" if folder.exists() else ""))
    return wrong


def main():
    program, count = sys.argv[1], sys.argv[2] if len(sys.argv) > 2 else "100"
    seed = int(sys.argv[3]) if len(sys.argv) > 3 else 1
    first, last = (int(x) for x in count.split(":")) if ":" in count else (0, int(count))
    folder, results = Path(f"campaign-{seed}"), []
    with ProcessPoolExecutor(PROCESSES) as pool:
        for result in pool.map(examine, [(program, seed, n) for n in range(first, last)]):
            results.append(result)
            number, rows, _, kept = result
            for word, text in kept.items():
                folder.mkdir(exist_ok=True)
                (folder / f"{number}-{word}.toml").write_text(text)
            for *where, fault in rows:
                if fault:
                    print(f"WRONG in problem {number} {where}: {fault}", flush=True)
    sys.exit(1 if report(results, folder) else 0)


if __name__ == "__main__":
    main()
