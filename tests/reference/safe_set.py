#!/usr/bin/env python3
"""Checks sets of safe starts with tools that share nothing with this program: z3 (an SMT solver) and mpmath.

usage: safe_set.py KEEPOUT      (the program; needs z3-solver and mpmath, see requirements.txt)

For each small model below, `KEEPOUT certify --invariant` writes a set as polynomial conditions. Then
  disjoint   z3: the conditions and the zone together are unsatisfiable
  inhabited  z3: the conditions alone are satisfiable, so the answer above is not an empty one
  holds      mpmath: points of the trajectory (by the matrix exponential) at times from `from` on fulfil the conditions, with the
             auxiliary variables at the values that they stand for, to 30 digits
  flow       z3: on the set the point moves as x' = A x + c when the auxiliary variables move as they are said to; with the bands
             this is invariance
  samples    mpmath: points of the set with random coordinates stay out of the zone for a while
Exit status 1 if anything fails; where z3 gives no answer within a minute, that is said and is no failure. Not a part of the tests that run by default.
"""
import json
import random
import re
import subprocess
import sys
import tempfile
from fractions import Fraction
from pathlib import Path

import mpmath
import z3

mpmath.mp.dps = 50
TIMEOUT_MS = 60_000

MODELS = {
    "rotation": ("0 1; -1 0", "0 3", "1 0", "x0 >= 5.1"),
    "circle exactly": ("0 1; -1 0", "0 0", "1 0", "not (x0^2 + x1^2 = 1)"),
    "two frequencies": ("0 1 0 0; -1 0 0 0; 0 0 0 1; 0 0 -2 0", "0 0 0 0", "1 0 1 0", "x0 + x2 >= 2.1"),
    "common angle": ("0 1 0 0; -4 0 0 0; 0 0 0 1; 0 0 -9 0", "0 0 0 0", "1 0 1 0", "x0 + x2 <= -1.7"),
    "drift and rotation": ("0 1 0 0; 0 0 0 0; 0 0 0 1; 0 0 -2 0", "0 0 0 0", "0 1 1 0", "x0 + 3*x2 <= -1"),
    "integrator chain": ("0 1 0; 0 0 1; 0 0 0", "0 0 0", "1 -1 1", "x0 <= 0.4"),
    "servo": ("0 1; -25 -6", "0 25", "0 0", "x0 >= 1.1"),
    "critical damping": ("-1 1; 0 -1", "0 0", "0 1", "x0 >= 0.37"),
    "half rates": ("-1/2 0; 0 -3/2", "0 0", "1 2", "x0 + x1 >= 3.1"),
    "irrational rates": ("0 1; -1 -4", "0 0", "1 0", "x0 >= 1.1"),
    "irrational triple": ("0 1 0; 0 0 1; -1 -3 -3/2", "0 0 0", "1 0 0", "x0 >= 1.5"),
    "saddle": ("0 1; 4 -3/10", "0 0", "1/50 -7/200", "x0 <= 0"),
    "growing spiral": ("1 -2; 2 1", "0 0", "1 0", "x0^2 + x1^2 <= 1/2"),
    "growing pair": ("0 1 0; 0 0 1; -1 -1 0", "0 0 0", "1 0 0", "x0^2 + x1^2 + x2^2 <= 0.1"),
    "product that cancels": ("1 0; 0 -1", "0 0", "2 3", "x0*x1 >= 6.5"),
}


def toml(name, a, c, start, zone):
    rows = [row.split() for row in a.split(";")]
    text = [f'title = "{name}"']
    for i, (row, offset, x0) in enumerate(zip(rows, c.split(), start.split())):
        rate = " + ".join(f"({v})*x{j}" for j, v in enumerate(row)) + f" + ({offset})"
        text.append(f'[state.x{i}]\nstart = "{x0}"\nrate = "{rate}"')
    return "\n".join(text) + f'\n[[zone]]\nname = "zone"\ninside = "{zone}"\n'


def to_mp(x):
    x = Fraction(x)
    return mpmath.mpf(x.numerator) / x.denominator


class Written:
    """A set as it was written, and what its auxiliary variables stand for."""

    def __init__(self, folder):
        self.set = json.loads((folder / "zone.set.json").read_text())
        self.statement = json.loads((folder / "zone.set.statement.json").read_text())
        self.claim = self.statement["claim"]["region"]
        self.script = (folder / "zone.set.smt2").read_text()
        self.states = [v["name"] for v in self.set["variables"] if v["kind"] == "state"]
        self.meaning = {v["name"]: v["meaning"] for v in self.set["variables"]}

    def matrix(self):
        n = len(self.states)
        a = [[Fraction(0)] * (n + 1) for _ in range(n + 1)]
        for i, rate in enumerate(self.statement["phases"][0]["rates"]):
            for term in rate["terms"]:
                a[i][self.states.index(term["of"])] = Fraction(term["times"])
            a[i][n] = Fraction(rate["offset"])
        return a

    def trajectory(self, x, t):
        a = self.matrix()
        flow = mpmath.expm(mpmath.matrix([[to_mp(v) for v in row] for row in a]) * t, method="taylor")
        x = mpmath.matrix(list(x) + [1])
        return list(flow * x)[:-1]

    def roots(self):
        """The values of the named roots, to full precision."""
        values = []
        for root in self.claim["roots"]:
            found = mpmath.polyroots([to_mp(c) for c in reversed(root["polynomial"])], maxsteps=500, extraprec=500)
            inside = [z for z in found
                      if to_mp(root["re"][0]) - 1e-30 <= mpmath.re(z) <= to_mp(root["re"][1]) + 1e-30
                      and to_mp(root["im"][0]) - 1e-30 <= mpmath.im(z) <= to_mp(root["im"][1]) + 1e-30]
            assert len(inside) == 1, (root, found)
            values.append(mpmath.mpc(inside[0]))
        return values

    def exponent(self, name):
        """The power of y or u that a variable is: y^(1/2), y^(-1)."""
        return Fraction(re.match(r"\w+\^\((-?\d+(?:/\d+)?)\)", self.meaning[name]).group(1))

    def auxiliary(self, y, u, phi, t):
        roots = self.roots()
        values = {}
        for name in self.meaning:
            if match := re.fullmatch(r"root_(\d+)_(re|im)", name):
                values[name] = getattr(mpmath, match.group(2))(roots[int(match.group(1)) - 1])
            elif re.fullmatch(r"y|y_inverse", name):
                values[name] = y ** to_mp(self.exponent(name))
            elif match := re.fullmatch(r"u_(\d+)(_inverse)?", name):
                values[name] = u[int(match.group(1)) - 1] ** to_mp(self.exponent(name))
            elif match := re.fullmatch(r"([cs])_(\d+)", name):
                wave = mpmath.cos if match.group(1) == "c" else mpmath.sin
                values[name] = wave(phi[int(match.group(2)) - 1])
            elif name == "T":
                values[name] = t
        return values

    def at_time(self, t):
        roots = self.roots()
        y = mpmath.exp(to_mp(self.claim["scale"]) * t)
        u = [mpmath.exp(mpmath.re(roots[int(r["root"])]) * t) for r in self.claim["rates"]]
        phi = [mpmath.im(roots[int(b)]) * t for b in self.claim["base"]]
        return self.auxiliary(y, u, phi, t)

    def random_point(self, generator):
        """Auxiliary variables of a point of the set, and the states that the conditions give them."""
        y = to_mp(self.claim["start"]) * mpmath.exp(generator.uniform(0, 3))
        u = []
        for rate in self.claim["rates"]:
            e = to_mp(rate["lo"]) + generator.random() * (to_mp(rate["hi"]) - to_mp(rate["lo"]))
            u.append(y ** e)
        phi = [mpmath.mpf(generator.uniform(0, 7)) for _ in self.claim["base"]]
        least = to_mp(self.claim["from"])
        most = y ** to_mp(self.claim["power"]) if "power" in self.claim else least + 50
        values = self.auxiliary(y, u, phi, least + generator.random() * (most - least))
        for condition in self.set["conditions"]:
            # The equation of a state: the only ones that name states.
            states = [f for term in condition["polynomial"] for f in term["of"] if f in self.states]
            if states:
                values[states[0]] = 0
                values[states[0]] = evaluate(condition["polynomial"], values)
        return values


def evaluate(polynomial, values):
    total = 0
    for term in polynomial:
        product = to_mp(term["times"])
        for factor in term["of"]:
            name, power = (factor, 1) if isinstance(factor, str) else (factor["name"], int(factor["power"]))
            product *= values[name] ** power
        total += product
    return total


def holds(condition, values, slack):
    value, relation = evaluate(condition["polynomial"], values), condition["is"]
    return {"= 0": abs(value) <= slack, "<= 0": value <= slack, ">= 0": value >= -slack,
            "< 0": value < slack, "> 0": value > -slack, "!= 0": abs(value) > 0}[relation]


def in_zone(formula, values, slack):
    """Whether the zone holds, widened by the slack where that is needed for certain."""
    if "all" in formula:
        return all(in_zone(f, values, slack) for f in formula["all"])
    if "any" in formula:
        return any(in_zone(f, values, slack) for f in formula["any"])
    value = evaluate(formula["polynomial"], values)
    return {"= 0": False, "<= 0": value <= -slack, ">= 0": value >= slack, "< 0": value < -slack,
            "> 0": value > slack, "!= 0": abs(value) > slack}[formula["is"]]


def solve(assertions):
    solver = z3.SolverFor("QF_NRA")
    solver.set("timeout", TIMEOUT_MS)
    solver.add(assertions)
    return str(solver.check())


def agrees(answer, wanted):
    """True, False, or that the solver gave up, which says nothing."""
    return "no answer" if answer == "unknown" else answer == wanted


def flow_is_right(written):
    """z3's answers to: on the set, some state's derivative by the chain rule is not what the equations say."""
    symbols = {name: z3.Real(name) for name in written.meaning}

    def root_part(position, part):
        name = f"root_{position + 1}_{part}"
        if name in symbols:
            return symbols[name]
        value = getattr(mpmath, part)(written.roots()[position])
        exact = Fraction(str(mpmath.nstr(value, 30))).limit_denominator(10**12)
        assert abs(to_mp(exact) - value) < 1e-40, (name, value)
        return z3.Q(exact.numerator, exact.denominator)

    def frequency(axis):
        position = int(written.claim["base"][axis])
        if f"root_{position + 1}_im" in symbols:
            return symbols[f"root_{position + 1}_im"]
        for exponent in written.claim["exponents"]:
            turns = [int(n) for n in exponent["turns"]]
            if turns[axis] and not any(n for j, n in enumerate(turns) if j != axis):
                return root_part(int(exponent["root"]), "im") / turns[axis]
        raise ValueError("no exponent turns by this angle alone")

    speed = {name: z3.RealVal(0) for name in symbols}
    scale = Fraction(written.claim["scale"])
    for name in symbols:
        if re.fullmatch(r"y|y_inverse", name):
            rate = scale * written.exponent(name)
            speed[name] = z3.Q(rate.numerator, rate.denominator) * symbols[name]
        elif match := re.fullmatch(r"u_(\d+)(_inverse)?", name):
            e = written.exponent(name)
            root = int(written.claim["rates"][int(match.group(1)) - 1]["root"])
            speed[name] = z3.Q(e.numerator, e.denominator) * root_part(root, "re") * symbols[name]
        elif match := re.fullmatch(r"([cs])_(\d+)", name):
            k = match.group(2)
            speed[name] = frequency(int(k) - 1) * (-symbols[f"s_{k}"] if match.group(1) == "c" else symbols[f"c_{k}"])
        elif name == "T":
            speed[name] = z3.RealVal(1)
    a = written.matrix()
    answers = []
    for condition in written.set["conditions"]:
        own = [f for term in condition["polynomial"] for f in term["of"] if f in written.states]
        if not own:
            continue
        derivative = z3.RealVal(0)
        for term in condition["polynomial"]:
            factors = []
            for factor in term["of"]:
                name, power = (factor, 1) if isinstance(factor, str) else (factor["name"], int(factor["power"]))
                factors += [name] * power
            if own[0] in factors:
                continue
            c = Fraction(term["times"])
            for i, name in enumerate(factors):
                product = z3.Q(c.numerator, c.denominator) * speed[name]
                for j, other in enumerate(factors):
                    if j != i:
                        product = product * symbols[other]
                derivative = derivative + product
        i = written.states.index(own[0])
        wanted = z3.Q(a[i][-1].numerator, a[i][-1].denominator)
        for j, other in enumerate(written.states):
            wanted = wanted + z3.Q(a[i][j].numerator, a[i][j].denominator) * symbols[other]
        equations = [z3_condition(c, symbols) for c in written.set["conditions"] if c["is"] == "= 0"]
        bounds = [z3_condition(c, symbols) for c in written.set["conditions"] if c["is"] != "= 0"]
        answers.append(solve(equations + bounds + [derivative != wanted]))
    return answers


def z3_condition(condition, symbols):
    total = z3.RealVal(0)
    for term in condition["polynomial"]:
        c = Fraction(term["times"])
        product = z3.Q(c.numerator, c.denominator)
        for factor in term["of"]:
            name, power = (factor, 1) if isinstance(factor, str) else (factor["name"], int(factor["power"]))
            for _ in range(power):
                product = product * symbols[name]
        total = total + product
    return {"= 0": total == 0, "<= 0": total <= 0, ">= 0": total >= 0, "< 0": total < 0, "> 0": total > 0}[condition["is"]]


def check(name, keepout, folder):
    model = folder / "model.toml"
    model.write_text(toml(name, *MODELS[name]))
    run = [keepout, "certify", str(model), "--invariant", str(folder)]
    done = subprocess.run(run, capture_output=True, text=True)
    if not (folder / "zone.set.json").exists():
        return {"set": "none: " + done.stdout.strip().splitlines()[-1].strip() + done.stderr.strip()}
    written = Written(folder)
    whole = z3.parse_smt2_string(written.script)
    results = {"disjoint": agrees(solve(whole), "unsat"), "inhabited": agrees(solve(list(whole)[:-1]), "sat")}
    start = [to_mp(s["start"]) for s in written.statement["states"]]
    first = to_mp(written.claim["from"])
    results["holds"] = True
    for t in [first, first * 1.25, first + 1, first * 3 + 2]:
        values = written.at_time(t)
        values.update(zip(written.states, written.trajectory(start, t)))
        size = 1 + max(abs(v) for v in values.values())
        results["holds"] &= all(holds(c, values, size * mpmath.mpf(10) ** -30) for c in written.set["conditions"])
    answers = flow_is_right(written)
    results["flow"] = all(answer == "unsat" for answer in answers) or answers
    generator = random.Random(1)
    results["samples"] = True
    for _ in range(40):
        values = written.random_point(generator)
        point = [values[s] for s in written.states]
        for t in [0, generator.uniform(0, 2), generator.uniform(0, 20)]:
            moved = dict(zip(written.states, written.trajectory(point, t)))
            results["samples"] &= not in_zone(written.set["zone"], moved, mpmath.mpf(10) ** -25)
    return results


def main():
    failed = False
    for name in MODELS:
        with tempfile.TemporaryDirectory() as folder:
            results = check(name, sys.argv[1], Path(folder))
        failed |= any(value is not True and value != "no answer" for value in results.values())
        print(f"{name:22}", "  ".join(f"{key} {'yes' if value is True else value}" for key, value in results.items()), flush=True)
    sys.exit(1 if failed else 0)


main()
