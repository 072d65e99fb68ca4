"""exponential.md: polynomials with exp of affine expressions."""

from flint import arb
from model import add_to
from signs import sign_of
from trace import Stretch


class Exponentials:
    """Operations on p = sum of c_k exp(b_k)."""

    @staticmethod
    def parts(written, polynomial, arguments):
        """(c_k, b_k) of a polynomial, as it is written and expanded, in the order of the exponents as lists; None without exponentials."""
        order = {name: position for position, name in enumerate(arguments)}
        coefficients = {}
        for _, of in written:
            coefficients[tuple(sorted((order[name], k) for name, k in of if name in order))] = {}
        for monomial, times in polynomial.items():
            key = tuple(sorted((order[name], k) for name, k in monomial if name in order))
            rest = tuple(pair for pair in monomial if pair[0] not in order)
            add_to(coefficients[key], rest, times)
        if not any(coefficients):
            return None
        found = []
        for key in sorted(coefficients):
            argument = {}
            for position, k in key:
                for monomial, times in list(arguments.values())[position].items():
                    add_to(argument, monomial, k * times)
            found.append((coefficients[key], argument))
        return found

    @staticmethod
    def sign_at_start(problem, position):
        """The sign at t = 0, or None."""
        total = arb(0)
        for c, b in problem.exponentials[position]:
            total += arb(problem.functions[c].value_at_start()) * arb(problem.functions[b].value_at_start()).exp()
        return sign_of(total)

    @staticmethod
    def on_stretch(problem, position, centre, half, order):
        """An enclosure over a stretch of time."""
        value, slope, h = arb(0), arb(0), arb(half)
        for c, b in problem.exponentials[position]:
            c, b = (Stretch(problem.functions[f], centre, half, order) for f in (c, b))
            u, q = None, None
            if h.is_zero():
                value += c.enclosure() * b.enclosure().exp()
                continue
            if c.whole.is_zero() and b.whole.is_zero():
                p, q = c.enclosure(1), b.enclosure(1)
                u = (abs(q) * h).upper()
            if u is None or not u <= 1:
                value += c.enclosure() * b.enclosure().exp()
                continue
            start = c.coefficients[0]
            scale = b.coefficients[0].exp()
            growth = q * (1 - u / 2).union(1 + u)
            value += start * scale
            slope += scale * (p + growth * (start + symmetric(h) * p))
        return value + symmetric(h) * slope


def symmetric(h):
    return arb(0, arb(h).upper())
