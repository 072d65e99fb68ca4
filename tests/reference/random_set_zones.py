"""Zones of random problems at known distances from the worst case.

Worst cases are those of `worst_case.py`, of a corner of two half-spaces those of `corner.py`. Each problem is made from the seed and its number alone.
"""

import math
import random
from dataclasses import dataclass, field
from fractions import Fraction as F

import corner
from random_problem import product
from random_sets import KINDS, short, system
from set_model import Model, affine, decimal

DISTANCES = [F(1, 10**2), F(1, 10**4), F(1, 10**6)]
LOOSE = [F(1, 10), F(1, 10**2), F(1, 10**4)]  # with uncertain constants
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
        loose = problem.kind == "uncertain"
        side, distance = rng.choice([1, -1]), rng.choice(LOOSE if loose else DISTANCES)
        form = rng.choices(["half-space", "two-sided", "or", "and", "equal"], [45, 18, 12, 0 if loose else 18, 7])[0]
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
