"""Model files of the large open models, with sets of starts and bounded inputs, for measuring.

    venv/bin/python large_models.py FOLDER [NAME ...]

Writes NAME.toml (matrix form) and its Matrix Market files. Matrices are those of tests/data, copied with their headers: MIT licence, see there, so they
may be distributed with it. The matrices of `heat` and `fom` are formulas. Where the literature gives no ranges they are our own; `source` says which.
"""

import json
import shutil
import sys
from dataclasses import dataclass
from fractions import Fraction as F
from pathlib import Path

sys.dont_write_bytecode = True

from flint import acb, arb

import spectrum
from exponential_sum import Root, Sum, ball
from set_model import Model, affine, decimal, vector

OWN = "ranges: our own"
DATA = spectrum.DATA
VALUES = Path(__file__).resolve().parent / "set_values.json"


@dataclass
class Large:
    name: str
    model: Model
    # output: row of C
    h: list
    source: str
    # window ends for which the worst case is given besides all time
    until: tuple = ()
    # limits beside those from the worst case: (text, until)
    limits: tuple = ()


class Heat:
    """exp(At) for A = (n+1)^2/100 tridiag(1, -2, 1) from its eigenvectors: (2/(n+1)) sum_k sin(i k pi/(n+1)) sin(j k pi/(n+1)) exp(mu_k t)."""

    def __init__(self, n):
        self.n, unit = n, ball(F((n + 1) ** 2, 100))
        self.sine = [(arb.pi() * m / (n + 1)).sin() for m in range(2 * (n + 1))]
        self.roots = [Root(acb(-4 * unit * (arb.pi() * k / (2 * (n + 1))).sin() ** 2)) for k in range(1, n + 1)]

    def response(self, h, v):
        left, right = ([(i + 1, ball(x)) for i, x in enumerate(row[: self.n]) if x] for row in (h, v))
        terms, whole = {}, 2 * (self.n + 1)
        for k, root in enumerate(self.roots, 1):
            a, b = (sum((x * self.sine[i * k % whole] for i, x in side), arb(0)) for side in (left, right))
            c = a * b * 2 / (self.n + 1)
            if not c == 0:
                terms[0, root] = acb(c)
        return Sum(terms)


def boxed(n, ranges):
    """A box that is 0 but for (first, last, lo, hi), states counted from 1."""
    box = [(F(0), F(0))] * n
    for first, last, lo, hi in ranges:
        box[first - 1 : last] = [(F(lo), F(hi))] * (last - first + 1)
    return box


def from_files(name, ranges, inputs, row, columns=None):
    a, b, c = (spectrum.market(f"{name}_{part}.mtx") for part in ("A", "B2", "C"))
    n = len(a)
    e = [list(column) for column in zip(*b)]
    model = Model(a, [F(0)] * n, boxed(n, ranges), disturbances=[(f"u{k + 1}", F(lo), F(hi)) for k, (lo, hi) in enumerate(inputs)], e=e, names=names(n))
    return model, c[row]


def names(n):
    return [f"x{i + 1}" for i in range(n)]


def building():
    model, h = from_files("building", [(1, 10, "0.0002", "0.00025"), (25, 25, "-0.0001", "0.0001")], [("0.8", "1")], 0)
    return Large("building", model, h, "ranges of the literature (memory): x1..x10 in [2, 2.5]e-4, x25 in [-1, 1]e-4, u in [0.8, 1], the others 0; y = x25", limits=(("y > 0.0051", None),))


def iss():
    model, h = from_files("iss", [(1, 270, "-0.0001", "0.0001")], [(0, "0.1"), ("0.8", "1"), ("0.9", "1")], 2)
    return Large("iss", model, h, "ranges of the literature (memory): abs x_i(0) <= 1e-4, u1 in [0, 0.1], u2 in [0.8, 1], u3 in [0.9, 1]; y = y3", (F(20),), (("abs(y) > 0.0007", 20), ("abs(y) > 0.0007", None)))


def cdplayer():
    model, h = from_files("cdplayer", [(1, 120, "-0.1", "0.1")], [(0, 1), (-1, "0.5")], 0)
    return Large("cdplayer", model, h, OWN + ": abs x_i(0) <= 0.1, u1 in [0, 1], u2 in [-1, 0.5]; y = y1", (F(1),))


def dlr():
    model, h = from_files("dlr", [(1, 40, "-0.01", "0.01")], [(-1, 1), (0, "0.5")], 0)
    return Large("dlr", model, h, OWN + ": abs x_i(0) <= 0.01, u1 in [-1, 1], u2 in [0, 0.5]; y = y1", (F(20),))


def heat():
    n = 200
    b = [F(int(i == n // 3)) for i in range(1, n + 1)]
    h = [F(int(i == 2 * n // 3)) for i in range(1, n + 1)]
    model = Model(spectrum.heat(n), [F(0)] * n, boxed(n, [(1, 100, "0.9", "1")]), disturbances=[("u1", F(-1, 2), F(1))], e=[b], names=names(n))
    model.prepared()
    model.system = Heat(n)
    return Large("heat", model, h, OWN + ": x1..x100 in [0.9, 1], the others 0, u in [-0.5, 1]; input at x66, y = x133 (thirds rounded down)", (F(5),))


def fom():
    n, row = 1006, [F(10)] * 6 + [F(1)] * 1000
    model = Model(spectrum.fom(), [F(0)] * n, boxed(n, [(1, n, "-0.01", "0.01")]), disturbances=[("u1", F(-1), F(1))], e=[row], names=names(n))
    return Large("fom", model, row, OWN + ": abs x_i(0) <= 0.01, u in [-1, 1]; y = C x", (F(1, 10),))


MODELS = {"building": building, "heat": heat, "dlr": dlr, "cdplayer": cdplayer, "iss": iss, "fom": fom}


def market_text(rows):
    entries = [(i + 1, j + 1, v) for i, row in enumerate(rows) for j, v in enumerate(row) if v]
    lines = ["%%MatrixMarket matrix coordinate real general", f"{len(rows)} {len(rows[0])} {len(entries)}"]
    return "\n".join(lines + [f"{i} {j} {decimal(v)}" for i, j, v in entries]) + "\n"


def model_text(large, zones):
    m = large.model
    start = ", ".join(vector(pair) if pair[0] != pair[1] else decimal(pair[0]) for pair in m.box)
    lines = [
        f"# {large.source}", f'title = "{large.name}"', "[matrix]", f'A = "{large.name}_A.mtx"', f'E = "{large.name}_E.mtx"', f"start = [{start}]",
        *(f"[disturbance.{name}]\nrange = {vector((lo, hi))}" for name, lo, hi in m.disturbances),
        f'[output.y]\nvalue = "{affine(zip(large.h, m.names))}"',
    ]
    for i, (inside, until) in enumerate([*large.limits, *zones]):
        lines += ["[[zone]]", f'name = "z{i}"', f'inside = "{inside}"', *([f"until = {decimal(until)}"] if until is not None else [])]
    return "\n".join(lines) + "\n"


def write(folder, large, zones=()):
    folder.mkdir(parents=True, exist_ok=True)
    for part, source, rows in (("A", "A", large.model.a), ("E", "B2", [list(r) for r in zip(*large.model.e)])):
        file, target = DATA / f"{large.name}_{source}.mtx", folder / f"{large.name}_{part}.mtx"
        if file.exists():
            shutil.copy(file, target)
        else:
            target.write_text(market_text(rows))
    (folder / f"{large.name}.toml").write_text(model_text(large, zones))


def main():
    folder, chosen = Path(sys.argv[1]), sys.argv[2:] or list(MODELS)
    for name in chosen:
        write(folder, MODELS[name](), zones_near(name))


def zones_near(name):
    """Limits one per cent beyond and short of the worst cases in set_values.json, as (text, until)."""
    cases = json.loads(VALUES.read_text())["large_worst_cases"] if VALUES.exists() else []
    for case in cases:
        if case["name"] == name:
            until = None if case["until"] is None else F(case["until"])
            for relation, ends in ((">=", case["max"]), ("<=", case["min"])):
                value = sum(map(F, ends)) / 2
                for factor in (F(101, 100), F(99, 100)):
                    yield f"y {relation} {float(value * factor):.6e}", until

if __name__ == "__main__":
    main()
