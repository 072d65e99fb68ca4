"""Derives the worst cases that the tests compare with, and writes set_values.json beside this file.

    venv/bin/python set_values.py [--all]

Small systems (`own_sets.py`), L1 norms of filters and loops, and the large open models with sets of starts and bounded inputs (`large_models.py`; these are taken
from the file that is there unless --all is given: they take about half an hour). Nothing is written if a value contradicts its closed form,
the values of values.json, or a second opinion that shares no code: step by step simulation with scipy's matrix exponential (`dense_simulation.py`).

A pair [lower, upper] holds the worst case. For a `max` the lower end, for a `min` the upper end is proved in ball arithmetic, whatever was overlooked; the other
end rests on a cover in floating point (`worst_case.py`), but where `closed_form` is given both ends are its digits.
"""

import itertools
import json
import sys
from fractions import Fraction as F
from pathlib import Path

sys.dont_write_bytecode = True

from flint import ctx

import corner
import dense_simulation
import large_models
import own_sets
import step_response
import worst_case
from ball import bounds, exact, order_of, text
from own_sets import UNBOUNDED, Case
from random_set_zones import Output
from set_model import Model, affine

HERE = Path(__file__).resolve().parent
DIGITS = 13
QUOTED = {  # docs/references.md
    ("building", None): ("0.00445483", "-0.0065686"), ("iss", "20"): ("5.99e-4",), ("iss", None): ("1.0004e-3",),
}


def pair(extreme, sign, known=None):
    """The two ends, `sign` 1 for a supremum."""
    if extreme.value is None:
        return UNBOUNDED
    if known is not None:
        return bounds(known, 24)
    value = exact(extreme.value.mid())
    places = DIGITS - 1 - order_of(value) if abs(value) > F(1, 10**30) else 2 * DIGITS
    room = F(extreme.slack) + F(10) ** -places + abs(value) * F(worst_case.TOLERANCE)
    low, high = sorted([value - sign * F(10) ** -60, value + sign * room])
    unit = 10**places if places > 0 else 1
    return [f"{(low * unit).__floor__()}/{unit}", f"{(high * unit).__ceil__()}/{unit}"]


def small_case(case):
    worst_case.TOLERANCE = 1e-13
    top, low = case.model.extremes(case.h, case.h_drives, case.constant, case.start, case.end)
    horizon = case.model.support(case.h, case.h_drives, case.constant).horizon()
    for extreme, sign, known in ((top, 1, case.top), (low, -1, case.low)):
        compare(case, extreme, sign, known, horizon)
    return {
        "name": case.name, "source": "our own" + (": " + case.note if case.note else ""), "model": case.model.text(), "output": case.output(),
        "from": text(case.start), "until": None if case.end is None else text(case.end),
        "max": pair(top, 1, None if case.top == UNBOUNDED else case.top), "min": pair(low, -1, None if case.low == UNBOUNDED else case.low),
        "max_at": at(top), "min_at": at(low), "closed_form": [case.top is not None, case.low is not None],
    }


def at(extreme):
    return None if extreme.at is None else f"{float(extreme.at):.9g}"


def compare(case, extreme, sign, known, horizon):
    """Raises where the value contradicts the closed form or the simulation."""
    if (known == UNBOUNDED) != (extreme.value is None):
        if known is not None or extreme.value is None:
            raise ArithmeticError(f"{case.name}: unbounded or not")
    if extreme.value is None:
        return
    if known is not None and abs(float(extreme.value - known)) > 1e-12 * (1 + abs(float(known))):
        raise ArithmeticError(f"{case.name}: {extreme.value} is not {known}")
    apart = dense_simulation.disagreement(case.model, [F(x) for x in case.h], case.h_drives, case.constant, case.start, case.end, extreme, horizon, sign)
    if apart is not None and apart > (1e-6 if case.model.drives and extreme.at is None else 1e-11):
        raise ArithmeticError(f"{case.name}: the simulation is {apart} away")


def uncertain_case(case):
    """The closed form, compared with the worst cases for a grid of values of the constants."""
    worst_case.TOLERANCE = 1e-13
    grid = itertools.product(*[[F(lo) + (F(hi) - F(lo)) * k / 6 for k in range(7)] for lo, hi in case.ranges])
    found = [case.at(*values).extremes(case.h, start=case.start, end=case.end) for values in grid]
    for value, known in ((max(float(top) for top, _ in found), case.top), (min(float(low) for _, low in found), case.low)):
        if abs(value - float(known)) > 1e-11:
            raise ArithmeticError(f"{case.name}: {value} is not {known}")
    return {
        "name": case.name, "source": "our own: " + case.note, "model": case.text, "output": case.output, "from": text(case.start), "until": None if case.end is None else text(case.end),
        "max": bounds(case.top, 24), "min": bounds(case.low, 24),
    }


def corner_case(case):
    """The closed form, compared with the depth in the corner at level 0."""
    parts = [(Output([F(x) for x in h], [], F(0), ""), sign, F(0), F(1)) for h, sign in case.sides]
    found = corner.depth(case.model, parts, F(0), None)
    if abs(found - float(case.top)) > 1e-11:
        raise ArithmeticError(f"{case.name}: {found} is not {case.top}")
    return {"name": case.name, "source": "our own: " + case.note, "model": case.model.text(), "inside": case.inside, "level": bounds(case.top, 24)}


def filters():
    """Low-pass filters of values.json under a disturbance of at most 1."""
    known = {c["name"]: c["impulse_l1"] for c in json.loads((HERE / "values.json").read_text())["step_responses"]}
    for name, denominator, source in step_response.cases():
        d = [F(x) for x in denominator]
        n = len(d)
        a = [[F(int(j == i + 1)) for j in range(n)] for i in range(n - 1)] + [[-x for x in d]]
        names = ["y"] + [f"y{i}" for i in range(1, n)]
        model = Model(a, [F(0)] * n, [(F(0), F(0))] * n, names=names, disturbances=[("u", F(-1), F(1))], e=[[F(0)] * (n - 1) + [d[0]]])
        low, high = (own_sets.ball(F(x)) for x in known[name])
        norm = low.union(high)
        yield Case(name, model, [1] + [0] * (n - 1), norm, -norm, f"L1 norm of the impulse response, values.json; {source}")


def large_case(large, end):
    worst_case.TOLERANCE = 1e-10
    top, low = large.model.extremes(large.h, end=end)
    for quoted, extreme in zip(QUOTED.get((large.name, None if end is None else text(end)), ()), (top, low)):
        if abs(float(extreme) - float(quoted)) > unit_of(quoted):
            raise ArithmeticError(f"{large.name}: {quoted} quoted, {float(extreme)} derived")
    case = {
        "name": large.name, "source": large.source, "output": affine(zip(large.h, large.model.names)) if sum(map(bool, large.h)) < 10 else "C x",
        "until": None if end is None else text(end), "max": pair(top, 1), "min": pair(low, -1), "max_at": at(top), "min_at": at(low),
    }
    print(json.dumps(case), flush=True)
    return case


def unit_of(quoted):
    digits, _, power = quoted.partition("e")
    return 10.0 ** (int(power or 0) - len(digits.partition(".")[2]))


def large_cases(names):
    for name in names:
        large = large_models.MODELS[name]()
        for end in (*large.until, None):
            yield large_case(large, end)


def main():
    ctx.prec = 320
    target = HERE / "set_values.json"
    before = json.loads(target.read_text()) if target.exists() else {"large_worst_cases": []}
    fresh = list(large_models.MODELS) if "--all" in sys.argv else [x for x in sys.argv[1:] if x in large_models.MODELS]
    kept = [c for c in before["large_worst_cases"] if c["name"] not in fresh]
    groups = {
        "worst_cases": [small_case(c) for c in own_sets.cases()],
        "uncertain": [uncertain_case(c) for c in own_sets.uncertain()],
        "corners": [corner_case(c) for c in own_sets.corners()],
        "impulse_norms": [small_case(c) for c in filters()],
        "large_worst_cases": kept + list(large_cases(fresh)),
    }
    lines = [f' "{name}": [\n' + ",\n".join("  " + json.dumps(c) for c in cases) + "\n ]" for name, cases in groups.items()]
    target.write_text("{\n" + ",\n".join(lines) + "\n}\n")
    for name, cases in groups.items():
        print(f"{name}: {len(cases)}")


if __name__ == "__main__":
    main()
