"""The functions h exp(At) v of a rational system as sums of exponentials, with exact exponents and python-flint balls for coefficients.

With G(z) = h (zI - A)^-1 v = N(z) / m(z) reduced over the rationals, a root mu of m of multiplicity e gives t^j / j! exp(mu t) the coefficient
h_(e-1-j), h the power series at mu of N(mu + w) / [m(mu + w) / w^e]. So modes that cancel are gone, whatever the matrix, and defective ones are exact.
The matrix is split into the blocks that do not act on each other first.
"""

import math
from fractions import Fraction as F
from math import factorial

import numpy as np
from flint import acb, arb, ctx, fmpq, fmpq_mat, fmpq_poly

ctx.prec = 320
CHUNK = 20000  # times evaluated together
DEAD = 90  # terms below exp(-90) are left out of floating-point values


def ball(q):
    q = F(q)
    return arb(fmpq(q.numerator, q.denominator))


def rational(q):
    q = F(q)
    return fmpq(q.numerator, q.denominator)


class Root:
    """An eigenvalue with imaginary part >= 0; `square` is w^2 for the undamped i w of rational w^2 (0 for the root 0), else None."""

    def __init__(self, mu, square=None):
        self.mu, self.square, self.float = mu, square, complex(mu)
        self.is_real = bool(mu.imag == 0)
        # the sign of the real part, 0 only where it is exactly 0
        self.growth = 0 if mu.real == 0 else 1 if mu.real > 0 else -1
        if self.growth < 0 and not mu.real < 0:
            raise ArithmeticError("a growth rate of unknown sign")


class Sum:
    """The real function Re sum c t^k exp(mu t): `terms` maps (k, root) to the ball c."""

    def __init__(self, terms=None):
        self.terms = terms or {}
        self.rounded = None

    def floats(self):
        """The terms in floating point."""
        if self.rounded is None:
            self.rounded = [(key, complex(c)) for key, c in self.terms.items()]
        return self.rounded

    def __add__(self, other):
        terms = dict(self.terms)
        for key, c in other.terms.items():
            terms[key] = terms[key] + c if key in terms else c
        return Sum(terms)

    def scaled(self, q):
        q = q if isinstance(q, arb) else ball(q)
        return Sum({key: c * q for key, c in self.terms.items()}) if not q == 0 else Sum()

    def at(self, t):
        """The ball of the value at a rational time or a ball of times."""
        t = t if isinstance(t, arb) else ball(t)
        return sum((c.real * t**k if root.mu == 0 else (c * (root.mu * t).exp()).real * t**k for (k, root), c in self.terms.items()), arb(0))

    def derivative(self):
        terms = {}
        for (k, root), c in self.terms.items():
            for key, x in (((k, root), c * root.mu), ((k - 1, root), c * k)):
                if not x == 0:
                    terms[key] = terms[key] + x if key in terms else x
        return Sum(terms)

    def integral(self):
        """An antiderivative; the one that decays if the sum does."""
        terms = {}
        for (k, root), c in self.terms.items():
            if root.mu == 0:
                terms[k + 1, root] = terms.get((k + 1, root), acb(0)) + c / (k + 1)
                continue
            for j in range(k + 1):  # t^k exp(mu t): sum over j of (-1)^j k!/(k-j)! t^(k-j) / mu^(j+1)
                x = c * (-1) ** j * (factorial(k) // factorial(k - j)) / root.mu ** (j + 1)
                terms[k - j, root] = terms.get((k - j, root), acb(0)) + x
        return Sum(terms)

    def modulus(self):
        """The sum of the moduli of the coefficients: what rounding in floating point is measured by."""
        return float(sum((abs(c) for c in self.terms.values()), arb(0)))

    def growing(self):
        """Terms that do not decay, the constant left out."""
        return [(k, root) for k, root in self.terms if root.growth > 0 or (root.growth == 0 and (k > 0 or root.square))]


class Waves:
    """The terms t^k exp(mu t) at some times in floating point, each computed once."""

    def __init__(self, times):
        self.times, self.known = np.asarray(times, dtype=float), {}
        self.first = float(self.times.min(initial=math.inf))

    def term(self, key):
        if key not in self.known:
            k, root = key
            mu = root.float.real if root.is_real else root.float
            wave = np.exp(mu * self.times)
            self.known[key] = wave * self.times**k if k else wave
        return self.known[key]

    def values(self, f):
        total = np.zeros(self.times.shape)
        for key, c in f.floats():
            if key[1].float.real * self.first < -DEAD:
                continue
            total += c.real * self.term(key) if key[1].is_real else (c * self.term(key)).real
        return total


def in_chunks(values, times, chunk=CHUNK):
    """A function of an array of times, some of them at a time: memory stays small, and dead terms are left out late."""
    times = np.asarray(times, dtype=float)
    if len(times) <= chunk:
        return values(times)
    return np.concatenate([values(times[i : i + chunk]) for i in range(0, len(times), chunk)])


def floats(f, times):
    return in_chunks(lambda part: Waves(part).values(f), times)


def components(a):
    """The sets of indices that the matrix does not connect."""
    label = list(range(len(a)))

    def top(i):
        while label[i] != i:
            i = label[i]
        return i

    for i, row in enumerate(a):
        for j, v in enumerate(row):
            if v:
                label[top(i)] = top(j)
    found = {}
    for i in range(len(a)):
        found.setdefault(top(i), []).append(i)
    return list(found.values())


class Block:
    """A part of the system that is connected."""

    def __init__(self, a, indices):
        self.indices = indices
        self.matrix = fmpq_mat([[rational(a[i][j]) for j in indices] for i in indices])
        self.characteristic = self.matrix.charpoly()
        self.factors = []
        for q, e in self.characteristic.numer().factor()[1]:
            square = None
            if q.degree() == 1 and q[0] == 0:
                square = F(0)
            elif q.degree() == 2 and q[1] == 0:
                square = F(int(q[0]), int(q[2]))
            roots = [Root(mu, square if mu.real == 0 else None) for mu, _ in q.complex_roots() if mu.imag >= 0]
            if any(r.growth == 0 and r.square is None for r in roots):
                raise ArithmeticError("an undamped mode whose frequency is not the root of a rational")
            self.factors.append((fmpq_poly(q), e, roots))
        self.rows = {}

    def derivatives(self, h, v):
        """h A^k v for k < n."""
        n = len(self.indices)
        own = tuple(F(h[i]) for i in self.indices)
        if own not in self.rows:
            row, rows = fmpq_mat(1, n, [rational(x) for x in own]), []
            for _ in range(n):
                rows.append(row)
                row = row * self.matrix
            self.rows[own] = rows
        start = fmpq_mat(n, 1, [rational(v[i]) for i in self.indices])
        return [(row * start)[0, 0] for row in self.rows[own]]

    def response(self, h, v):
        y, m, n = self.derivatives(h, v), self.characteristic, len(self.indices)
        numerator = fmpq_poly([sum((m[i + 1 + k] * y[k] for k in range(n - i)), fmpq(0)) for i in range(n)])
        if numerator == 0:
            return Sum()
        common = numerator.gcd(m)
        numerator, m = numerator // common, m // common
        terms = {}
        for q, e, roots in self.factors:
            left = m
            power = 0
            while power < e and left % q == 0:
                left, power = left // q, power + 1
            if power:
                for root in roots:
                    terms |= partial_fractions(numerator, m, root, power)
        return Sum(terms)


def taylor(p, mu, count):
    """The first coefficients of p(mu + w)."""
    c = [acb(x.p) / acb(x.q) for x in p.coeffs()]
    result = []
    for _ in range(count):
        if not c:
            result.append(acb(0))
            continue
        for i in range(len(c) - 2, -1, -1):
            c[i] += mu * c[i + 1]
        result.append(c[0])
        c = c[1:]
    return result


def partial_fractions(numerator, m, root, power):
    """The terms of one root, twice the real part taken for a pair."""
    below = taylor(m, root.mu, 2 * power)[power:]
    above = taylor(numerator, root.mu, power)
    series = []
    for i in range(power):
        series.append((above[i] - sum((series[j] * below[i - j] for j in range(i)), acb(0))) / below[0])
    pair = 1 if root.is_real else 2
    return {(j, root): series[power - 1 - j] * pair / factorial(j) for j in range(power)}


class System:
    """x' = A x over the rationals."""

    def __init__(self, a):
        self.order = len(a)
        self.blocks = [Block(a, indices) for indices in components(a)]

    def response(self, h, v):
        """h exp(At) v."""
        total = Sum()
        for block in self.blocks:
            if any(h[i] for i in block.indices) and any(v[i] for i in block.indices):
                total = total + block.response(h, v)
        return total
