"""The formula of a claim, its polynomials expanded, and their derivatives at 0 along the trajectory (trace.md, Lemmas 1, 2)."""

from math import comb

from answer import Refuted
from flint import fmpq, fmpq_poly

import limits


def claimed_formula(statement):
    """The formula as it is claimed (widened by the margin), with positions of polynomials, and these."""
    inside, margin = statement.inside, fmpq(0)
    if statement.claim[0] == "never":
        margin = statement.claim[1]
    if margin != 0:
        inside = widened(inside, margin)
    polynomials = []
    return indexed(inside, polynomials), polynomials


def widened(inside, margin):
    if inside[0] != "atom" or inside[2] == "!= 0":
        raise Refuted("EvidenceFitsClaim", "a margin needs a single comparison")
    _, polynomial, relation = inside
    above = ("atom", shifted(polynomial, margin), ">= 0")
    below = ("atom", shifted(polynomial, -margin), "<= 0")
    if relation == "= 0":
        return "all", (above, below)
    return above if relation in (">= 0", "> 0") else below


def shifted(polynomial, offset):
    """The polynomial plus a number."""
    terms = [(times + offset if not of else times, of) for times, of in polynomial]
    if all(of for _, of in polynomial):
        terms.append((offset, ()))
    return tuple(term for term in terms if term[0] != 0)


def indexed(formula, polynomials):
    if formula[0] != "atom":
        return formula[0], tuple(indexed(part, polynomials) for part in formula[1])
    key = frozenset(formula[1])
    known = [frozenset(polynomial) for polynomial in polynomials]
    if key not in known:
        polynomials.append(formula[1])
        return "atom", len(polynomials) - 1, formula[2]
    return "atom", known.index(key), formula[2]


def add_to(total, monomial, times):
    total[monomial] = total.get(monomial, fmpq(0)) + times
    if total[monomial] == 0:
        del total[monomial]


def product(left, right):
    """The product of two polynomials: dictionaries from monomials, sorted tuples of (name, power), to rationals."""
    total = {}
    for a, x in left.items():
        for b, y in right.items():
            powers = dict(a)
            for name, k in b:
                powers[name] = powers.get(name, 0) + k
            add_to(total, tuple(sorted(powers.items())), x * y)
    return total


def expanded(polynomial, outputs):
    """A polynomial as it is written, without outputs: in states, drives, t and exponentials."""
    total = {}
    for times, of in polynomial:
        term = {(): times}
        for name, k in of:
            factor = expanded(outputs[name], {}) if name in outputs else {((name, 1),): fmpq(1)}
            for _ in range(k):
                limits.at_most(degree(term) + degree(factor), limits.DEGREE, "degree")
                term = product(term, factor)
        for monomial, value in term.items():
            add_to(total, monomial, value)
    return total


def degree(polynomial):
    return max((sum(k for _, k in monomial) for monomial in polynomial), default=0)


def affine_polynomial(affine):
    """An affine expression as a polynomial."""
    total = {((of, 1),): times for of, times in affine.terms}
    add_to(total, (), affine.offset)
    return total


class Flow:
    """The trajectory by its power series at 0."""

    def __init__(self, statement):
        self.statement = statement
        self.outputs = dict(statement.outputs)
        self.drives = dict(statement.drives)
        self.rates = dict(zip(statement.states, statement.rates))
        self.length = 0
        self.series = {}

    def order_bound(self, polynomial):
        """N: the trace of the polynomial lies in a space of this dimension, closed under d/dt."""
        names = {name for monomial in polynomial for name, _ in monomial}
        reached, open_names = set(), set(names)
        while open_names:
            name = open_names.pop()
            reached.add(name)
            if name in self.rates:
                open_names |= {of for of, _ in self.rates[name].terms} - reached
        powers = {(fmpq(0), fmpq(0)): 1 if "t" in names else 0}
        for name in reached & set(self.drives):
            for wave in self.drives[name]:
                key = (wave.rate, wave.frequency)
                powers[key] = max(powers.get(key, 0), wave.power)
        d = sum((2 if w != 0 else 1) * (power + 1) for (_, w), power in powers.items())
        d += len(reached & set(self.rates))
        return comb(d - 1 + degree(polynomial), degree(polynomial))

    def taylor(self, polynomial, length):
        """y_k / k! for k below a length, as a polynomial in the time."""
        if length > self.length:
            self.extend(length)
        total = fmpq_poly(0)
        for monomial, times in polynomial.items():
            term = fmpq_poly([times])
            for name, k in monomial:
                for _ in range(k):
                    term = (term * self.series[name]).truncate(length)
            total += term
        return total.truncate(length)

    def extend(self, length):
        self.length = length
        self.series = {"t": fmpq_poly([0, 1])}
        for name, waves in self.drives.items():
            self.series[name] = sum((wave_series(wave, length) for wave in waves), fmpq_poly(0))
        values = {name: [start] for name, start in self.statement.starts}
        drives = {name: [self.series[name][k] for k in range(length)] for name in self.drives}
        for k in range(length - 1):
            known = {**values, **drives}
            for name, affine in self.rates.items():
                rate = sum((times * known[of][k] for of, times in affine.terms), fmpq(0))
                rate += affine.offset if k == 0 else 0
                values[name].append(rate / (k + 1))
        for name, coefficients in values.items():
            self.series[name] = fmpq_poly(coefficients)


def wave_series(wave, length):
    """The power series of times t^power exp(rate t) times cos, sin or 1."""
    growth, turn = [fmpq(1)], [fmpq(1)]
    for k in range(1, length):
        growth.append(growth[-1] * wave.rate / k)
        turn.append(turn[-1] * wave.frequency / k)
    signs = {"": (1, 0, 0, 0), "cos": (1, 0, -1, 0), "sin": (0, 1, 0, -1)}[wave.kind]
    turn = [value * signs[k % 4] for k, value in enumerate(turn)]
    if not wave.kind:
        turn = [fmpq(1)]
    series = fmpq_poly(growth) * fmpq_poly(turn) * fmpq_poly([0] * wave.power + [wave.times])
    return series.truncate(length)
