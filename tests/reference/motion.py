"""Trajectories in closed form, and the extremes of polynomials along them, with python-flint balls and NumPy guesses.

A trace is a sum of c t^k exp((r + i w) t). The rate r is rational and w is a sum of q sqrt(d) over distinct square-free d, q rational, so equal
exponents are recognised exactly, and the closure of the oscillations is a torus with one angle for each d that occurs: square roots of distinct
square-free numbers are independent over the rationals (Besicovitch 1940).

Extremes are searched in floating point. What is reported is the value at the exact time (or at exact angles of the torus) that was found, in balls:
a proved lower bound of the supremum. That it is the supremum, to about 25 digits, is the search's word; nothing is called wrong on that alone.
"""

import math
from fractions import Fraction as F

import numpy as np
from flint import acb, arb, ctx

ctx.prec = 256
ANGLES = {1: 4096, 2: 96, 3: 28}  # grid points along each angle of the torus
POINTS = 6000  # grid points in time


def ball(q):
    q = F(q)
    return arb(q.numerator) / arb(q.denominator)


def exponent(key):
    """The ball of r + i w."""
    _, rate, waves = key
    if isinstance(rate, Modes):
        return rate.total()
    return acb(ball(rate), sum((ball(q) * arb(d).sqrt() for d, q in waves), arb(0)))


def joined(a, b):
    """The key of a product of two terms."""
    waves = dict(a[2])
    for d, q in b[2]:
        waves[d] = waves.get(d, F(0)) + q
    return (a[0] + b[0], a[1] + b[1], tuple(sorted((d, q) for d, q in waves.items() if q)))


class Modes:
    """A sum of eigenvalues known as balls alone, in the place of a rate: equal if it is the sum of the same ones."""

    def __init__(self, values, indices):
        self.values, self.indices = values, tuple(sorted(indices))

    def __add__(self, other):
        return Modes(self.values, self.indices + (other.indices if isinstance(other, Modes) else ()))

    __radd__ = __add__

    def __eq__(self, other):
        return isinstance(other, Modes) and self.indices == other.indices

    def __hash__(self):
        return hash(self.indices)

    def total(self):
        return sum((self.values[i] for i in self.indices), acb(0))


class Trace:
    """A sum of c t^k exp(mu t), real for real t: the terms by key, the rational value at 0 if it is known, and arrays of floats for guesses."""

    def __init__(self, terms, start=None):
        self.start = start
        self.terms = {key: c for key, c in terms.items() if not (c.real.contains(0) and c.imag.contains(0) and abs(c) < arb("1e-60"))}
        self.exponents = {key: exponent(key) for key in self.terms}
        self.powers = np.array([key[0] for key in self.terms], dtype=float)
        self.mu = np.array([complex(self.exponents[key]) for key in self.terms], dtype=complex)
        self.c = np.array([complex(c) for c in self.terms.values()], dtype=complex)

    def __add__(self, other):
        terms = dict(self.terms)
        for key, c in other.terms.items():
            terms[key] = terms.get(key, acb(0)) + c
        return Trace(terms, both(self, other, lambda a, b: a + b))

    def __mul__(self, other):
        terms = {}
        for a, x in self.terms.items():
            for b, y in other.terms.items():
                key = joined(a, b)
                terms[key] = terms.get(key, acb(0)) + x * y
        return Trace(terms, both(self, other, lambda a, b: a * b))

    def scaled(self, factor):
        """The product with a rational."""
        return Trace({key: c * ball(factor) for key, c in self.terms.items()}, None if self.start is None else self.start * factor)

    def shifted(self, offset):
        return self + constant(offset)

    def at(self, t):
        """The ball of the value at a rational time, or over a ball of times."""
        if not isinstance(t, arb) and t == 0 and self.start is not None:
            return ball(self.start)
        t = t if isinstance(t, arb) else ball(t)
        total = acb(0)
        for key, c in self.terms.items():
            total += c * acb(t) ** key[0] * (self.exponents[key] * t).exp()
        return total.real

    def derivative(self):
        terms = {}
        for (k, rate, waves), c in self.terms.items():
            for key, x in (((k, rate, waves), c * self.exponents[k, rate, waves]), ((k - 1, rate, waves), c * k)):
                terms[key] = terms.get(key, acb(0)) + x
        return Trace({key: c for key, c in terms.items() if key[0] >= 0})

    def floats(self, times, derivative=0):
        """Values, or values of a derivative, in floating point."""
        times = np.asarray(times, dtype=float)
        total = np.zeros(times.shape)
        for k, mu, c in zip(self.powers, self.mu, self.c):
            wave = np.exp(mu * times)
            total += (c * wave * leibniz(times, int(k), mu, derivative)).real
        return total


def both(a, b, operation):
    return None if a.start is None or b.start is None else operation(a.start, b.start)


def leibniz(t, k, mu, n):
    """The n-th derivative of t^k exp(mu t), divided by exp(mu t)."""
    total = 0
    for j in range(min(n, k) + 1):
        total = total + math.comb(n, j) * math.perm(k, j) * t ** (k - j) * mu ** (n - j)
    return total


def constant(q):
    return Trace({(0, F(0), ()): acb(ball(q))} if q else {}, F(q))


class Extreme:
    """A supremum: `value` is a proved lower bound (None: infinite), attained `at` a time or only approached (None)."""

    def __init__(self, value, at, torus=0):
        self.value, self.at, self.torus = value, at, torus
        # whether it is trusted as the supremum
        self.known = True


def greatest(trace, start, end):
    """The supremum over [start, end], end None for all times, of a trace with exact exponents."""
    if end is not None:
        return greatest_in_window(trace, start, end)
    classes = {(key[1], key[0]) for key in trace.terms}
    lead = max(classes, default=(F(0), 0))
    late = Trace({key: c for key, c in trace.terms.items() if (key[1], key[0]) == lead and lead >= (F(0), 0)})
    top = greatest_on_torus(late)
    if lead > (F(0), 0) and top.value > arb("1e-20"):
        return Extreme(None, None)
    early = greatest_in_window(trace, start, start + settled_after(trace, late, lead))
    if lead > (F(0), 0):
        early.known = bool(top.value < arb("-1e-3"))
        return early
    periodic = top.torus == 1 and len(late.terms) == len(trace.terms)
    from_the_start = early.at == 0 and trace.start is not None and trace.start == simple_rational(top.value)
    return early if periodic or from_the_start or early.value > top.value + arb("1e-30") * (1 + abs(top.value)) else top


def settled_after(trace, late, lead):
    """A time after which the trace is its limit, as far as the extremes go; a period if it is periodic."""
    slowest = [float(lead[0] - key[1]) for key in trace.terms if key not in late.terms and key[1] < lead[0]]
    time = min(240.0, 40 / min(slowest)) if slowest else 0.0
    if any(key[1] == lead[0] and key not in late.terms for key in trace.terms):
        time = max(time, 60.0)
    classes, scales = base(late)
    if classes:
        period = 2 * math.pi * scales[0] / math.sqrt(classes[0])
        time += period if len(classes) == 1 else 60.0
    return F(math.ceil(64 * max(time, 4.0)), 64)


def greatest_in_window(trace, start, end):
    """The greatest value found in a bounded window; its ends are always tried."""
    best = None
    for t in [start, end, *peaks(trace, float(start), float(end))]:
        t = min(max(F(t), start), end)
        value = trace.at(t)
        if best is None or value.mid() > best.value.mid():
            best = Extreme(value, t)
    if start < best.at < end:
        t = settled(trace, best.at)
        best = Extreme(trace.at(t), t) if start <= t <= end else best
    return best


def settled(trace, t):
    """Newton steps to a zero of the derivative at the working precision; the exact time that is reached, or t."""
    slope = trace.derivative()
    bend, near = slope.derivative(), ball(t)
    for _ in range(4):
        divisor = bend.at(near)
        if divisor.contains(0):
            return t
        near = (near - slope.at(near) / divisor).mid()
    mantissa, power = near.man_exp()
    reached = F(int(mantissa)) * F(2) ** int(power)
    return reached if abs(reached - t) < F(1, 10**6) else t


def peaks(trace, start, end, count=3):
    """Floats close to the times of the highest local maxima, sharpened."""
    if end <= start or not trace.terms:
        return []
    fastest = float(np.abs(trace.mu.imag).max(initial=0))
    points = int(min(60000, max(POINTS, 10 * fastest * (end - start))))
    times = np.linspace(start, end, points)
    values = trace.floats(times)
    inner = np.flatnonzero((values[1:-1] >= values[:-2]) & (values[1:-1] >= values[2:])) + 1
    chosen = inner[np.argsort(values[inner])[-count:]]
    step = times[1] - times[0]
    return [sharpened(trace, times[i], step) for i in chosen]


def sharpened(trace, t, step):
    """A nearby zero of the derivative: zooming in first, Newton steps last."""
    for _ in range(4):
        grid = np.linspace(max(t - step, 0), t + step, 17)
        t = grid[np.argmax(trace.floats(grid))]
        step /= 6
    for _ in range(5):
        slope, bend = trace.floats([t], 1)[0], trace.floats([t], 2)[0]
        if bend >= 0 or abs(slope / bend) > step:
            break
        t -= slope / bend
    return max(float(t), 0.0)


def base(trace):
    """The square-free numbers that occur in the frequencies, and the common denominators of their factors."""
    classes = sorted({d for key in trace.terms for d, _ in key[2]})
    scales = [math.lcm(*(q.denominator for key in trace.terms for e, q in key[2] if e == d)) for d in classes]
    return classes, scales


def greatest_on_torus(trace):
    """The supremum of a sum of waves of one rate and power over the torus of its phases."""
    if not trace.terms:
        return Extreme(arb(0), None)
    classes, scales = base(trace)
    vectors = np.array([[float(dict(key[2]).get(d, F(0)) * s) for d, s in zip(classes, scales)] for key in trace.terms]).reshape(len(trace.terms), -1)
    if not classes:
        return Extreme(sum(trace.terms.values(), acb(0)).real, None)
    independent = vectors[[tuple(v) > tuple(-v) for v in vectors]]
    if len(independent) == len(classes) == np.linalg.matrix_rank(independent):
        fixed = [c.real for key, c in trace.terms.items() if not key[2]]
        return Extreme(sum((abs(c) for key, c in trace.terms.items() if key[2]), arb(0)) + sum(fixed, arb(0)), None, len(classes))
    axes = [np.linspace(0, 2 * math.pi, ANGLES[len(classes)], endpoint=False)] * len(classes)
    grid = np.stack(np.meshgrid(*axes, indexing="ij"), axis=-1).reshape(-1, len(classes))
    values = np.zeros(len(grid))
    for n, c in zip(vectors, trace.c):
        values += (c * np.exp(1j * (grid @ n))).real
    best = None
    for i in np.argsort(values)[-4:]:
        angles = climbed(vectors, trace.c, grid[i])
        value = sum((c * acb(0, sum((ball(int(k)) * arb(float(a)) for k, a in zip(n, angles)), arb(0))).exp() for n, c in zip(vectors, trace.terms.values())), acb(0)).real
        if best is None or value.mid() > best.mid():
            best = value
    return Extreme(best, None, len(classes))


def climbed(vectors, c, angles):
    """A maximum of the trigonometric polynomial near these angles: Newton steps, cut to a gradient step where the form is not definite."""
    value = lambda a: float((c * np.exp(1j * (vectors @ a))).real.sum())
    for _ in range(60):
        wave = c * np.exp(1j * (vectors @ angles))
        gradient = (1j * wave) .real @ vectors
        hessian = -(vectors.T * wave.real) @ vectors
        lowest = np.linalg.eigvalsh(hessian)
        if lowest[-1] < -1e-9:
            step = -np.linalg.solve(hessian, gradient)
        else:
            step = gradient / (1e-9 + np.abs(lowest).max())
        while value(angles + step) < value(angles) - 1e-13 and np.abs(step).max() > 1e-17:
            step = step / 2
        angles = angles + step
        if np.abs(step).max() < 1e-15:
            break
    return angles


def simple_rational(value, bottom=10000):
    """The rational with a small denominator that the middle of a ball is to 45 digits, or None."""
    middle = F(value.mid().str(60, radius=False))
    if abs(middle) > 10**9:
        return None
    near = middle.limit_denominator(bottom)
    return near if abs(middle - near) < F(1, 10**45) * (1 + abs(near)) else None
