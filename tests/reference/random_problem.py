"""Random systems of at most six states with their motion in closed form, and zones at known distances from the extremes.

A kind fixes blocks of the real Jordan form B; the system is x' = P B P^-1 (x - e) with a random integer P of determinant 1 and a rest point e. The kind
`dense` is a random integer matrix instead, its motion from the eigenvalues that Arb isolates.
"""

import random
from dataclasses import dataclass, field
from fractions import Fraction as F

from flint import acb, acb_mat, arb, arb_mat

from motion import Modes, Trace, ball, constant, greatest, simple_rational

KINDS = [
    "stable real", "stable complex", "stable mixed", "one frequency", "two frequencies", "three frequencies", "commensurate", "damped commensurate",
    "defective real", "defective complex", "growing", "zero eigenvalues", "mixed", "dense",
]
DISTANCES = [F(1, 10), F(1, 10**3), F(1, 10**6), F(1, 10**9)]
ZONES = 10


@dataclass
class Problem:
    kind: str
    text: str
    # the matrix of x, 1 and its start
    a: list
    start: list
    states: list
    zones: list = field(default_factory=list)


@dataclass
class Zone:
    """A zone as text and as a tree: ("atom", trace, relation) with the trace compared with 0, ("and", ...), ("or", ...), ("not", zone)."""

    text: str
    tree: tuple
    start: F
    end: F | None
    label: str
    expected: str | None
    extreme: object = None
    # for a single comparison p >= level or p <= level: the trace of the distance, positive outside
    distance: Trace | None = None
    level: F | None = None


def fraction(rng, low, high, bottoms=(1, 1, 2, 3)):
    return F(rng.randint(low, high), rng.choice(bottoms))


# Blocks: a matrix, and from its start the traces of its coordinates.

def real_block(rate, size):
    """A Jordan block of a rational eigenvalue."""
    a = [[rate if i == j else F(int(j == i + 1)) for j in range(size)] for i in range(size)]

    def motion(start):
        rows, factorial = [], [1, 1, 2, 6, 24, 120, 720]
        for i in range(size):
            rows.append(Trace({(k, rate, ()): acb(ball(start[i + k] / factorial[k])) for k in range(size - i) if start[i + k]}, start[i]))
        return rows

    return a, motion


def waves(d, q):
    return ((d, q),)


def wave_block(rate, d, q, size=1):
    """Coordinates (u, v) with u' = rate u + q d v, v' = -q u + rate v: the frequency is q sqrt(d); `size` of them in a Jordan chain."""
    n = 2 * size
    a = [[F(0)] * n for _ in range(n)]
    for i in range(size):
        a[2 * i][2 * i] = a[2 * i + 1][2 * i + 1] = rate
        a[2 * i][2 * i + 1], a[2 * i + 1][2 * i] = q * d, -q
        if i + 1 < size:
            a[2 * i][2 * i + 2] = a[2 * i + 1][2 * i + 3] = F(1)

    def wave(power, c, s):
        """t^power exp(rate t) (c cos + s sin)."""
        return {(power, rate, waves(d, q)): acb(c, -s) / 2, (power, rate, waves(d, -q)): acb(c, s) / 2}

    def motion(start):
        root, rows = arb(d).sqrt(), []
        for i in range(size):
            u, v = {}, {}
            for k in range(size - i):  # a chain has at most two links: 1 / k! is 1
                x, y = ball(start[2 * (i + k)]), ball(start[2 * (i + k) + 1])
                u |= wave(k, x, y * root)
                v |= wave(k, y, -x / root)
            rows += [Trace(u, start[2 * i]), Trace(v, start[2 * i + 1])]
        return rows

    return a, motion


def blocks(rng, kind):
    slow = lambda: -fraction(rng, 1, 4, (1, 2, 3, 5))
    q = lambda: fraction(rng, 1, 3, (1, 1, 2))
    square_free = [1, 2, 3, 5, 6, 7]
    if kind == "stable real":
        return [real_block(r, 1) for r in {slow() for _ in range(rng.randint(1, 6))}]
    if kind == "stable complex":
        return [wave_block(slow(), rng.choice(square_free), q()) for _ in range(rng.randint(1, 3))]
    if kind == "stable mixed":
        return [wave_block(slow(), rng.choice(square_free), q()) for _ in range(rng.randint(1, 2))] + [real_block(slow(), 1) for _ in range(rng.randint(0, 2))]
    if kind == "one frequency":
        return [wave_block(F(0), rng.choice(square_free), q())]
    if kind == "two frequencies":
        return [wave_block(F(0), d, q()) for d in rng.sample(square_free, 2)]
    if kind == "three frequencies":
        return [wave_block(F(0), d, q()) for d in rng.sample(square_free, 3)]
    if kind in ("commensurate", "damped commensurate"):
        rate = F(0) if kind == "commensurate" else slow()
        d, ratio = rng.choice(square_free), rng.choice([(1, 2), (2, 3), (1, 3), (1, 1), (1, 2, 3)])
        unit = F(1, rng.choice([1, 2]))
        return [wave_block(rate, d, unit * k) for k in ratio]
    if kind == "defective real":
        return [real_block(slow(), rng.randint(2, 4))] + ([real_block(slow(), 1)] if rng.random() < 0.5 else [])
    if kind == "defective complex":
        rate = slow() if rng.random() < 0.6 else F(0)
        return [wave_block(rate, rng.choice(square_free), q(), 2)] + ([real_block(slow(), 1)] if rng.random() < 0.4 else [])
    if kind == "growing":
        up = fraction(rng, 1, 2, (2, 3, 5))
        first = real_block(up, rng.randint(1, 2)) if rng.random() < 0.5 else wave_block(up, rng.choice(square_free), q())
        return [first, wave_block(slow(), rng.choice(square_free), q()), real_block(slow(), 1)][: rng.randint(1, 3)]
    if kind == "zero eigenvalues":
        rest = [wave_block(rng.choice([F(0), slow()]), rng.choice(square_free), q()), real_block(slow(), 1)]
        return [real_block(F(0), rng.randint(1, 3))] + rest[: rng.randint(0, 2)]
    rest = [wave_block(F(0), rng.choice(square_free), q()), wave_block(slow(), rng.choice(square_free), q()), real_block(slow(), rng.randint(1, 2)), real_block(F(0), 1)]
    return rng.sample(rest, rng.randint(2, 3))


def unimodular(rng, n):
    """An integer matrix of determinant 1 and its inverse."""
    p = [[F(int(i == j)) for j in range(n)] for i in range(n)]
    inverse = [row[:] for row in p]
    for _ in range(rng.choice([0, n, 2 * n])):
        i, j = rng.sample(range(n), 2) if n > 1 else (0, 0)
        if i != j:
            s = rng.choice([-1, 1])
            p[i] = [x + s * y for x, y in zip(p[i], p[j])]
            for row in inverse:
                row[j] -= s * row[i]
    return p, inverse


def product(a, b):
    return [[sum((x * y for x, y in zip(row, column)), F(0)) for column in zip(*b)] for row in a]


def structured(rng, kind):
    """The matrix, the start relative to the rest point, the traces of the states relative to it."""
    parts = blocks(rng, kind)
    n = sum(len(a) for a, _ in parts)
    b, start, rows = [[F(0)] * n for _ in range(n)], [], []
    for a, motion in parts:
        at = len(start)
        for i, row in enumerate(a):
            b[at + i][at : at + len(row)] = row
        own = [fraction(rng, -4, 4, (1, 1, 2, 3, 5)) for _ in a]
        if len(own) == 2 and rng.random() < 0.5:
            own = rng.choice([[F(3, 5), F(4, 5)], [F(1), F(0)], [F(0), F(1)], [F(1, 3), F(2, 3)]])
        start += own
        rows += motion(own)
    p, inverse = unimodular(rng, n)
    states = []
    for row in p:
        total = constant(0)
        for factor, trace in zip(row, rows):
            if factor:
                total += trace.scaled(factor)
        states.append(total)
    return product(product(p, b), inverse), [sum((x * y for x, y in zip(row, start)), F(0)) for row in p], states


def dense(rng):
    while True:
        n = rng.randint(2, 6)
        a = [[F(rng.randint(-3, 3)) for _ in range(n)] for _ in range(n)]
        shift = rng.choice([0, 0, 3, 6])
        for i in range(n):
            a[i][i] -= shift
        start = [fraction(rng, -3, 3) for _ in range(n)]
        matrix = acb_mat([[acb(ball(x)) for x in row] for row in a])
        try:
            values, right = matrix.eig(right=True)
            weights = right.solve(acb_mat([[acb(ball(s))] for s in start]))
        except (ValueError, ZeroDivisionError):
            continue
        rows = [Trace({(0, Modes(values, [j]), ()): right[i, j] * weights[j, 0] for j in range(n)}, start[i]) for i in range(n)]
        if all(abs(c) < arb("1e9") for row in rows for c in row.terms.values()):
            return a, start, rows


def system(rng, kind):
    a, start, states = dense(rng) if kind == "dense" else structured(rng, kind)
    n = len(a)
    rest = [fraction(rng, -2, 2) if rng.random() < 0.3 else F(0) for _ in range(n)]
    offsets = [-sum((x * e for x, e in zip(row, rest)), F(0)) for row in a]
    text = ""
    for i, offset in enumerate(offsets):
        terms = [f"({a[i][j]})*x{j}" for j in range(n) if a[i][j]] + ([f"({offset})"] if offset else [])
        text += f'[state.x{i}]\nstart = "{start[i] + rest[i]}"\nrate = "{" + ".join(terms) or "0"}"\n'
    whole = [[*row, offset] for row, offset in zip(a, offsets)] + [[F(0)] * (n + 1)]
    return Problem(kind, text, whole, [s + e for s, e in zip(start, rest)] + [F(1)], [s.shifted(e) for s, e in zip(states, rest)])


def is_consistent(problem, t=F(5, 7)):
    """Whether the closed form meets Arb's matrix exponential."""
    matrix = arb_mat([[ball(x * t) for x in row] for row in problem.a]).exp()
    values = matrix * arb_mat([[ball(s)] for s in problem.start])
    return all(s.at(t).overlaps(values[i, 0]) for i, s in enumerate(problem.states))


def polynomial(rng, problem):
    """Text and trace of a random polynomial of the states, of degree one mostly."""
    n = len(problem.states)
    wide = max(len(s.terms) for s in problem.states)
    degree = rng.choices([1, 2, 3], [5, 3 if wide <= 5 else 1, 2 if wide <= 5 else 0])[0]
    text, trace = [], constant(0)
    for _ in range(rng.randint(1, 3)):
        c = F(rng.choice([-2, -1, 1, 1, 2, 3]), rng.choice([1, 1, 2, 3]))
        factors = sorted(rng.randrange(n) for _ in range(rng.choice([degree, rng.randint(1, degree)])))
        part = constant(1)
        for i in factors:
            part = part * problem.states[i]
        trace += part.scaled(c)
        text.append(f"({c})*" + "*".join(f"x{i}" for i in factors))
    return " + ".join(text), trace


def window(rng):
    draw = rng.random()
    if draw < 0.6:
        return F(0), None
    start = F(0) if draw < 0.85 else fraction(rng, 1, 9, (1, 2, 4))
    return start, None if draw > 0.95 else start + fraction(rng, 1, 30, (1, 2, 4))


def size(trace, start):
    values = [abs(float(trace.at(start + F(k, 3)).mid())) for k in range(6)]
    return max(values)


def rounded(value, unit):
    """A rational with few digits within a hundredth of `unit` of a ball's middle."""
    digits = 2
    while F(1, 10**digits) > unit:
        digits += 1
    scale = 10 ** (digits + 2)
    return F(round(F(value.mid().str(60, radius=False)) * scale), scale)


def zone(rng, problem):
    """A zone near the extreme of a random polynomial, with what is expected of it."""
    start, end = window(rng)
    text, p = polynomial(rng, problem)
    if problem.kind == "dense" and end is None:
        end = start + fraction(rng, 4, 40)
    upward = rng.random() < 0.5
    seen = p if upward else p.scaled(-1)
    extreme = greatest(seen, start, end)
    if extreme.value is None:
        return unbounded(rng, text, seen, upward, start, end)
    exact = simple_rational(extreme.value)
    if exact is not None and extreme.at is not None and extreme.at in (start, end) and not (seen.at(extreme.at) - ball(exact)).contains(0):
        # A value at an end of the window that is only close to a simple number, such as exp(-1000).
        exact = None
    if exact is not None and rng.random() < 0.5:
        return touching(rng, text, seen, upward, start, end, extreme, exact)
    scale = max(F(abs(float(extreme.value.mid()))).limit_denominator(10**6), F(size(p, start)).limit_denominator(10**6)) or F(1)
    distance, side = rng.choice(DISTANCES), rng.choice([1, 1, -1])
    level = rounded(extreme.value, distance * scale) + side * distance * scale
    level = F(round(level * 10**16), 10**16)
    label = f"{'above' if side > 0 else 'below'} {float(distance):.0e}"
    made = Border(text, seen, upward, level)
    expected = ("clear" if side > 0 else "enters") if extreme.known else None
    return dressed(rng, problem, made, start, end, extreme, label, expected)


class Border:
    """p >= level, or p <= level for the negated `seen`, with the trace of p - level or level - p."""

    def __init__(self, text, seen, upward, level):
        self.text, self.upward = text, upward
        self.over = seen.shifted(-level)  # >= 0 inside
        self.border = level
        self.level = level if upward else -level

    def comparison(self, strict=False):
        return f"{self.text} {'>' if self.upward else '<'}{'' if strict else '='} ({self.level})"

    def atom(self, strict=False):
        return ("atom", self.over, ">" if strict else ">=")


def dressed(rng, problem, made, start, end, extreme, label, expected):
    """The comparison alone, or in a formula that is true and false together with it near the extreme."""
    distance = made.over.scaled(-1)
    strict = rng.random() < 0.3
    plain = (made.comparison(strict), made.atom(strict))
    form = rng.choices(["plain", "equal", "not", "or", "and", "band"], [60, 8, 8, 8, 10, 6])[0]
    if form == "equal":
        text, tree, distance = f"{made.text} = ({made.level})", ("atom", made.over, "="), None
        # below the supremum the level is passed, if there is a value on its other side
        if expected == "enters" and not made.over.at(start) < 0:
            expected = None
    elif form == "not":
        other = "<" if made.upward else ">"
        text, tree = f"not ({made.text} {other}{'=' if strict else ''} ({made.level}))", plain[1]
    elif form == "band":
        wide = F(1) if made.upward else F(-1)
        text = f"{made.comparison(strict)} and {made.text} {'<' if made.upward else '>'}= ({made.level + wide})"
        tree, distance = ("and", plain[1], ("atom", made.over.scaled(-1).shifted(1), ">=")), None
        if expected == "enters" and not made.over.at(start) < 0:
            expected = None
    elif form in ("or", "and"):
        text, tree, expected = beside(rng, problem, plain, form, start, end, extreme, expected)
        distance = None
    else:
        text, tree = plain
    return Zone(text, tree, start, end, label, expected, extreme, distance, made.border)


def beside(rng, problem, plain, form, start, end, extreme, expected):
    """With a second comparison: one that is far from ever true (or), or one that holds with room at the extreme (and)."""
    i = rng.randrange(len(problem.states))
    x = problem.states[i]
    if form == "or":
        top = greatest(x, start, end) if problem.kind != "dense" or end is not None else Trace({})
        if top.value is None or not top.known:
            return *plain, expected
        value = float(top.value.mid())
        level = F(round(value + abs(value) / 1000)) + 2
        return f"{plain[0]} or x{i} >= {level}", ("or", plain[1], ("atom", x.shifted(-level), ">=")), expected
    if extreme.at is None:
        return *plain, expected
    # With room for the rounding of great values.
    value = float(x.at(extreme.at).mid())
    level = F(round(value - abs(value) / 1000)) - 2
    return f"{plain[0]} and x{i} > ({level})", ("and", plain[1], ("atom", x.shifted(-level), ">")), expected


def touching(rng, text, seen, upward, start, end, extreme, level):
    """A zone whose border is exactly the supremum."""
    made = Border(text, seen, upward, level)
    relation = rng.choice([">=", ">=", ">", "="])
    shown = f"{text} = ({made.level})" if relation == "=" else made.comparison(relation == ">")
    if relation == ">":
        expected = "clear"
    elif extreme.at is not None:
        expected = "enters"
    else:
        expected = "inseparable" if extreme.torus > 1 and relation == ">=" else None
    kind = "limit" if extreme.at is None and not extreme.torus else ("torus" if extreme.at is None else "time" if extreme.at else "start")
    return Zone(shown, ("atom", made.over, relation), start, end, f"touch {kind}", expected, extreme, made.over.scaled(-1), made.border)


def unbounded(rng, text, seen, upward, start, end):
    """A zone that a growing motion runs into at last."""
    value = seen.at(start + fraction(rng, 1, 12))
    level = rounded(value, F(1, 100)) + rng.choice([0, 1, 10, 1000])
    made = Border(text, seen, upward, level)
    return Zone(made.comparison(), made.atom(), start, end, "unbounded", "enters", None, made.over.scaled(-1), made.border)


def problem(seed, number):
    rng = random.Random(f"{seed}/{number}")
    kind = KINDS[number % len(KINDS)]
    made = system(rng, kind)
    made.zones = [zone(rng, made) for _ in range(ZONES)]
    return made


def model(problem, zones):
    """The model file with these zones, by position."""
    text = problem.text
    for i in zones:
        z = problem.zones[i]
        text += f'[[zone]]\nname = "z{i}"\ninside = "{z.text}"\n'
        text += f'from = "{z.start}"\n' if z.start else ""
        text += f'until = "{z.end}"\n' if z.end is not None else ""
    return text
