"""Random problems: verdicts of the program against dense evaluation with python-flint balls.

    venv/bin/python campaign.py KEEPOUT [PROBLEMS] [SEED]

KEEPOUT is the program's path. Each problem is a random system of one to five states (stable, marginal, growing, defective, commensurate) with three
zones. A `clear` verdict is contradicted by a sampled instant that is in the zone for certain; an `enters` verdict by a sampled
instant before its bracket that is in the zone for certain, or by no instant of the bracket and its closest neighbourhood being possibly in the
zone. A certified margin must not exceed the least distance over the samples. Prints the counts; exits with 1 on any contradiction.
"""

import json
import random
import subprocess
import sys
import tempfile
from collections import Counter
from fractions import Fraction as F
from pathlib import Path

from flint import arb, arb_mat, ctx

ctx.prec = 200


def ball(q):
    q = F(q)
    return arb(q.numerator) / arb(q.denominator)


def rational(rng, size=3, bottoms=(1, 1, 2, 3)):
    return F(rng.randint(-size, size), rng.choice(bottoms))


def system(rng, kind):
    n = rng.randint(1, 5)
    a = [[rational(rng) for _ in range(n)] for _ in range(n)]
    if kind == "marginal":
        a = [[F(0) if i == j else (a[i][j] if i < j else -a[j][i]) for j in range(n)] for i in range(n)]
    if kind == "defective":
        a = [[a[0][0] - 1 if i == j else (a[i][j] if i < j else F(0)) for j in range(n)] for i in range(n)]
    if kind == "stable":
        a = [[a[i][j] - (4 if i == j else 0) for j in range(n)] for i in range(n)]
    if kind == "commensurate":
        n = 4
        w, v = rng.randint(1, 3), rng.randint(1, 3)
        d = F(rng.randint(0, 1), 10)
        a = [[-d, F(w), F(0), F(0)], [-F(w), -d, F(0), F(0)], [F(0), F(0), -d, F(v)], [F(0), F(0), -F(v), -d]]
    return a, [rational(rng) for _ in range(n)]


def polynomial(rng, n):
    terms = {}
    for _ in range(rng.randint(1, 3)):
        powers = [0] * n
        for _ in range(rng.randint(1, 3)):
            powers[rng.randrange(n)] += 1
        terms[tuple(powers)] = F(rng.choice([-2, -1, 1, 2, 3]), rng.choice([1, 2]))
    return terms


def text(terms):
    def product(powers):
        return "*".join(f"x{i}^{k}" for i, k in enumerate(powers) if k)

    return " + ".join(f"({c})*{product(p)}" for p, c in terms.items())


def value(terms, x):
    total = arb(0)
    for powers, c in terms.items():
        product = ball(c)
        for i, k in enumerate(powers):
            for _ in range(k):
                product *= x[i, 0]
        total += product
    return total


def in_zone(p, op, level):
    """True, False or None where the ball does not decide."""
    d = p - ball(level)
    if op == ">=":
        return True if d >= 0 else (False if d < 0 else None)
    return True if d <= 0 else (False if d > 0 else None)


def main():
    program, count = sys.argv[1], int(sys.argv[2]) if len(sys.argv) > 2 else 300
    rng = random.Random(int(sys.argv[3]) if len(sys.argv) > 3 else 1)
    verdicts, wrong = Counter(), 0
    with tempfile.TemporaryDirectory() as folder:
        for number in range(count):
            kind = rng.choice(["stable", "marginal", "growing", "defective", "commensurate"])
            a, start = system(rng, kind)
            n = len(a)
            samples = [F(k, 16) for k in range(0, 320)]
            step = (arb_mat([[ball(v) for v in row] for row in a]) * ball(F(1, 16))).exp()
            x = arb_mat([[ball(s)] for s in start])
            states = []
            for _ in samples:
                states.append(x)
                x = step * x
            zones = []
            for _ in range(3):
                terms = polynomial(rng, n)
                op = rng.choice([">=", "<="])
                values = sorted(float(value(terms, s).mid()) for s in states[:160])
                # a level near the edge of what is seen, at a known distance from it
                edge = values[-1] if op == ">=" else values[0]
                sign = 1 if op == ">=" else -1
                shift = F(rng.choice([1, 10, 100]), 1000) * rng.choice([1, 1, 1, -1])
                level = F(edge).limit_denominator(1000) + sign * shift * max(1, abs(int(edge)))
                zones.append((terms, op, level))
            model = "".join(f"[state.x{i}]\nstart = \"{start[i]}\"\nrate = \"" + " + ".join(f"({a[i][j]})*x{j}" for j in range(n)) + "\"\n" for i in range(n))
            for k, (terms, op, level) in enumerate(zones):
                model += f"[[zone]]\nname = \"z{k}\"\ninside = \"{text(terms)} {op} ({level})\"\n"
            path = Path(folder) / "model.toml"
            path.write_text(model)
            run = subprocess.run([program, "certify", str(path), "--json", "--effort", "6000"], capture_output=True, text=True, timeout=600)
            if run.returncode not in (0, 1, 2):
                print(model, run.stdout, run.stderr)
                sys.exit(1)
            for (terms, op, level), zone in zip(zones, json.loads(run.stdout)["zones"]):
                verdict = zone["verdict"]
                verdicts[kind, verdict] += 1
                inside = [in_zone(value(terms, s), op, level) for s in states]
                problem = None
                if verdict == "clear":
                    if True in inside:
                        problem = f"clear, but inside at t = {samples[inside.index(True)]}"
                    elif "margin" in zone:
                        margin = ball(zone["margin"])
                        if any(abs(value(terms, s) - ball(level)) < margin for s in states):
                            problem = f"margin {zone['margin']} too large"
                if verdict == "enters":
                    first, last = F(zone["time"]["from"]), F(zone["time"]["to"])
                    early = [t for t, i in zip(samples, inside) if i is True and t < first]
                    at = (arb_mat([[ball(v) for v in row] for row in a]) * ball(last)).exp() * arb_mat([[ball(s)] for s in start])
                    if early:
                        problem = f"first entry at {first}, but inside at t = {early[0]}"
                    elif in_zone(value(terms, at), op, level) is False:
                        problem = f"entered before t = {last}, but outside there"
                if problem:
                    wrong += 1
                    print(f"WRONG ({kind}): {problem}\n{model}\n{text(terms)} {op} {level}\n{zone}")
    for (kind, verdict), k in sorted(verdicts.items()):
        print(f"{kind:14} {verdict:10} {k}")
    print(f"{count} problems, {3 * count} zones, {wrong} wrong")
    sys.exit(1 if wrong else 0)


if __name__ == "__main__":
    main()
