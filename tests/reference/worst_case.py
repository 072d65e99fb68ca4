"""The worst case of an output over a set of starts and bounded disturbances, and where it is.

    S(t) = sup h x(t) = d(t) + sum |f_j(t)| + sup over the set of starts + sum integral_0^t |q_k|

d the drift (centre, offset, known inputs, midpoints of disturbances), f_j = h exp(At) g_j, q_k = w_k h exp(A tau) b_k: sums of exponentials. Ellipsoid of
starts: sqrt(f' Q f), f_i = h exp(At) e_i. Hull of points: the greatest of h exp(At) p. Each kink of S is convex, so maxima are smooth.

How sure the answer is. The reported value is S, or a limit of S, in balls with signs of q_k frozen on the pieces found: **a proved lower bound** of the supremum,
whatever was overlooked. That it is the supremum rests on a cover in floating point: on a cell of width w every term lies below its chord by at
most w^2/8 sup |second derivative| (|f| and the norm are convex in f; the integral has the derivative |q|), so S <= max(S at the ends) + w^2/8 K. Cells are cut
until that is at most `TOLERANCE` above the best value, K being twice the greatest sampled value at the ends of the cell plus its width times the third derivative there.
"""

import math
from fractions import Fraction as F

import numpy as np
from flint import acb, arb

from exponential_sum import CHUNK, Sum, Waves, ball, floats, in_chunks

TOLERANCE = 1e-10  # relative to the scale of S
STEPS = 20  # grid points to one radian of the fastest term alive
DECADES = 40  # terms below exp(-40) are dead
MOST = 4000000  # grid points in one stretch


class Extreme:
    """A supremum: `value` is a proved lower bound, None if infinite; attained `at` a rational time, or approached (None). `slack` bounds what may lie above."""

    def __init__(self, value, at=None, slack=0.0):
        self.value, self.at, self.slack = value, at, slack

    def __float__(self):
        return math.inf if self.value is None else float(self.value.mid())


def grid(roots, start, end):
    """Times fine enough for the terms that are alive at each: [(end of life, rate)]."""
    lives = sorted(((DECADES + 8) / -r.float.real if r.growth < 0 else math.inf, abs(r.float)) for r in roots)
    points, t = [np.array([start])], start
    while t < end:
        alive = [(life, rate) for life, rate in lives if life > t]
        stop = min([end] + [life for life, _ in alive[:1]]) if alive else end
        fastest = max([rate for _, rate in alive], default=0.0)
        count = int(min(MOST, max(24, math.ceil(STEPS * fastest * (stop - t)))))
        points.append(np.linspace(t, stop, count + 1)[1:])
        t = stop
    return np.concatenate(points)


class Integral:
    """t -> integral_0^t |q|, piece by piece between the zeros of q."""

    def __init__(self, q, times):
        self.q, self.primitive = q, q.integral()
        self.zeros = np.array([0.0, *zeros(q, times)])
        self.at_zeros = floats(self.primitive, self.zeros)
        self.balls = []
        self.before = np.concatenate([[0.0], np.cumsum(np.abs(np.diff(self.at_zeros)))])

    def values(self, waves):
        piece = np.searchsorted(self.zeros, waves.times, side="right") - 1
        return self.before[piece] + np.abs(waves.values(self.primitive) - self.at_zeros[piece])

    def ball(self, t):
        """A proved lower bound at a rational time, None for the limit: whatever the pieces are, their sum is below."""
        piece = len(self.zeros) - 1 if t is None else max(0, int(np.searchsorted(self.zeros, float(t), side="left")) - 1)
        while len(self.balls) <= piece:
            z = F(self.zeros[len(self.balls)])
            value = self.primitive.at(z)
            self.balls.append((value, self.balls[-1][1] + abs(value - self.balls[-1][0]) if self.balls else arb(0)))
        value, before = self.balls[piece]
        return before + abs((arb(0) if t is None else self.primitive.at(t)) - value)


def zeros(q, times):
    """The sign changes of q in (0, last time], in floating point; pairs between neighbouring grid points are looked for."""
    values = floats(q, times)
    size = np.abs(values)
    dips = np.flatnonzero((size[1:-1] <= size[:-2]) & (size[1:-1] <= size[2:]) & (values[1:-1] * values[:-2] > 0) & (values[1:-1] * values[2:] > 0)) + 1
    if len(dips):
        extra = np.concatenate([np.linspace(times[i - 1], times[i + 1], 35)[1:-1] for i in dips[:3000]])
        times = np.unique(np.concatenate([times, extra]))
        values = floats(q, times)
    signs = np.sign(values)
    keep = signs != 0
    times, signs = times[keep], signs[keep]
    changes = np.flatnonzero(signs[1:] != signs[:-1])
    low, high, left = times[changes], times[changes + 1], signs[changes]
    for _ in range(52):
        middle = (low + high) / 2
        same = np.sign(floats(q, middle)) == left
        low, high = np.where(same, middle, low), np.where(same, high, middle)
    return high[high > 0]


class Support:
    """S for one output. `boxes` and `inputs` are already scaled by their half widths; `ellipsoid` = (shape Q, [f_i]); `hull` = [h exp(At) p]."""

    def __init__(self, drift, boxes=(), inputs=(), ellipsoid=None, hull=()):
        self.all_boxes, self.all_inputs = list(boxes), list(inputs)  # with those that are 0
        self.drift, self.boxes, self.inputs = drift, [f for f in boxes if f.terms], [q for q in inputs if q.terms]
        self.ellipsoid, self.hull = ellipsoid, list(hull)
        self.integrals = None
        self.start_sums = [*self.boxes, *(ellipsoid[1] if ellipsoid else []), *self.hull]
        self.sums = [drift, *self.start_sums, *self.inputs]

    def roots(self):
        return {root for f in self.sums for _, root in f.terms}

    def horizon(self):
        """When all that decays is dead."""
        lives = [(DECADES + 8 * k) / -root.float.real for f in self.sums for k, root in f.terms if root.growth < 0]
        return max(lives, default=1.0)

    def prepared(self, end):
        """With the zeros of the inputs up to a time."""
        times = grid(self.roots(), 0.0, end)
        self.integrals = [Integral(q, times) for q in self.inputs]
        return times

    def over_starts(self, waves):
        total = sum((np.abs(waves.values(f)) for f in self.boxes), np.zeros(waves.times.shape))
        if self.ellipsoid:
            shape, sums = self.ellipsoid
            f = np.stack([waves.values(s) for s in sums])
            total += np.sqrt(np.maximum(0, np.einsum("it,ij,jt->t", f, np.array([[float(x) for x in row] for row in shape]), f)))
        if self.hull:
            total += np.max([waves.values(s) for s in self.hull], axis=0)
        return total

    def floats(self, times):
        return in_chunks(self.floats_together, times)

    def floats_together(self, times):
        waves = Waves(times)
        return waves.values(self.drift) + self.over_starts(waves) + sum((i.values(waves) for i in self.integrals), np.zeros(waves.times.shape))

    def bends(self, times, widths):
        """Above the second derivatives of the parts on the cells that begin or end at these times."""
        total = np.zeros(len(times))
        second = [f.derivative().derivative() for f in (self.drift, *self.start_sums)] + [q.derivative() for q in self.inputs]
        both = [(f, f.derivative()) for f in second]
        for i in range(0, len(times), CHUNK):
            part = slice(i, i + CHUNK)
            waves = Waves(times[part])
            for f, slope in both:
                total[part] += 2 * np.abs(waves.values(f)) + widths[part] * np.abs(waves.values(slope))
        if self.ellipsoid:
            total *= max(1.0, math.sqrt(max(float(row[i]) for i, row in enumerate(self.ellipsoid[0]))))
        return total

    def ball(self, t):
        """A proved lower bound of S at a rational time."""
        total = self.drift.at(t) + sum((abs(f.at(t)) for f in self.boxes), arb(0))
        if self.ellipsoid:
            shape, sums = self.ellipsoid
            f = [s.at(t) for s in sums]
            square = sum((ball(shape[i][j]) * f[i] * f[j] for i in range(len(f)) for j in range(len(f)) if shape[i][j]), arb(0))
            total += square.sqrt() if square > 0 else arb(0)
        if self.hull:
            total += max((s.at(t) for s in self.hull), key=lambda x: float(x.mid()))
        return total + sum((i.ball(F(t)) for i in self.integrals), arb(0))

    def greatest(self, start=F(0), end=None):
        """The supremum over [start, end], for all time if end is None."""
        start = F(start)
        if end is not None:
            return self.early(start, F(end))
        if any(root.growth >= 0 for q in self.inputs for _, root in q.terms):
            return Extreme(None)
        growing = self.growing_terms()
        if growing:
            return self.growing(start, growing)
        late = self.late()
        early = self.early(start, start + F(math.ceil(self.horizon())) + self.period())
        scale = float(max(abs(early.value), abs(late.value)).mid())
        if self.is_periodic() and abs(float(early.value - late.value)) <= 1e-9 * scale:
            return Extreme(max(early.value, late.value, key=float), early.at, early.slack)
        return early if float(early.value - late.value) > 1e-12 * scale else Extreme(late.value, None, early.slack)

    def growing(self, start, keys):
        """Growth of one sign alone is told from a late value."""
        rate = max(root.float.real for _, root in keys)
        t = F(math.ceil(40 / rate if rate > 0 else 1e6))
        self.prepared(float(self.horizon()))
        if self.ball(2 * t) - self.ball(t) > abs(self.ball(t)) / 1000:
            return Extreme(None)
        return self.early(start, start + F(math.ceil(max(self.horizon(), 100))))

    def growing_terms(self):
        return [key for f in self.sums for key in f.growing() if key[1].growth > 0 or key[0] > 0]

    def is_periodic(self):
        return not self.inputs and all(root.growth == 0 for f in self.sums for _, root in f.terms) and len(self.classes()[0]) <= 1

    def classes(self):
        """Square-free numbers d of the undamped frequencies q sqrt(d), the units of the q, and the multiples by root."""
        parts = {}
        for root in self.roots():
            if root.growth == 0 and root.square:
                parts[root] = square_free(root.square)
        classes = sorted({d for d, _ in parts.values()})
        units = [F(math.gcd(*(int(q * common(parts, d)) for e, q in parts.values() if e == d)), common(parts, d)) for d in classes]
        return classes, units, {root: (classes.index(d), int(q / units[classes.index(d)])) for root, (d, q) in parts.items()}

    def period(self):
        classes, units, _ = self.classes()
        return F(math.ceil(sum(2 * math.pi / (float(u) * math.sqrt(d)) for d, u in zip(classes, units)))) * (1 if len(classes) < 2 else 10)

    def late(self):
        """The supremum of the limit set: what is left when all that decays is dead, over the torus of the phases."""
        self.prepared(float(self.horizon()))
        norm = sum((i.ball(None) for i in self.integrals), arb(0))
        classes, _, multiples = self.classes()
        undamped = lambda f: Sum({key: c for key, c in f.terms.items() if key[1].growth == 0})
        rest = Support(undamped(self.drift), [undamped(f) for f in self.boxes], (), self.ellipsoid and (self.ellipsoid[0], [undamped(f) for f in self.ellipsoid[1]]), [undamped(f) for f in self.hull])
        rest.integrals = []
        return Extreme(norm + rest.on_torus(len(classes), multiples))

    def on_torus(self, r, multiples):
        if r == 0:
            return self.ball(F(0))
        count = {1: 8192, 2: 360, 3: 60}[r]
        axes = [np.linspace(0, 2 * math.pi, count, endpoint=False)] * r
        points = np.stack(np.meshgrid(*axes, indexing="ij"), axis=-1).reshape(-1, r)
        values = self.at_angles(points, multiples)
        best = None
        for i in np.argsort(values)[-6:]:
            centre, width = points[i], 2 * math.pi / count
            offsets = np.stack(np.meshgrid(*[np.linspace(-1, 1, 17 if r < 3 else 9)] * r, indexing="ij"), axis=-1).reshape(-1, r)
            for _ in range(18):
                near = centre + offsets * width
                centre = near[np.argmax(self.at_angles(near, multiples))]
                width *= 0.3
            value = self.ball_at_angles(centre, multiples)
            best = value if best is None or value.mid() > best.mid() else best
        return best

    def at_angles(self, points, multiples):
        return self.over_starts(waves := Torus(points, multiples)) + waves.values(self.drift)

    def ball_at_angles(self, angles, multiples):
        turn = {root: acb(0, arb(F(angles[i]).numerator) / arb(F(angles[i]).denominator) * m).exp() for root, (i, m) in multiples.items()}
        at = lambda f: Sum({(0, ZERO): acb(sum(((c * turn.get(root, acb(1))).real for (_, root), c in f.terms.items()), arb(0)))})
        fixed = Support(at(self.drift), [at(f) for f in self.boxes], (), self.ellipsoid and (self.ellipsoid[0], [at(f) for f in self.ellipsoid[1]]), [at(f) for f in self.hull])
        fixed.integrals = []
        return fixed.ball(F(0))

    def early(self, start, end):
        """The supremum over a bounded window: the cover of the module's text."""
        self.prepared(float(end))
        times = grid(self.roots(), float(start), float(end))
        if len(times) == 1:
            return Extreme(self.ball(start), start)
        a, b = times[:-1], times[1:]
        values = self.floats(times)
        va, vb = values[:-1], values[1:]
        widths = b - a
        ends = self.bends(times, np.concatenate([widths, widths[-1:]]))
        bends = np.maximum(ends[:-1], ends[1:])
        top, best = values.max(), times[values.argmax()]
        width, slack = float(np.max(widths)), 0.0
        scale = max(np.abs(values).max(), 1e-300)
        for _ in range(14):
            over = np.maximum(va, vb) + bends * (b - a) ** 2 / 8
            slack = max(0.0, float(over.max() - top)) if len(over) else slack
            keep = over > top + TOLERANCE * scale
            if not keep.any() or keep.sum() > 400000:
                break
            a, b, bends = a[keep], b[keep], bends[keep]
            width = float(np.max(b - a))
            cuts = a[:, None] + (b - a)[:, None] * np.linspace(0, 1, 9)[None, :]
            fine = self.floats(cuts.ravel()).reshape(cuts.shape)
            if fine.max() > top:
                top, best = fine.max(), cuts.ravel()[fine.argmax()]
            a, b, va, vb = cuts[:, :-1].ravel(), cuts[:, 1:].ravel(), fine[:, :-1].ravel(), fine[:, 1:].ravel()
            bends = np.repeat(bends, 8)
        return self.sharpened(start, end, float(best), width, slack)

    def sharpened(self, start, end, best, width, slack):
        """The value in balls at the best time, found more closely, or at an end of the window."""
        while width > 1e-9 * (1e-3 + best):
            near = np.clip(best + width * np.linspace(-1, 1, 21), float(start), float(end))
            best, width = float(near[np.argmax(self.floats(near))]), width / 4
        inner = min(max(F(best), start), end)
        return max((Extreme(self.ball(t), t, slack) for t in (inner, start, end)), key=float)


class Torus:
    """Like Waves, over angles."""

    def __init__(self, points, multiples):
        self.times = points[:, 0]
        self.waves = {root: np.exp(1j * m * points[:, i]) for root, (i, m) in multiples.items()}

    def values(self, f):
        total = np.zeros(len(self.times))
        for (_, root), c in f.terms.items():
            total += (complex(c) * self.waves[root]).real if root in self.waves else complex(c).real
        return total


class Zero:
    """The root 0, for constants."""

    mu, square, float, is_real, growth = acb(0), F(0), 0j, True, 0


ZERO = Zero()


def common(parts, d):
    return math.lcm(*(q.denominator for e, q in parts.values() if e == d))


def square_free(q):
    """(d, s) with sqrt(q) = s sqrt(d), d square-free."""
    n, d, s, p = q.numerator * q.denominator, 1, 1, 2
    while p * p <= n:
        while n % (p * p) == 0:
            n, s = n // (p * p), s * p
        if n % p == 0:
            n, d = n // p, d * p
        p += 1
    return d * n, F(s, q.denominator)


def least(support):
    """The support of -h."""
    turned = Support(support.drift.scaled(-1), support.boxes, support.inputs, support.ellipsoid, [f.scaled(-1) for f in support.hull])
    return turned
