"""Random problems with sets of starts, bounded disturbances and known drives: what the program says against the worst case.

    venv/bin/python set_campaign.py KEEPOUT [PROBLEMS|FIRST:LAST] [SEED]
    venv/bin/python set_campaign.py --self [PROBLEMS|FIRST:LAST] [SEED]

KEEPOUT is the program's path. Each problem is a random system (`random_sets.py`, `random_set_zones.py`) with three outputs and ten zones: half-spaces, abs(), disjunctions, corners of two
half-spaces, equalities, at relative distances of 1e-2, 1e-4 and 1e-6 on both sides of the worst case, in windows and for all time. Two commands are run:
`keepout peak MODEL --of OUTPUT --json` for each output and `keepout certify MODEL --json`. Two processes run at a time. Wrong is
  - a peak whose upper bound is below the worst case, or whose lower bound is above it; one that is infinite and should not be, or the other way round;
  - `clear` where the worst case is inside; `enters` where it is outside; a verdict other than these and `unsettled`;
  - a margin above the distance; a bracket in which nothing is inside, or that is not in the window; a first entry with an earlier one;
  - an exit status that does not go with the verdicts.
The worst case is a proved lower bound (`worst_case.py`), so a wrong `clear` for half-spaces and the like is wrong for certain; a wrong `enters` is that up to the cover in
floating point. With --self the program is not run: the reference is compared with a simulation that shares no code (`dense_simulation.py`).

Wrong, unsettled, wide and slow problems are written as model files to the folder set-campaign-SEED below the working folder. Exits with 1 if anything is wrong.
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

import corner
import dense_simulation
from exponential_sum import ball
from random_set_zones import extremes, model_text, problem, scale
from random_sets import KINDS

PROCESSES = 2
SECONDS, SECONDS_ALONE, SECONDS_PEAK = 40, 10, 15
SLOW = 10.0
NEAR = 1e-8  # relative error that the reference is given
WANTED, ENOUGH = 1e-6, 1e-4  # relative gaps of peaks


def run(command, seconds):
    """Standard output as JSON with the seconds taken; None if it takes longer; a text if it fails."""
    begin = time.monotonic()
    try:
        done = subprocess.run(command, capture_output=True, text=True, timeout=seconds, env={**os.environ, "RAYON_NUM_THREADS": "1"})
    except subprocess.TimeoutExpired:
        return None, seconds
    spent = time.monotonic() - begin
    try:
        return (done.returncode, json.loads(done.stdout)), spent
    except ValueError:
        return f"exit status {done.returncode}: {done.stderr[-300:]}", spent


# Peaks

def peak_fault(answer, top, low, size):
    """The fault, or None; and the relative gaps of the two ends (None for an infinite one)."""
    gaps = []
    for word, extreme, sign in (("max", top, 1), ("min", low, -1)):
        said = answer.get(word)
        if said is None:
            return f"no {word}", gaps
        if said.get("unbounded"):
            if extreme.value is not None:
                return f"{word} said to be unbounded, it is {float(extreme)}", gaps
            continue
        if extreme.value is None:
            return f"{word} said to be bounded", gaps
        upper, lower = F(said["upper"]), F(said["lower"])
        room = ball(F(NEAR)) * arb(size)
        outer, inner = (upper, lower) if sign > 0 else (lower, upper)
        if sign * (ball(outer) - extreme.value) < 0:
            return f"{word}: outer bound {float(outer)!r} is short of {float(extreme)!r}", gaps
        if sign * (ball(inner) - extreme.value) > room + extreme.slack:
            return f"{word}: inner bound {float(inner)!r} is beyond {float(extreme)!r}", gaps
        if upper < lower:
            return f"{word}: upper below lower", gaps
        gaps.append(max(float(abs(ball(upper) - extreme.value)), float(abs(ball(lower) - extreme.value))) / size)
    return None, gaps


def peaks(program, path, p):
    """Rows (label, verdict, fault, seconds, gap)."""
    rows = []
    for i, out in enumerate(p.outputs):
        top, low = extremes(p.model, out, F(0), None)
        answer, seconds = run([program, "peak", str(path), "--of", out.text, "--json"], SECONDS_PEAK)
        if not isinstance(answer, tuple) or "max" not in answer[1]:
            word = "timeout" if answer is None else "failed"
            rows.append((i, word, None if word == "timeout" else str(answer), seconds, None))
            continue
        sizes = [abs(float(x)) for x in (top, low) if x.value is not None]
        fault, gaps = peak_fault(answer[1], top, low, max([*sizes, 1e-9]))
        gap = max(gaps, default=None)
        word = "infinite" if gap is None else "within 1e-6" if gap <= WANTED else "within 1e-4" if gap <= ENOUGH else "wide"
        rows.append((i, word, fault, seconds, gap))
    return rows


# Zones

def clear_fault(zone, answer):
    if zone.expected == "enters":
        return f"clear, and entered: {zone.form} at {zone.distance and float(zone.distance)}"
    margin = answer.get("margin")
    if margin is not None and zone.margin is not None and float(F(margin)) > float(zone.margin) * (1 + 1e-9) + NEAR * float(zone.margin / zone.distance):
        return f"margin {margin} above the distance {float(zone.margin)}"
    return None


def enters_fault(zone, answer, model):
    if zone.expected == "clear":
        return f"enters, and clear: {zone.form} at {zone.distance and float(zone.distance)}"
    first, last = F(answer["time"]["from"]), F(answer["time"]["to"])
    if not zone.start <= first <= last or (zone.end is not None and last > zone.end):
        return "the bracket is not in the window"
    if inside(zone, model, first, last) < -NEAR:
        return f"nothing in [{float(first)}, {float(last)}] is inside"
    if answer["time"].get("first") and first > zone.start and zone.form != "equal" and inside(zone, model, zone.start, first) > NEAR:
        return f"first entry at {float(first)}, but inside earlier"
    return None


def inside(zone, model, first, last):
    """How deep the reachable set gets into the zone in a stretch, relative; positive inside."""
    if zone.form == "and":
        depth = corner.depth(model, [(out, sign, level, unit_of(model, out)) for out, sign, level in zone.parts], first, last)
        return 0.0 if depth is None else depth
    depths = []
    for out, sign, level in zone.parts:
        top, low = model.extremes(out.h, out.h_drives, out.constant, first, last)
        depths.append(sign * float((top if sign > 0 else low).value - ball(level)) / float(unit_of(model, out)))
    return max(depths)


def unit_of(model, out):
    top, low = extremes(model, out, F(0), F(5))
    return F(max(scale(top, low), 1e-9)).limit_denominator(10**12)


def settled(program, p, folder):
    """The answers for all zones, and the seconds; zone by zone if one run takes too long."""
    answer, seconds = run([program, "certify", str(written(folder, p, range(len(p.zones)))), "--json"], SECONDS)
    if isinstance(answer, tuple):
        return answer[1]["zones"], seconds, status_fault(*answer)
    if isinstance(answer, str):
        return [{"verdict": "failed", "reason": answer}] * len(p.zones), seconds, None
    answers = []
    for i in range(len(p.zones)):
        alone, spent = run([program, "certify", str(written(folder, p, [i])), "--json"], SECONDS_ALONE)
        seconds += spent
        answers.append(alone[1]["zones"][0] if isinstance(alone, tuple) else {"verdict": "failed" if alone else "timeout", "reason": alone or ""})
    return answers, seconds, None


def status_fault(status, answer):
    verdicts = {z["verdict"] for z in answer["zones"]}
    right = 1 if "enters" in verdicts else 0 if verdicts == {"clear"} else 2
    return None if status == right else f"exit status {status} with {sorted(verdicts)}"


def written(folder, p, chosen):
    path = Path(folder) / "model.toml"
    path.write_text(model_text(p, chosen))
    return path


def zone_row(p, zone, answer):
    """(label, expected, verdict, note, fault)."""
    verdict, note, fault = answer["verdict"], "", None
    label = f"{zone.form} {'' if zone.distance is None else f'{float(zone.distance):.0e}'}".strip()
    if verdict == "clear":
        fault, note = clear_fault(zone, answer), "with margin" if "margin" in answer else ""
    elif verdict == "enters":
        fault = enters_fault(zone, answer, p.model)
    elif verdict in ("unsettled", "timeout"):
        note = re.sub(r"-?\d[\d./e+-]*", "#", str(answer.get("reason", "")).split(";")[0])[:90]
    else:
        fault = f"{verdict}: {answer.get('reason', '')}"
    return label, zone.expected, verdict, note, fault


def examine(arguments):
    """Runs one problem; returns its number, kind, rows of peaks and zones, seconds, and model files to keep."""
    program, seed, number = arguments
    p, kept = problem(seed, number), {}
    whole = model_text(p, range(len(p.zones)))
    with tempfile.TemporaryDirectory() as folder:
        peak_rows = peaks(program, written(folder, p, range(len(p.zones))), p)
        answers, seconds, status = settled(program, p, folder)
    rows = [zone_row(p, zone, answer) for zone, answer in zip(p.zones, answers)]
    if status:
        rows.append(("exit status", "", "failed", "", status))
    for i, word, fault, spent, gap in peak_rows:
        name = "wrong" if fault else word if word in ("timeout", "wide") else "slow" if spent > SLOW else None
        if name:
            top, low = extremes(p.model, p.outputs[i], F(0), None)
            kept[f"peak{i}-{name}"] = f"# peak --of '{p.outputs[i].text}': {fault or word}; reference max {float(top)!r}, min {float(low)!r}, {spent:.1f} s\n{whole}"
    for i, (label, expected, verdict, note, fault) in enumerate(rows):
        name = "wrong" if fault else verdict if verdict in ("unsettled", "timeout") else None
        if name:
            text = model_text(p, [i]) if i < len(p.zones) else whole
            kept[f"z{i}-{name}"] = f"# {fault or note}; {label}, expected {expected}\n{text}"
    if seconds > SLOW:
        kept["slow"] = f"# {seconds:.1f} s\n{whole}"
    return number, p.kind, peak_rows, rows, seconds, kept


def examine_reference(arguments):
    """The worst cases of one problem against the simulation: rows (label, relative difference)."""
    _, seed, number = arguments
    p, rows = problem(seed, number), []
    for out in p.outputs if p.kind != "uncertain" else []:
        for end in (F(3), None):
            top, low = extremes(p.model, out, F(0), end)
            horizon = min(60.0, p.model.support(out.h, out.h_drives, out.constant).horizon())
            for extreme, sign in ((top, 1), (low, -1)):
                if extreme.value is not None and (end is not None or extreme.at is not None):
                    apart = dense_simulation.disagreement(p.model, out.h, out.h_drives, out.constant, F(0), end, extreme, horizon, sign, most=4000)
                    rows.append(("all time" if end is None else "window", apart))
                if extreme.value is not None and extreme.slack > 1e-9 * max(scale(top, low), 1e-6):
                    rows.append(("cover not closed", extreme.slack))
    for zone in p.zones:
        if zone.form == "and":
            rows.append(("corner", corner_difference(p, zone)))
    return number, p.kind, rows


def corner_difference(p, zone):
    """The claim of a corner against points that are reached: those that a mixture of the two outputs drives to its greatest value, and mixtures of them."""
    window_end = zone.end if zone.end is not None else zone.start + 30
    parts = [(out, sign, level, unit_of(p.model, out)) for out, sign, level in zone.parts]
    shares, best = [F(k, 12) for k in range(13)], -np.inf
    for t in np.linspace(float(zone.start), float(window_end), 9):
        values = [dense_simulation.both_values(p.model, parts, share, t) for share in shares]
        best = max(best, max(greatest_least(a, b) for a, b in zip(values, values[1:])))
    return best if zone.expected == "clear" else None if best < 0 else 0.0


def greatest_least(a, b):
    """The greatest least coordinate on the segment between two points."""
    ends = [min(a), min(b)]
    slope = (a[0] - a[1]) - (b[0] - b[1])
    if slope and 0 < (a[0] - a[1]) / slope < 1:
        s = (a[0] - a[1]) / slope
        ends.append(a[0] + s * (b[0] - a[0]))
    return max(ends)


# Report

def table(title, counts):
    print(f"\n{title}")
    for key, n in sorted(counts.items(), key=lambda item: str(item[0])):
        print(f"  {n:6}  " + "  ".join(f"{word!s:20}" for word in (key if isinstance(key, tuple) else (key,))).rstrip())


def word_of(verdict, fault):
    return "WRONG" if fault else "settled" if verdict in ("clear", "enters") else "unsettled"


def report(results, folder):
    rows = [(kind, *row) for _, kind, _, own, _, _ in results for row in own]
    peaks_ = [(kind, *row) for _, kind, own, _, _, _ in results for row in own]
    table("zones by kind", Counter((k, word_of(v, fault)) for k, _, _, v, _, fault in rows))
    table("zones by form and distance, expected, verdict", Counter((label, e, v) for _, label, e, v, _, _ in rows))
    table("unsettled by kind and reason", Counter((k, v, note) for k, _, _, v, note, _ in rows if v in ("unsettled", "timeout")))
    table("peaks by kind", Counter((k, "WRONG" if fault else word) for k, _, word, fault, _, _ in peaks_))
    gaps = sorted(gap for *_, gap in peaks_ if gap is not None)
    if gaps:
        print(f"\nrelative gaps of peaks: median {statistics.median(gaps):.1e}, 90 % {gaps[int(0.9 * (len(gaps) - 1))]:.1e}, greatest {gaps[-1]:.1e}")
    for what, seconds in (("a model of ten zones", [s for *_, s, _ in results]), ("a peak", [s for *_, s, _ in peaks_])):
        print(f"seconds for {what}: median {statistics.median(seconds):.2f}, 99 % {sorted(seconds)[int(0.99 * (len(seconds) - 1))]:.2f}, slowest {max(seconds):.2f}")
    print("\nseconds for a model of ten zones by kind: median, greatest")
    for kind in KINDS:
        own = [s for _, k, _, _, s, _ in results if k == kind]
        if own:
            print(f"  {kind:20}{statistics.median(own):8.2f}{max(own):8.2f}")
    wrong = sum(fault is not None for *_, fault in rows) + sum(fault is not None for _, _, _, fault, _, _ in peaks_)
    count = sum(v in ("clear", "enters") for _, _, _, v, _, _ in rows)
    print(f"{len(results)} problems, {len(rows)} zones, {count} settled, {len(peaks_)} peaks, {wrong} wrong" + (f"; models in {folder}" if folder.exists() else ""))
    return wrong


def self_report(results):
    rows = [(number, kind, *row) for number, kind, own in results for row in own]
    bad = [row for row in rows if row[3] is not None and (row[3] > 1e-8 or (row[2] == "corner" and row[3] > 0))]
    for word in sorted({label for _, _, label, _ in rows}):
        own = [x for _, _, label, x in rows if label == word and x is not None]
        print(f"{word}: {len(own)} compared, greatest difference {max(own, default=0):.1e}, left out {sum(x is None for _, _, label, x in rows if label == word)}")
    for row in bad:
        print("DIFFERS", row)
    return len(bad)


def main():
    alone = sys.argv[1] == "--self"
    program, count = sys.argv[1], sys.argv[2] if len(sys.argv) > 2 else "100"
    seed = int(sys.argv[3]) if len(sys.argv) > 3 else 1
    first, last = (int(x) for x in count.split(":")) if ":" in count else (0, int(count))
    folder, results = Path(f"set-campaign-{seed}"), []
    with ProcessPoolExecutor(PROCESSES) as pool:
        for result in pool.map(examine_reference if alone else examine, [(program, seed, n) for n in range(first, last)]):
            results.append(result)
            if not alone:
                keep(folder, result)
    sys.exit(1 if (self_report(results) if alone else report(results, folder)) else 0)


def keep(folder, result):
    number, kind, peak_rows, rows, _, kept = result
    for word, text in kept.items():
        folder.mkdir(exist_ok=True)
        (folder / f"{number}-{word}.toml").write_text(text)
    for fault in [row[2] for row in peak_rows] + [row[-1] for row in rows]:
        if fault:
            print(f"WRONG in problem {number} ({kind}): {fault}", flush=True)


if __name__ == "__main__":
    main()
