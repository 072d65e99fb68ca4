"""Conditions with exp of states: first instants at which they hold, and greatest values, by mpmath at 40 digits.

The states are closed forms of x'' = 25 (1 - x) - 6 x', x(0) = x'(0) = 0, and T' = -T/2, T(0) = 2:
x = 1 - exp(-3t) (cos 4t + 3/4 sin 4t), x' = 25/4 exp(-3t) sin 4t, T = 2 exp(-t/2). Instants come from a scan with step 1/1000 and
bisection-safe root finding; greatest values likewise from the derivative's sign changes.
"""

import mpmath

mpmath.mp.dps = 40


def x(t):
    return 1 - mpmath.exp(-3 * t) * (mpmath.cos(4 * t) + mpmath.mpf(3) / 4 * mpmath.sin(4 * t))


def v(t):
    return mpmath.mpf(25) / 4 * mpmath.exp(-3 * t) * mpmath.sin(4 * t)


def T(t):
    return 2 * mpmath.exp(-t / 2)


CASES = [
    ("exp(T) + x^2 <= 2.5", lambda t: mpmath.mpf("2.5") - mpmath.exp(T(t)) - x(t) ** 2),
    ("v*exp(x - T) >= 0.75", lambda t: v(t) * mpmath.exp(x(t) - T(t)) - mpmath.mpf("0.75")),
    ("exp(2*x - t) + v >= 4.5", lambda t: mpmath.exp(2 * x(t) - t) + v(t) - mpmath.mpf("4.5")),
    ("x - exp(-T + 0.25) >= 0.1", lambda t: x(t) - mpmath.exp(-T(t) + mpmath.mpf("0.25")) - mpmath.mpf("0.1")),
]
STEP = mpmath.mpf(1) / 1000


def first_root(g):
    for k in range(12000):
        if g(k * STEP) < 0 <= g((k + 1) * STEP):
            return mpmath.findroot(g, (k * STEP, (k + 1) * STEP), solver="anderson", tol=mpmath.mpf(10) ** -36)
    raise ValueError("the condition never holds")


def greatest(g):
    k = max(range(1, 12000), key=lambda k: g(k * STEP))
    slope = lambda t: mpmath.diff(g, t)
    return g(mpmath.findroot(slope, ((k - 1) * STEP, (k + 1) * STEP), solver="anderson", tol=mpmath.mpf(10) ** -30))


def exponential_zones():
    text = lambda value: mpmath.nstr(value, 25)
    return [
        {"inside": inside, "first": text(first_root(g)), "greatest": text(greatest(g)) if "v" in inside else None}
        for inside, g in CASES
    ]
