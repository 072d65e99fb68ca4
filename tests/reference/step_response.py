"""Unit step responses of low-pass systems: the supremum over all time, where it is, all peaks, and the L1 norm of the impulse response.

For q = s^n + d_(n-1) s^(n-1) + ... + d_0 with simple roots mu in the left half-plane, the response of d_0 / q is
    y(t) = 1 + sum d_0 / (mu q'(mu)) exp(mu t),    h = y' = sum d_0 / q'(mu) exp(mu t).
Near 0, h > 0 because h, ..., h^(n-2) vanish at 0 and h^(n-1) > 0. On [delta, T] all zeros of h are isolated. After T the modulus sum
bounds |y - 1| and the rest of the L1 norm. So every peak is compared, not the first alone.
"""

from fractions import Fraction as F
from math import factorial, lcm

from flint import acb, arb, ctx, fmpz_poly

from ball import bounds, rational, sign, texts, value_near, zeros

GRAHAM_LATHROP = "ITAE form: Graham & Lathrop, Trans. AIEE 72 II (1953)"
SECOND_ORDER = "second order, damping ratio z: overshoot exp(-pi z / sqrt(1 - z^2)), e.g. Ogata, Modern Control Engineering, 5e, sec. 5-3"


class Response:
    """The step response of d_0 / (s^n + ... + d_0); coefficients from d_0 upwards, the leading 1 left out."""

    def __init__(self, denominator):
        d = [F(x) for x in denominator]
        common = lcm(*(x.denominator for x in d))
        q = fmpz_poly([int(x * common) for x in d] + [common])
        roots = q.complex_roots()
        if any(count != 1 or not mu.real < 0 for mu, count in roots):
            raise ValueError("multiple or unstable roots")
        self.order, self.roots = len(d), [mu for mu, _ in roots]
        gain = acb(rational(d[0] * common))
        self.weights = [gain / sum((acb(int(c)) * mu**k for k, c in enumerate(q.derivative().coeffs())), acb(0)) for mu in self.roots]

    def derivative(self, order, t):
        """The derivative of this order of y, at least 1, at all t of a ball."""
        terms = (c * mu ** (order - 1) * (mu * t).exp() for c, mu in zip(self.weights, self.roots))
        return sum(terms, acb(0)).real

    def y(self, t):
        return 1 + sum((c / mu * (mu * t).exp() for c, mu in zip(self.weights, self.roots)), acb(0)).real

    def tail(self, t):
        """Above |y - 1| at all times after t, and above the integral of |h| over them."""
        distance = sum((abs(c / mu) * (mu.real * t).exp() for c, mu in zip(self.weights, self.roots)), arb(0))
        rest = sum((abs(c) / -mu.real * (mu.real * t).exp() for c, mu in zip(self.weights, self.roots)), arb(0))
        return distance, rest

    def analyse(self):
        """Supremum, its time, all peaks above 1 up to the horizon, L1 norm."""
        start = arb(1)
        while not self.derivative(self.order, arb(0).union(start)) > 0:
            start /= 2
        horizon = arb(1)
        while not self.tail(horizon)[1] < arb(10) ** -36:
            horizon *= arb(1.25)
            horizon = horizon.mid()
        h, slope = (lambda t: self.derivative(1, t)), (lambda t: self.derivative(2, t))
        turns = zeros(h, slope, start, horizon)
        if turns and turns[0][2] != 1 or any(p[2] == q[2] for p, q in zip(turns, turns[1:])):
            raise ArithmeticError("the turning points do not alternate")
        values = [value_near(self.y, h, a, b) for a, b, _ in turns]
        peaks = [(a.union(b), v) for (a, b, left), v in zip(turns, values) if left == 1]
        path = [arb(0), *values, self.y(horizon)]
        norm = sum((abs(v - u) for u, v in zip(path, path[1:])), arb(0)) + arb(0).union(self.tail(horizon)[1])
        where, supremum = peaks[0]
        for peak in peaks[1:]:
            if not sign(peak[1] - supremum):
                raise ArithmeticError("two peaks are too close to be compared")
            if peak[1] > supremum:
                where, supremum = peak
        if not self.tail(horizon)[0] < supremum - 1:
            raise ArithmeticError("the horizon is too short")
        return supremum, where, peaks, norm


def bessel(n):
    c = [F(factorial(2 * n - k), 2 ** (n - k) * factorial(k) * factorial(n - k)) for k in range(n + 1)]
    return c[:n]


def cases():
    """Name, coefficients from d_0 upwards, source."""
    for n in range(2, 7):
        yield f"bessel {n}", bessel(n), "Bessel polynomial: sum (2n-k)! / (2^(n-k) k! (n-k)!) s^k"
    yield "butterworth 3", ["1", "2", "2"], "Butterworth polynomial of order 3"
    yield "itae 2", ["1", "7/5"], GRAHAM_LATHROP
    yield "itae 3", ["1", "43/20", "7/4"], GRAHAM_LATHROP
    yield "itae 4", ["1", "27/10", "17/5", "21/10"], GRAHAM_LATHROP
    yield "itae 5", ["1", "17/5", "11/2", "5", "14/5"], GRAHAM_LATHROP
    for z in ["1/10", "1/5", "3/10", "1/2", "3/5", "4/5"]:
        yield f"damping ratio {z}", ["1", 2 * F(z)], SECOND_ORDER
    yield "6 s + 25", ["25", "6"], SECOND_ORDER + ", with z = 3/5 and w = 5: exp(-3 pi/4) at t = pi/4"


def closed_form(z, w):
    """Supremum, its time and L1 norm in second order."""
    z, w = rational(z), rational(w)
    root = (1 - z * z).sqrt()
    return 1 + (-arb.pi() * z / root).exp(), arb.pi() / (w * root), (arb.pi() * z / (2 * root)).coth()


def late_cases():
    """All-pole systems with a fast ripple on a slow rise: the first maximum is not the highest."""
    yield "ripple on a second-order rise", ["9", "15/4", "503/50", "11/20"], "our own: (s^2 + 2/5 s + 1)(s^2 + 3/20 s + 9)"
    yield "ripple on a slow first-order rise", ["8", "402/25", "33/50"], "our own: (s + 1/2)(s^2 + 4/25 s + 16)"
    yield "ripple on a first-order rise", ["9", "93/10", "13/10"], "our own: (s + 1)(s^2 + 3/10 s + 9)"


def case(name, denominator, source):
    supremum, where, peaks, norm = Response(denominator).analyse()
    if name == "6 s + 25" or name.startswith("damping"):
        z, w = (F(3, 5), 5) if name == "6 s + 25" else (F(name.split()[-1]), 1)
        for found, known in zip((supremum, where, norm), closed_form(z, w)):
            if not found.overlaps(known):
                raise ArithmeticError(f"{name}: {found} is not {known}")
    higher = [p for p in peaks if p[1] > 1 + (supremum - 1) / 1000000]
    before = [p for p in peaks if p[0] < where]
    return {
        "name": name, "source": source, "denominator": texts(denominator),
        "supremum": bounds(supremum, 30), "time": bounds(where, 30), "impulse_l1": bounds(norm, 30),
        "maxima_before": str(len(before)), "peaks": [{"time": bounds(t, 24), "value": bounds(v, 24)} for t, v in higher],
    }


def analysed(cases_):
    before, ctx.prec = ctx.prec, 320
    result = [case(*c) for c in cases_]
    ctx.prec = before
    return result


def step_responses():
    return analysed(cases())


def late_peaks():
    return analysed(late_cases())
