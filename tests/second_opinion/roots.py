"""Roots of families by discs (trace.md, Lemma 3); sums of roots and lines of symmetry (equality.md)."""

from math import comb
from typing import Any, NamedTuple

import flint
from answer import Inconclusive, Malformed, decide, ensure
from flint import acb, acb_poly, arb, fmpq, fmpq_poly

EXTRA_BITS = 64
NEWTON_STEPS = 8


class Root(NamedTuple):
    """A listed root: its family, its square, and the same for its mirror image."""

    position: int
    family: int
    box: Any
    real: bool

    def value(self, conjugate=False):
        return self.box.conjugate() if conjugate and not self.real else self.box

    @property
    def pair(self):
        """The root and, if it is another one, its conjugate."""
        return (self.box,) if self.real else (self.box, self.box.conjugate())


class Family(NamedTuple):
    polynomial: Any
    roots: tuple

    @property
    def degree(self):
        return self.polynomial.degree()


class Roots:
    """All families, confirmed, and all of their roots in the order of the centres."""

    def __init__(self, families, precision):
        with flint.ctx.workprec(2 * precision + EXTRA_BITS):
            found = [discs(*family) for family in families]
            refuse_overlaps([disc for family in found for disc in family])
            self.families, self.all = [], []
            for (polynomial, _), family in zip(families, found):
                polynomial = fmpq_poly(list(polynomial))
                members = tuple(self.listed(disc, polynomial) for disc in family)
                self.families.append(Family(polynomial, members))

    def listed(self, disc, polynomial):
        re, im, radius = disc
        real = im == 0
        box = acb(arb(re, radius), arb(0) if real else arb(im, radius))
        box = refined(box, polynomial)
        self.all.append(Root(len(self.all), len(self.families), box, real))
        return self.all[-1]

    def named(self, name):
        """The root with a position, or with a name that may mean the conjugate."""
        position = name[0] if isinstance(name, tuple) else name
        if position >= len(self.all):
            raise Malformed("a position in the list of roots", str(position))
        return self.all[position]

    def family(self, position):
        if position >= len(self.families):
            raise Malformed("a position in the list of families", str(position))
        return self.families[position]

    def value(self, name):
        return self.named(name).value(name[1])

    def same(self, left, right):
        """Whether two names mean the same root."""
        return left[0] == right[0] and (left[1] == right[1] or self.named(left).real)

    def check_sum(self, claim):
        """equality.md (a)."""
        families = [self.families[self.named(of).family] for _, of in claim.parts]
        size = 1
        for family in families:
            size *= family.degree
        factors = [(self.family(position), multiplicity) for position, multiplicity in claim.factors]
        ensure(sum(f.degree * k for f, k in factors) == size, "SumsAreRoots", "number of roots")
        sums = power_sums(families[0].polynomial, size)
        sums = [s * claim.parts[0][0] ** k for k, s in enumerate(sums)]
        for (times, _), family in zip(claim.parts[1:], families[1:]):
            other = [s * times**k for k, s in enumerate(power_sums(family.polynomial, size))]
            sums = [sum((comb(k, j) * sums[j] * other[k - j] for j in range(k + 1)), fmpq(0)) for k in range(size + 1)]
        listed = [fmpq(0)] * (size + 1)
        for family, multiplicity in factors:
            listed = [a + multiplicity * b for a, b in zip(listed, power_sums(family.polynomial, size))]
        ensure(sums == listed, "SumsAreRoots")
        self.identify(claim)

    def identify(self, claim):
        value = sum((times * self.value(of) for times, of in claim.parts), acb(0))
        meets = []
        for position in {position for position, _ in claim.factors}:
            for root in self.families[position].roots:
                meets += [(root.position, False)] if value.overlaps(root.box) else []
                meets += [(root.position, True)] if not root.real and value.overlaps(root.box.conjugate()) else []
        ensure(any(self.same(claim.root, name) for name in meets), "SumIsIdentified")
        decide(len(meets) == 1, "SumIsIdentified", "several roots")

    def check_line(self, name, a):
        """equality.md (b): the real part of the root is a."""
        root = self.named(name)
        family = self.families[root.family]
        q = family.polynomial
        mirrored = q(fmpq_poly([2 * a, -1]))
        ensure(mirrored == q or mirrored == -q, "RootIsOnLine")
        image = 2 * arb(a) - root.box.conjugate()
        for other in family.roots:
            for value in other.pair:
                own = value is root.box or (other is root and value is other.pair[0])
                decide(own or not image.overlaps(value), "RootIsOnLine")


def power_sums(polynomial, size):
    """The sums of the k-th powers of the roots of a monic polynomial, k up to a size (Newton)."""
    d = polynomial.degree()
    e = [polynomial[d - k] if k <= d else fmpq(0) for k in range(size + 1)]
    sums = [fmpq(d)]
    for k in range(1, size + 1):
        sums.append(-sum((e[j] * sums[k - j] for j in range(1, min(k - 1, d) + 1)), fmpq(0)) - k * e[k])
    return sums


def refined(box, polynomial):
    """The box of a root cut by Newton steps: the root is in m - q(m) / q'(box), by the mean value along the segment from m."""
    q, slope = acb_poly(polynomial), acb_poly(polynomial.derivative())
    for _ in range(NEWTON_STEPS):
        if slope(box).contains(0):
            return box
        middle = acb(box.real.mid(), box.imag.mid())
        step = middle - q(middle) / slope(box)
        box = acb(box.real.intersection(step.real), box.imag.intersection(step.imag))
    return box


def discs(polynomial, centres):
    """For each listed centre: real part, imaginary part and radius."""
    points = []
    for re, im in centres:
        re, im = arb(re), arb(im)
        points.append(acb(re, im))
    everyone = points + [z.conjugate() for z in points if z.imag != 0]
    degree = len(polynomial) - 1
    if len(everyone) != degree:
        from answer import Refuted

        raise Refuted("RootsAreSeparated", "as many centres as the degree")
    exact = [arb(c) for c in polynomial]
    found = []
    for i, z in enumerate(points):
        value = acb(0)
        for c in reversed(exact):
            value = value * z + c
        spread = arb(1)
        for j, other in enumerate(everyone):
            if j != i:
                spread *= abs(z - other)
        decide(spread > 0, "RootsAreSeparated", "two equal centres")
        radius = (degree * abs(value) / spread).upper()
        found.append((z.real, z.imag, radius))
    return found


def refuse_overlaps(found):
    """All discs and their mirror images are disjoint."""
    everyone = []
    for re, im, radius in found:
        everyone.append((re, im, radius))
        if im != 0:
            everyone.append((re, -im, radius))
    for i, (x, y, r) in enumerate(everyone):
        for u, v, s in everyone[:i]:
            if not (x - u) ** 2 + (y - v) ** 2 > (r + s) ** 2:
                raise Inconclusive("RootsAreSeparated")
