"""Random systems of at most eight states with sets of starts, known drives and bounded disturbances, and zones at known distances from the worst case.

A kind fixes blocks of a block-diagonal or block-triangular matrix B; the system is x' = P B P^-1 x + c + B u + E w with a random integer P of determinant 1.
All numbers are short decimals. Worst cases are those of `worst_case.py`, of a corner of two half-spaces those of `corner.py`.
"""

import math
import random
from dataclasses import dataclass, field
from fractions import Fraction as F

import numpy as np

import corner
from random_problem import product, unimodular
from set_model import Drive, Model, affine, decimal
from worst_case import Extreme

KINDS = [
    "real", "complex", "mixed", "clustered", "defective real", "defective complex", "triangular", "dense", "mechanical", "slow and fast", "lightly damped",
    "driven", "ellipsoid", "hull", "marginal", "cancelled", "unbounded",
]
DISTANCES = [F(1, 10**2), F(1, 10**4), F(1, 10**6)]
ZONES = 10


@dataclass
class Output:
    h: list
    h_drives: list
    constant: F
    text: str
    known: dict = field(default_factory=dict)


@dataclass
class Zone:
    """`parts`: the half-spaces (output, sign, level), inside where sign * output >= sign * level; `distance` of the level beyond the worst case, relative."""

    text: str
    form: str
    start: F
    end: F | None
    expected: str
    distance: F | None
    parts: list
    margin: object = None


@dataclass
class Problem:
    kind: str
    model: Model
    outputs: list
    zones: list


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


def system(rng, kind):
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


def output(rng, kind, model, inverse, stay):
    n = len(model.a)
    while True:
        h = [F(0)] * n
        for _ in range(rng.randint(1, 3)):
            h[rng.randrange(n)] = short(rng, -2, 2, (1, 1, 2, 4)) or F(1)
        if kind == "cancelled":
            weights = [F(0)] * stay + h[stay:]
            h = product([weights], inverse)[0]
        if any(h):
            break
    weights = [short(rng, -1, 1, (1, 2)) if rng.random() < 0.3 else F(0) for _ in model.drives]
    constant = short(rng, -1, 1) if rng.random() < 0.3 else F(0)
    text = affine([*zip(h, model.names), *((w, d.name) for w, d in zip(weights, model.drives))], constant)
    return Output(h, weights, constant, text)


def extremes(model, out, start, end):
    key = (start, end)
    if key not in out.known:
        out.known[key] = model.extremes(out.h, out.h_drives, out.constant, start, end)
    return out.known[key]


def window(rng):
    draw = rng.random()
    start = F(0) if draw < 0.75 else short(rng, 0.5, 6)
    return start, None if draw < 0.55 or draw > 0.92 else start + short(rng, 0.5, 15)


def scale(top, low):
    """The greater of the two moduli."""
    return max(abs(float(x)) for x in (top, low) if x.value is not None)


def rounded(value, unit):
    """A decimal within a hundredth of the unit."""
    digits = max(0, 2 - math.floor(math.log10(float(unit))))
    return F(round(F(value) * 10**digits), 10**digits)


def middle(extreme):
    """The exact middle of the ball."""
    mantissa, power = extreme.value.mid().man_exp()
    return F(int(mantissa)) * F(2) ** int(power)


def comparison(rng, text, sign, level):
    strict = "" if rng.random() < 0.6 else "="
    forward, back = (">", "<") if sign > 0 else ("<", ">")
    draw = rng.random()
    if draw < 0.75:
        return f"{text} {forward}{strict} {number(level)}"
    if draw < 0.9:
        return f"{number(level)} {back}{strict} {text}"
    return f"not ({text} {back}{'=' if not strict else ''} {number(level)})"


def number(q):
    return decimal(q) if q >= 0 else f"({decimal(q)})"


def half_space(rng, model, out, start, end, side, distance):
    """A half-space at a distance beyond (side 1) or short of (side -1) the worst case; None where that is infinite or everything is 0."""
    sign = rng.choice([1, -1])
    top, low = extremes(model, out, start, end)
    worst = top if sign > 0 else low
    if worst.value is None:
        return far(rng, out, sign, start, end)
    unit = F(scale(top, low)).limit_denominator(10**9) if scale(top, low) > 1e-6 else None
    if unit is None:
        return None
    exact_value = middle(worst)
    level = rounded(exact_value + sign * side * distance * unit, distance * unit)
    text = comparison(rng, out.text, sign, level)
    expected = "clear" if side > 0 else "enters"
    return Zone(text, "half-space", start, end, expected, distance, [(out, sign, level)], sign * (level - exact_value))


def far(rng, out, sign, start, end):
    """Beyond any bound: entered at last."""
    level = sign * F(rng.choice([10, 100, 1000]))
    return Zone(comparison(rng, out.text, sign, level), "far", start, end, "enters", None, [(out, sign, level)])


def two_sided(rng, model, out, start, end, side, distance):
    top, low = extremes(model, out, start, end)
    if top.value is None or low.value is None or scale(top, low) < 1e-6:
        return None
    centre = rng.choice([F(0), rounded((middle(top) + middle(low)) / 2, scale(top, low) / 100)])
    worst = max(middle(top) - centre, centre - middle(low))
    unit = F(scale(top, low)).limit_denominator(10**9)
    level = rounded(worst + side * distance * unit, distance * unit)
    if level <= 0:
        return None
    inner = f"{out.text} - {number(centre)}" if centre else out.text
    text = f"abs({inner}) {'>=' if rng.random() < 0.6 else '>'} {decimal(level)}"
    return Zone(text, "two-sided", start, end, "clear" if side > 0 else "enters", distance, [(out, 1, centre + level), (out, -1, centre - level)])


def either(rng, model, outs, start, end, side, distance):
    """A half-space near the worst case, or another that is a tenth beyond."""
    first = half_space(rng, model, outs[0], start, end, side, distance)
    second = half_space(rng, model, outs[1], start, end, 1, F(1, 10))
    if first is None or second is None or second.form == "far":
        return first
    words = [first.text, second.text]
    rng.shuffle(words)
    return Zone(" or ".join(words), "or", start, end, first.expected, distance, first.parts + second.parts)


def both(rng, model, outs, start, end, side, distance):
    """The corner of two half-spaces, each of which is reached."""
    signs, levels, units = [], [], []
    for out in outs:
        top, low = extremes(model, out, start, end)
        if top.value is None or low.value is None or scale(top, low) < 1e-6:
            return None
        sign, unit = rng.choice([1, -1]), F(scale(top, low)).limit_denominator(10**9)
        best, worst = (middle(top), middle(low)) if sign > 0 else (middle(low), middle(top))
        signs.append(sign), units.append(unit)
        levels.append(worst + F(rng.randint(50, 95), 100) * (best - worst))
    parts = list(zip(outs, signs, levels, units))
    depth = corner.depth(model, parts, start, end)
    if depth is None:
        return None
    # both levels are moved until the corner is this far beyond, relative to the scale of each
    moved = [rounded(level + sign * (F(depth) + side * distance) * unit, distance * unit) for _, sign, level, unit in parts]
    text = " and ".join(comparison(rng, out.text, sign, level) for (out, sign, _, _), level in zip(parts, moved))
    return Zone(text, "and", start, end, "clear" if side > 0 else "enters", distance, [(out, sign, level) for (out, sign, _, _), level in zip(parts, moved)])


def equal(rng, model, out, start, end, side, distance):
    """A value that is beyond the worst case, or just taken by some trajectory."""
    made = half_space(rng, model, out, start, end, side, distance)
    if made is None or made.form == "far" or (side < 0 and 4 * distance * F(scale(*extremes(model, out, start, end))) > width(model, out, start, end)):
        return None
    made.text, made.form, made.margin = f"{out.text} = {number(made.parts[0][2])}", "equal", None
    return made


def width(model, out, start, end):
    top, low = extremes(model, out, start, end)
    return math.inf if top.value is None or low.value is None else float(top) - float(low)


def zone(rng, problem):
    model = problem.model
    while True:
        start, end = window(rng)
        side, distance = rng.choice([1, -1]), rng.choice(DISTANCES)
        form = rng.choices(["half-space", "two-sided", "or", "and", "equal"], [45, 18, 12, 18, 7])[0]
        outs = rng.sample(problem.outputs, 2)
        if form == "half-space":
            made = half_space(rng, model, outs[0], start, end, side, distance)
        elif form == "two-sided":
            made = two_sided(rng, model, outs[0], start, end, side, distance)
        elif form == "or":
            made = either(rng, model, outs, start, end, side, distance)
        elif form == "and":
            made = both(rng, model, outs, start, end, side, distance)
        else:
            made = equal(rng, model, outs[0], start, end, side, distance)
        if made is not None:
            return made


def problem(seed, number):
    rng = random.Random(f"sets {seed}/{number}")
    kind = KINDS[number % len(KINDS)]
    while True:
        model, inverse, stay = system(rng, kind)
        made = Problem(kind, model, [output(rng, kind, model, inverse, stay) for _ in range(3)], [])
        if any(max(width(model, out, F(0), F(5)), abs(float(extremes(model, out, F(0), F(5))[0]))) > 1e-3 for out in made.outputs):
            break
    made.zones = [zone(rng, made) for _ in range(ZONES)]
    return made


def zones_text(problem, chosen):
    text = ""
    for i in chosen:
        z = problem.zones[i]
        text += f'[[zone]]\nname = "z{i}"\ninside = "{z.text}"\n'
        text += f"from = {decimal(z.start)}\n" if z.start else ""
        text += f"until = {decimal(z.end)}\n" if z.end is not None else ""
    return text


def model_text(problem, chosen):
    return problem.model.text(zones_text(problem, chosen))
