"""A linear system with a set of starts, known drives and bounded disturbances: exact data, the model file, and the worst case of an affine output.

    x' = A x + c + B u(t) + E w(t),    w_k(t) in [lo, hi],    x(0) in a box, an ellipsoid or the hull of points

Known drives and the constant 1 become states; the midpoint of a range joins the constant.
"""

from dataclasses import dataclass, field
from fractions import Fraction as F
from itertools import product

from flint import acb

from exponential_sum import Sum, System, ball
from worst_case import ZERO, Extreme, Support

SMALL = 20  # states with which the constant 1 is one of them, so that its cancellations are exact


@dataclass
class Drive:
    """signal = sum of parts: ("const", a), ("exp", a, r), ("sin", a, w), ("cos", a, w), all rational."""

    name: str
    parts: list

    def text(self):
        words = {"const": lambda a: f"({decimal(a)})", "exp": lambda a, r: f"({decimal(a)})*exp(({decimal(r)})*t)"}
        wave = lambda kind: lambda a, w: f"({decimal(a)})*{kind}(({decimal(w)})*t)"
        return " + ".join({**words, "sin": wave("sin"), "cos": wave("cos")}[kind](*rest) for kind, *rest in self.parts)

    def states(self):
        """Blocks (matrix, start, row of the signal), one for each part."""
        for kind, a, *rest in self.parts:
            if kind == "const":
                yield [[F(0)]], [F(1)], [F(a)]
            elif kind == "exp":
                yield [[F(rest[0])]], [F(1)], [F(a)]
            else:
                w = F(rest[0])
                yield [[F(0), w], [-w, F(0)]], [F(0), F(1)], [F(a), F(0)] if kind == "sin" else [F(0), F(a)]


@dataclass
class Model:
    a: list
    offset: list
    # one pair (lo, hi) a state; or None with `ellipsoid` = (centre, shape) or `points`
    box: list | None
    ellipsoid: tuple | None = None
    points: list | None = None
    drives: list = field(default_factory=list)
    b: list = field(default_factory=list)  # columns
    disturbances: list = field(default_factory=list)  # (name, lo, hi)
    e: list = field(default_factory=list)  # columns
    names: list = field(default_factory=list)
    title: str = ""

    def __post_init__(self):
        n = len(self.a)
        self.names = self.names or [f"x{i}" for i in range(n)]
        self.system = None

    def centre(self):
        if self.box is not None:
            return [(F(lo) + F(hi)) / 2 for lo, hi in self.box]
        return [F(0)] * len(self.a) if self.points is not None else [F(x) for x in self.ellipsoid[0]]

    def augmented(self):
        """The system of x, the states of the drives, and 1; its start; the row of each drive."""
        n = len(self.a)
        blocks = [(i, *block) for i, drive in enumerate(self.drives) for block in drive.states()]
        size = n + sum(len(m) for _, m, _, _ in blocks) + 1
        a = [[F(0)] * size for _ in range(size)]
        start, rows, at = [*self.centre()], [[F(0)] * size for _ in self.drives], n
        for i in range(n):
            a[i][:n] = [F(x) for x in self.a[i]]
            a[i][size - 1] = F(self.offset[i]) + sum((F(column[i]) * (F(lo) + F(hi)) / 2 for column, (_, lo, hi) in zip(self.e, self.disturbances)), F(0))
        for drive, m, own, row in blocks:
            for i, values in enumerate(m):
                a[at + i][at : at + len(m)] = values
                start.append(own[i])
                rows[drive][at + i] = row[i]
                for j in range(n):
                    a[j][at + i] += F(self.b[drive][j]) * row[i]
            at += len(m)
        return a, [*start, F(1)], rows

    def prepared(self):
        if self.system is None:
            a, self.start, self.rows = self.augmented()
            self.constant = [line[-1] for line in a[:-1]]
            if not self.is_small():
                a = [line[:-1] + [F(0)] for line in a]
            self.system = System(a)
        return self.system

    def support(self, h, h_drives=(), constant=F(0)):
        """S of the output h x + h_drives u + constant."""
        system = self.prepared()
        n, size = len(self.a), len(self.start)
        row = [F(x) for x in h] + [F(0)] * (size - n)
        for weight, drive in zip(h_drives, self.rows):
            row = [x + F(weight) * y for x, y in zip(row, drive)]
        row[-1] += F(constant)
        unit = lambda i, v: [F(v) if j == i else F(0) for j in range(size)]
        drift = system.response(row, self.start) if self.is_small() else self.long_drift(row)
        plain = [F(x) for x in h] + [F(0)] * (size - n)
        boxes = [] if self.box is None else [system.response(plain, unit(i, (F(hi) - F(lo)) / 2)) for i, (lo, hi) in enumerate(self.box) if lo != hi]
        inputs = [system.response(plain, [F(x) * (F(hi) - F(lo)) / 2 for x in column] + [F(0)] * (size - n)) for column, (_, lo, hi) in zip(self.e, self.disturbances) if lo != hi]
        ellipsoid = self.ellipsoid and (self.ellipsoid[1], [system.response(plain, unit(i, 1)) for i in range(n)])
        hull = [system.response(plain, [F(x) for x in p] + [F(0)] * (size - n)) for p in self.points] if self.points else []
        return Support(drift, boxes, inputs, ellipsoid, hull)

    def is_small(self):
        return len(self.start) <= SMALL

    def long_drift(self, row):
        """The drift without the constant 1 as a state, which would connect all blocks: the integral of h exp(A tau) c, its constant in balls."""
        start, offset = [*self.start[:-1], F(0)], [F(x) for x in self.constant] + [F(0)]
        primitive = self.system.response(row, offset).integral()
        return self.system.response(row, start) + primitive + Sum({(0, ZERO): acb(ball(row[-1]) - primitive.at(F(0)))})

    def extremes(self, h, h_drives=(), constant=F(0), start=F(0), end=None):
        """The supremum and the infimum as Extremes; the infimum's value is an upper bound."""
        top = self.support(h, h_drives, constant).greatest(start, end)
        low = self.support([-F(x) for x in h], [-F(x) for x in h_drives], -F(constant)).greatest(start, end)
        return top, Extreme(None if low.value is None else -low.value, low.at, low.slack)

    def text(self, zones=""):
        """The model file in the form of expressions."""
        lines = [f'title = "{self.title}"'] if self.title else []
        if self.ellipsoid:
            lines.append(f"[start]\nellipsoid = {{centre = {vector(self.ellipsoid[0])}, shape = [{', '.join(vector(r) for r in self.ellipsoid[1])}]}}")
        if self.points:
            lines.append(f"[start]\npoints = [{', '.join(vector(p) for p in self.points)}]")
        for i, name in enumerate(self.names):
            lines.append(f"[state.{name}]")
            if self.box is not None:
                lo, hi = self.box[i]
                lines.append(f"start = {number(lo) if lo == hi else vector((lo, hi))}")
            lines.append(f'rate = "{self.rate(i)}"')
        for drive in self.drives:
            lines.append(f'[drive.{drive.name}]\nsignal = "{drive.text()}"')
        for name, lo, hi in self.disturbances:
            lines.append(f"[disturbance.{name}]\nrange = {vector((lo, hi))}")
        return "\n".join(lines) + "\n" + zones

    def rate(self, i):
        terms = [(x, name) for x, name in zip(self.a[i], self.names)]
        terms += [(column[i], drive.name) for column, drive in zip(self.b, self.drives)]
        terms += [(column[i], name) for column, (name, _, _) in zip(self.e, self.disturbances)]
        return affine(terms, self.offset[i])


class UncertainModel(Model):
    """A(p) = A + sum p_k A_k for constants p_k in ranges: worst cases by search over p, on a grid first."""

    def with_uncertain(self, uncertain, slopes):
        """`uncertain`: (name, lo, hi); `slopes`: the A_k."""
        self.uncertain, self.slopes, self.fixed = uncertain, slopes, {}
        return self

    def at(self, p):
        """The model for values of the constants."""
        if p not in self.fixed:
            a = [[x + sum((q * s[i][j] for q, s in zip(p, self.slopes)), F(0)) for j, x in enumerate(row)] for i, row in enumerate(self.a)]
            self.fixed[p] = Model(a, self.offset, self.box, self.ellipsoid, self.points, self.drives, self.b, self.disturbances, self.e, self.names)
        return self.fixed[p]

    def extremes(self, h, h_drives=(), constant=F(0), start=F(0), end=None):
        minus = [-F(x) for x in h], [-F(x) for x in h_drives], -F(constant)
        top, low = self.searched(h, h_drives, constant, start, end), self.searched(*minus, start, end)
        return top, Extreme(None if low.value is None else -low.value, low.at, low.slack)

    def searched(self, h, h_drives, constant, start, end):
        known = {}

        def value(p):
            if p not in known:
                known[p] = self.at(p).support(h, h_drives, constant).greatest(start, end)
            return float(known[p])

        count = 9 if len(self.uncertain) == 1 else 5
        best = max(product(*[[lo + (hi - lo) * F(k, count - 1) for k in range(count)] for _, lo, hi in self.uncertain]), key=value)
        step = F(1, count - 1)
        while any(lo < x < hi for x, (_, lo, hi) in zip(best, self.uncertain)) and step > F(1, 10**5):
            step /= 3
            near = [[min(max(x + (hi - lo) * step * k, lo), hi) for k in (-2, -1, 0, 1, 2)] for x, (_, lo, hi) in zip(best, self.uncertain)]
            best = max(product(*near), key=value)
        return known[best]

    def rate(self, i):
        names = [name for name, _, _ in self.uncertain]
        factor = lambda j: affine([(s[i][j], name) for s, name in zip(self.slopes, names)], self.a[i][j])
        loose = [any(s[i][j] for s in self.slopes) for j in range(len(self.names))]
        own = [f"({factor(j)})*{name}" for j, name in enumerate(self.names) if loose[j]]
        terms = [(x, name) for x, name, is_loose in zip(self.a[i], self.names, loose) if not is_loose]
        terms += [(column[i], drive.name) for column, drive in zip(self.b, self.drives)]
        terms += [(column[i], name) for column, (name, _, _) in zip(self.e, self.disturbances)]
        rest = affine(terms, self.offset[i])
        return " + ".join(own + ([rest] if rest != "0" else [])) or "0"

    def text(self, zones=""):
        words = "".join(f"[uncertain.{name}]\nrange = {vector((lo, hi))}\n" for name, lo, hi in self.uncertain)
        return super().text(words + zones)


def affine(terms, constant=F(0)):
    """The text of a sum of multiples of names and a constant."""
    text = [name if x == 1 else f"({decimal(x)})*{name}" for x, name in terms if x] + ([f"({decimal(constant)})"] if constant else [])
    return " + ".join(text) or "0"


def decimal(q):
    """An exact decimal, or p/q where there is none."""
    q = F(q)
    d, places = q.denominator, 0
    while d % 10 == 0:
        d, places = d // 10, places + 1
    twos = fives = 0
    while d % 2 == 0:
        d, twos = d // 2, twos + 1
    while d % 5 == 0:
        d, fives = d // 5, fives + 1
    if d != 1:
        return str(q)
    places += max(twos, fives)
    digits = str(abs(q.numerator) * 10**places // q.denominator).rjust(places + 1, "0")
    return ("-" if q < 0 else "") + (digits if not places else f"{digits[:-places]}.{digits[-places:]}")


def number(q):
    """A number of a model file."""
    text = decimal(q)
    return f'"{text}"' if "/" in text else text


def vector(values):
    return "[" + ", ".join(number(v) for v in values) + "]"
