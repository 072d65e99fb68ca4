"""Random systems of at most eight states with sets of starts, known drives, bounded disturbances and uncertain constants.

A kind fixes blocks of a block-diagonal or block-triangular matrix B; the system is x' = P B P^-1 x + c + B u + E w with a random integer P of determinant 1.
All numbers are short decimals.
"""

import math
from fractions import Fraction as F

import numpy as np

from random_problem import product, unimodular
from set_model import Drive, Model, UncertainModel

KINDS = [
    "real", "complex", "mixed", "clustered", "defective real", "defective complex", "triangular", "dense", "mechanical", "slow and fast", "lightly damped",
    "driven", "ellipsoid", "hull", "marginal", "cancelled", "unbounded", "uncertain",
]


def short(rng, low, high, bottoms=(1, 2, 5, 10)):
    """A short decimal."""
    bottom = rng.choice(bottoms)
    return F(rng.randint(math.ceil(low * bottom), math.floor(high * bottom)), bottom)


def rate(rng):
    return -short(rng, 0.2, 4, (5, 10))


def real(r, size=1):
    return [[F(r) if i == j else F(int(j == i + 1)) for j in range(size)] for i in range(size)]


def pair(r, w, size=1):
    """r +- i w, w rational; `size` of them in a chain."""
    a = [[F(0)] * (2 * size) for _ in range(2 * size)]
    for i in range(size):
        a[2 * i][2 * i] = a[2 * i + 1][2 * i + 1] = F(r)
        a[2 * i][2 * i + 1], a[2 * i + 1][2 * i] = F(w), -F(w)
        if i + 1 < size:
            a[2 * i][2 * i + 2] = a[2 * i + 1][2 * i + 3] = F(1)
    return a


def loop(rng):
    """s^2 + d s + k, damped less than critically, with an irrational frequency mostly."""
    k = short(rng, 1, 12)
    d = F(math.ceil(10 * rng.uniform(0.1, 1.9) * math.sqrt(k)), 10)
    return [[F(0), F(1)], [-k, -d]]


def undamped(rng, d):
    q = short(rng, 0.5, 2, (1, 2))
    return [[F(0), q * d], [-q, F(0)]]


def blocks(rng, kind):
    """Blocks; and how many of their first coordinates do not decay."""
    some = lambda low, high, make: [make() for _ in range(rng.randint(low, high))]
    w = lambda: short(rng, 0.5, 5)
    if kind == "real":
        return some(2, 8, lambda: real(rate(rng))), 0
    if kind in ("complex", "driven", "ellipsoid", "hull"):
        return some(1, 3 if kind == "complex" else 2, lambda: rng.choice([pair(rate(rng), w()), loop(rng)])) + some(0, 1, lambda: real(rate(rng))), 0
    if kind == "mixed":
        return some(1, 3, lambda: loop(rng)) + some(1, 2, lambda: real(rate(rng))), 0
    if kind == "clustered":
        r, gap = rate(rng), F(1, rng.choice([20, 50, 100]))
        if rng.random() < 0.5:
            return [real(r - gap * i) for i in range(rng.randint(2, 4))], 0
        v = w()
        return [pair(r - gap * i, v + gap * i) for i in range(2)] + some(0, 2, lambda: real(rate(rng))), 0
    if kind == "defective real":
        return [real(rate(rng), rng.randint(2, 4))] + some(0, 2, lambda: real(rate(rng))), 0
    if kind == "defective complex":
        return [pair(rate(rng), w(), 2)] + some(0, 2, lambda: real(rate(rng))), 0
    if kind == "slow and fast":
        return [real(-short(rng, 0.02, 0.1, (50, 100))), real(-F(rng.randint(20, 60))), loop(rng)], 0
    if kind == "lightly damped":
        return some(1, 2, lambda: pair(-F(rng.randint(1, 5), 50), short(rng, 1, 8))) + some(0, 1, lambda: real(rate(rng))), 0
    stay = rng.choice([[undamped(rng, d) for d in rng.sample([1, 2, 3, 5], rng.randint(1, 2))], [real(F(0))], [real(F(0)), undamped(rng, 1)]])
    if kind == "cancelled":
        stay = rng.choice([stay, [real(F(0), 2)], [real(short(rng, 0.1, 1))], [pair(F(1, 5), w())]])
    return stay + some(1, 2, lambda: rng.choice([loop(rng), real(rate(rng))])), sum(map(len, stay))


def diagonal(parts):
    n = sum(map(len, parts))
    a, at = [[F(0)] * n for _ in range(n)], 0
    for part in parts:
        for i, row in enumerate(part):
            a[at + i][at : at + len(row)] = row
        at += len(part)
    return a


def chain(rng):
    """Masses in a row on springs and dampers: positions, then velocities."""
    n = rng.randint(1, 4)
    masses = [rng.choice([F(1), F(2), F(1, 2), F(4)]) for _ in range(n)]
    springs, dampers = [short(rng, 1, 9) for _ in range(n + 1)], [short(rng, 0.2, 2) for _ in range(n + 1)]
    a = [[F(int(j == n + i)) for j in range(2 * n)] for i in range(n)]
    for i in range(n):
        row = [F(0)] * (2 * n)
        for j, link in ((i - 1, i), (i + 1, i + 1)):
            for offset, values in ((0, springs), (n, dampers)):
                row[offset + i] -= values[link] / masses[i]
                if 0 <= j < n:
                    row[offset + j] += values[link] / masses[i]
        a.append(row)
    return a


def shifted(rng, a):
    """Moved to the left until it decays."""
    top = max(np.linalg.eigvals(np.array(a, dtype=float)).real)
    by = F(math.ceil(10 * (top + rng.uniform(0.2, 1))), 10)
    return [[x - by * (i == j) for j, x in enumerate(row)] for i, row in enumerate(a)]


def matrix(rng, kind):
    """A, the inverse of the change of coordinates, the change, and how many coordinates do not decay."""
    if kind == "mechanical":
        a = chain(rng)
        one = [[F(int(i == j)) for j in range(len(a))] for i in range(len(a))]
        return a, one, one, 0
    if kind == "dense":
        n = rng.randint(2, 6)
        a = shifted(rng, [[F(rng.randint(-3, 3)) for _ in range(n)] for _ in range(n)])
        one = [[F(int(i == j)) for j in range(n)] for i in range(n)]
        return a, one, one, 0
    if kind == "triangular":
        parts = [loop(rng), rng.choice([loop(rng), shifted(rng, [[F(rng.randint(-2, 2)) for _ in range(3)] for _ in range(3)])]), real(rate(rng))]
        b, stay = diagonal(parts), 0
        edges = [0, len(parts[0]), len(parts[0]) + len(parts[1]), len(b)]
        for i in range(len(b)):
            for j in range(len(b)):
                if sum(i >= e for e in edges) < sum(j >= e for e in edges) and rng.random() < 0.4:
                    b[i][j] = short(rng, -2, 2)
    else:
        parts, stay = blocks(rng, kind)
        b = diagonal(parts)
    p, inverse = unimodular(rng, len(b))
    return product(product(p, b), inverse), inverse, p, stay


def drives(rng, kind):
    if kind != "driven" and rng.random() > 0.3:
        return []
    parts = {
        "const": lambda: ("const", short(rng, -2, 2)), "exp": lambda: ("exp", short(rng, -2, 2), -short(rng, 0.3, 2)),
        "sin": lambda: ("sin", short(rng, -1, 1), short(rng, 0.5, 4, (1, 2))), "cos": lambda: ("cos", short(rng, -1, 1), short(rng, 0.5, 4, (1, 2))),
    }
    waves = 1 if kind in ("marginal", "cancelled", "unbounded") else 2
    words = ["const", "exp"] if kind in ("marginal", "cancelled", "unbounded") else list(parts)
    made = []
    for i in range(rng.randint(1, waves)):
        chosen = rng.sample(words, rng.randint(1, 2))
        made.append(Drive(f"u{i}", [part for part in (parts[w]() for w in chosen) if part[1]] or [("const", F(1))]))
    return made


def box(rng, n):
    made = []
    for _ in range(n):
        lo = short(rng, -2, 2)
        made.append((lo, lo + short(rng, 0.1, 1.5)) if rng.random() < 0.65 else (lo, lo))
    return made


def ellipsoid(rng, n):
    """Centre and L L' with a short lower triangle L."""
    low = [[short(rng, -0.5, 0.5) if j < i else short(rng, 0.2, 1) if j == i else F(0) for j in range(n)] for i in range(n)]
    return [short(rng, -1, 1) for _ in range(n)], product(low, [list(c) for c in zip(*low)])


def column(rng, n):
    """A sparse column that is not 0."""
    made = [short(rng, -2, 2) if rng.random() < 0.5 else F(0) for _ in range(n)]
    made[rng.randrange(n)] = F(rng.choice([-1, 1, 2]))
    return made


def loose_loops(rng):
    """One or two loops s^2 + d s + k with one or two uncertain d or k: B, the slopes, the ranges."""
    parts = [loop(rng) for _ in range(rng.randint(1, 2))]
    b, ranges, slopes = diagonal(parts), [], []
    if len(parts) == 2 and rng.random() < 0.5:
        b[1][2] = short(rng, -1, 1)
    for k in range(rng.choice([1, 1, 2])):
        i, j = 2 * rng.randrange(len(parts)) + 1, rng.choice([0, 1])
        j += i - 1
        if any(s[i][j] for s in slopes):
            continue
        middle_ = -b[i][j]
        half = F(max(1, round(100 * middle_ * F(rng.randint(2, 30), 100))), 100)
        ranges.append((f"p{k}", middle_ - half, middle_ + half))
        slopes.append([[F(-1) if (r, c) == (i, j) else F(0) for c in range(len(b))] for r in range(len(b))])
        b[i][j] = F(0)
    return b, slopes, ranges


def loose_system(rng):
    b, slopes, ranges = loose_loops(rng)
    n = len(b)
    p, inverse = unimodular(rng, n)
    turned = lambda m: product(product(p, m), inverse)
    signals = [(f"w{k}", short(rng, -1, 0), short(rng, 0.1, 1)) for k in range(rng.choice([0, 1]))]
    made = UncertainModel(turned(b), [F(0)] * n, box(rng, n), disturbances=signals, e=[column(rng, n) for _ in signals])
    if rng.random() < 0.5:
        made.drives, made.b = [Drive("u0", [("const", short(rng, 0.5, 2))])], [column(rng, n)]
    return made.with_uncertain(ranges, [turned(s) for s in slopes]), inverse, 0


def system(rng, kind):
    if kind == "uncertain":
        return loose_system(rng)
    a, inverse, p, stay = matrix(rng, kind)
    n = len(a)
    known = drives(rng, kind)
    decaying = lambda c: c if kind != "marginal" else product(p, [[F(0)] if i < stay else [x] for i, x in enumerate(c)])
    columns = lambda count: [[x[0] if isinstance(x, list) else x for x in decaying(column(rng, n))] for _ in range(count)]
    count = rng.randint(1, 2) if kind == "unbounded" else rng.choice([0, 1, 1, 2, 2, 3])
    ranges = []
    for k in range(count):
        hi = short(rng, 0.1, 2)
        ranges.append((f"w{k}", -hi if rng.random() < 0.5 else short(rng, -2, 0), hi))
    made = Model(a, [F(0)] * n, box(rng, n), drives=known, b=columns(len(known)), disturbances=ranges, e=columns(count))
    if kind == "ellipsoid":
        made.box, made.ellipsoid = None, ellipsoid(rng, n)
    elif kind == "hull":
        made.box, made.points = None, [[short(rng, -2, 2) for _ in range(n)] for _ in range(rng.randint(2, 5))]
    elif not ranges and all(lo == hi for lo, hi in made.box):
        made.box[0] = (F(0), F(1, 2))
    if rng.random() < 0.3 and kind not in ("cancelled", "unbounded"):
        rest = [short(rng, -1, 1) for _ in range(n)]
        made.offset = [-sum((x * r for x, r in zip(row, rest)), F(0)) for row in a]
    return made, inverse, stay
