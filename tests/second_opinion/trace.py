"""Functions of time by annihilators (trace.md): traces, auxiliaries, closed forms, identities, enclosures over a stretch."""

from math import comb

from answer import Inconclusive, Malformed, ensure
from flint import acb, acb_poly, arb, fmpq, fmpq_poly
from model import degree

import limits


class Function:
    """A function with an annihilator, the product of factors, and its first derivatives at 0 (as y_k / k!)."""

    def __init__(self, roots, factors, series):
        self.roots, self.factors = roots, factors
        self.annihilator = annihilator(roots, factors)
        self.degree = self.annihilator.degree()
        self.start = [series[k] for k in range(self.degree)]
        self.closed = None

    @property
    def is_zero(self):
        """Proved to be zero for all time."""
        return self.degree == 0

    def members(self):
        """Its listed roots with their multiplicities."""
        return [(root, e) for position, e in self.factors for root in self.roots.family(position).roots]

    def series(self, length):
        """y_k / k! for k below a length, extended by the recurrence."""
        derivatives, scale = [], 1
        for k, value in enumerate(self.start):
            scale *= max(k, 1)
            derivatives.append(value * scale)
        m = [self.annihilator[j] for j in range(self.degree)]
        for k in range(self.degree, length):
            window = derivatives[k - self.degree : k]
            derivatives.append(-sum((a * y for a, y in zip(m, window)), fmpq(0)))
        found, scale = [], 1
        for k, value in enumerate(derivatives[:length]):
            scale *= max(k, 1)
            found.append(value / scale)
        return fmpq_poly(found)

    def value_at_start(self):
        return self.start[0] if self.start else fmpq(0)

    def closed_form(self):
        """(root, [c_0, c_1, ...]) for each listed root: Lemma 4."""
        if self.closed is None:
            self.closed = closed_form(self)
        return self.closed


def annihilator(roots, factors):
    positions = [position for position, _ in factors]
    ensure(len(set(positions)) == len(positions), "FactorsAnnihilateTrace", "a family twice")
    size = sum(roots.family(position).degree * multiplicity for position, multiplicity in factors)
    limits.at_most(size, limits.ROOTS, "roots")
    limits.at_most(max((e for _, e in factors), default=0), limits.DEGREE, "degree")
    total = fmpq_poly(1)
    for position, multiplicity in factors:
        total *= roots.family(position).polynomial ** multiplicity
    return total


def trace(flow, roots, polynomial, factors):
    """The trace of an expanded polynomial, if the factors annihilate it."""
    bound = flow.order_bound(polynomial)
    limits.at_most(bound * max(degree(polynomial), 1), limits.DERIVATIVES, "derivatives")
    m = annihilator(roots, factors)
    ensure(m.degree() <= bound, "FactorsAnnihilateTrace", "degree beyond the order bound")
    series = flow.taylor(polynomial, 2 * bound)
    found = Function(roots, factors, series)
    ensure(found.series(bound + m.degree()) == series.truncate(bound + m.degree()), "FactorsAnnihilateTrace")
    return found


def auxiliary(roots, factors, derivatives):
    """A function given by an annihilator and as many derivatives as its degree."""
    series, scale = [], 1
    for k, value in enumerate(derivatives):
        scale *= max(k, 1)
        series.append(value / scale)
    found = Function(roots, factors, fmpq_poly(series))
    if len(derivatives) != found.degree:
        raise Malformed("as many derivatives as the degree")
    return found


def check_identity(functions, identity):
    """Lemma 6."""
    target, summands = identity
    dimension = functions[target].degree
    for powers in summands:
        space = 1
        for of, k in powers:
            d = functions[of].degree
            space *= comb(d + k - 1, k)
        dimension += space
    limits.at_most(dimension, limits.DERIVATIVES, "derivatives")
    total = fmpq_poly(0)
    for powers in summands:
        term = fmpq_poly(1)
        for of, k in powers:
            factor = functions[of].series(dimension)
            for _ in range(k):
                term = (term * factor).truncate(dimension)
        total += term
    ensure(total.truncate(dimension) == functions[target].series(dimension), "IdentityHolds")


def closed_form(function):
    n = function.degree
    m = function.annihilator
    derivatives, scale = [], 1
    for k, value in enumerate(function.start):
        scale *= max(k, 1)
        derivatives.append(value * scale)
    top = fmpq_poly([sum((m[j] * derivatives[j - 1 - i] for j in range(i + 1, n + 1)), fmpq(0)) for i in range(n)])
    found = []
    for position, e in function.factors:
        family = function.roots.families[position]
        for root in family.roots:
            below = power_of(taylor_at(family.polynomial, root.box, e + 1)[1:], e, e)
            for other, multiplicity in function.factors:
                if other != position:
                    series = taylor_at(function.roots.families[other].polynomial, root.box, e)
                    below = times(below, power_of(series, multiplicity, e), e)
            h = quotient(taylor_at(top, root.box, e), below, e)
            coefficients, scale = [], 1
            for j in range(e):
                scale *= max(j, 1)
                coefficients.append(h[e - 1 - j] / scale)
            found.append((root, coefficients))
    return found


def taylor_at(polynomial, point, length):
    """The first Taylor coefficients of a rational polynomial at a point."""
    found, scale = [], 1
    for k in range(length):
        scale *= max(k, 1)
        found.append(acb_poly(polynomial)(point) / scale)
        polynomial = polynomial.derivative()
    return found


def times(left, right, length):
    return [sum((left[i] * right[k - i] for i in range(k + 1)), acb(0)) for k in range(length)]


def power_of(series, exponent, length):
    total = [acb(1)] + [acb(0)] * (length - 1)
    for _ in range(exponent):
        total = times(total, series, length)
    return total


def quotient(top, below, length):
    if below[0].contains(0):
        raise Inconclusive("ClosedFormIsEnclosed")
    found = []
    for k in range(length):
        known = sum((below[i] * found[k - i] for i in range(1, k + 1)), acb(0))
        found.append((top[k] - known) / below[0])
    return found


class Stretch:
    """Enclosure of a function over abs(t - centre) <= half width, by its Taylor polynomial and a bound of the rest (Lemma 5)."""

    def __init__(self, function, centre, half, order):
        self.half = arb(half)
        self.coefficients = [arb(0)] * order
        self.rest = arb(0)
        self.whole = arb(0)
        for root, closed in function.closed_form():
            self.add(root, closed, arb(centre))

    def add(self, root, closed, centre):
        order, h = len(self.coefficients), self.half
        weight = 1 if root.real else 2
        shifted = [
            sum((closed[j] * comb(j, i) * centre ** (j - i) for j in range(i, len(closed))), acb(0))
            for i in range(len(closed))
        ]
        if not ratio_is_small(root, len(closed), h, order):
            latest = centre + h
            growth = max_of(root.box.real * latest, root.box.real * (centre - h)).exp()
            self.whole += weight * growth * sum((abs(c) * latest**j for j, c in enumerate(closed)), arb(0))
            return
        start = (root.box * centre).exp()
        powers = [acb(1)]
        for k in range(1, order):
            powers.append(powers[-1] * root.box / k)
        for k in range(order):
            value = sum((p * powers[k - i] for i, p in enumerate(shifted[: k + 1])), acb(0))
            self.coefficients[k] += weight * (start * value).real
        x = abs(root.box) * h
        for i, p in enumerate(shifted):
            lowest = max(order - i, 0)
            tail = 2 * x**lowest / arb.fac_ui(lowest)
            self.rest += weight * abs(start) * abs(p) * h**i * tail

    def enclosure(self, vanishing=0):
        """Of the function divided by (t - centre)^vanishing, if so many first coefficients are exactly 0."""
        if vanishing and (not self.half > 0 or not self.whole.is_zero()):
            raise Inconclusive("SignOnCell", "no quotient on this cell")
        coefficients = self.coefficients[vanishing:] or [arb(0)]
        h = self.half
        radius = self.rest / h**vanishing + self.whole
        for k, c in enumerate(coefficients[1:], 1):
            radius += abs(c) * h**k
        return arb(coefficients[0].mid(), (radius + coefficients[0].rad()).upper())


def ratio_is_small(root, size, h, order):
    """2 x <= M + 1 for each power."""
    return all(2 * abs(root.box) * h <= max(order - i, 0) + 1 for i in range(size))


def max_of(left, right):
    return left.max(right)
