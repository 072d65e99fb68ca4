"""Zones whose answer is known exactly: models with expected verdicts, and enclosures of times and levels.

A case has `states` (name, start, rate) and `zones`: `inside`, `from`, `until`, the verdict `expect`, and for an entry the pair `time` that encloses the first
one in the window. The derivations:

identities               an expression E that vanishes along the trajectory; its closed form is evaluated in balls at some times. E = 0 is entered
                         at once, E > 0 and E < 0 never.
trigonometric_extremes   the least value m of a trigonometric polynomial: with u = tan(t/2) the numerator of p - m has a double root, so m is a root
                         of a discriminant (SymPy), told from its other roots by the zeros of the derivative (python-flint). A rational m is touched exactly;
                         another one lies between levels a billionth apart.
dense_orbits             sums of waves with independent frequencies: each level below the sum of the amplitudes is passed (Kronecker), the sum itself at
                         most at the one time where all waves are at their crest.
recurrences              the same for windows that begin after a crest.
late_entries             the first time at which such a sum passes a level. For the level 2 A - e each wave must be within e of its crest, so only short
                         stretches around the crests of the first wave matter; each is excluded or searched in balls. `late_stretches`: what takes long.
transcendental_zeros     zeros of exponential polynomials that handbooks tabulate, by isolation in balls.
"""

from fractions import Fraction as F

import sympy
from flint import acb, arb, ctx

from ball import bounds, ends, narrowed, rational, sign, zeros

BILLIONTH = F(1, 10**9)


def oscillator(name, square, start, speed):
    """name'' = -square name."""
    return [[name, str(start), f"{name}_"], [f"{name}_", str(speed), f"-({square})*{name}"]]


def case(name, source, states, zones):
    return {"name": name, "source": source, "states": states, "zones": zones}


def zone(inside, expect, time=None, start=None, end=None):
    made = {"inside": inside, "expect": expect}
    for key, value in (("time", time), ("from", start), ("until", end)):
        if value is not None:
            made[key] = value if key == "time" else str(value)
    return made


# identities

def identity(name, source, states, left, right, functions, difference):
    """`difference` maps the values of `functions` at t to left - right, as a check on the text."""
    for t in (F(0), F(1, 3), F(5), F(200, 7)):
        value = difference(*[f(rational(t)) for f in functions])
        if not value.contains(0) or value.rad() > arb("1e-60"):
            raise ArithmeticError(f"{name} fails at {t}: {value}")
    start = ["0", "0"]
    return case(name, source, states, [
        zone(f"{left} = {right}", "enters", start), zone(f"{left} >= {right}", "enters", start), zone(f"{left} <= {right}", "enters", start),
        zone(f"{left} > {right}", "clear"), zone(f"{left} < {right}", "clear"), zone(f"not {left} = {right}", "clear"),
        zone(f"{left} = {right}", "enters", ["22/7", "22/7"], F(22, 7)), zone(f"{left} > {right}", "clear", None, F(22, 7), F(30)),
        zone(f"{left} >= {right} + 1/1000000000", "clear"), zone(f"{left} > {right} - 1/1000000000", "enters", start),
    ])


def identities():
    table = "Abramowitz & Stegun, Handbook of Mathematical Functions, sec. 4.3 and 4.5 (memory)"
    own = "direct: both sides have the same closed form"
    one = oscillator("c", 1, 1, 0)
    root2 = arb(2).sqrt()
    cos = lambda w: (lambda t: (w * t).cos())
    sin = lambda w: (lambda t: (w * t).sin())
    exp = lambda r: (lambda t: (r * t).exp())
    return [
        identity("squares of cosine and sine", table, one, "c^2 + c_^2", "1", [cos(1), sin(1)], lambda c, s: c * c + s * s - 1),
        identity("the same with frequency sqrt(2)", table, oscillator("c", 2, 1, 0), "2*c^2 + c_^2", "2", [cos(root2), sin(root2)], lambda c, s: 2 * c * c + 2 * s * s - 2),
        identity("triple angle", table, oscillator("p", 1, 0, 1) + oscillator("r", 9, 0, 3), "r", "3*p - 4*p^3", [sin(1), sin(3)], lambda p, r: r - 3 * p + 4 * p**3),
        identity("double angle", table, oscillator("c", 1, 1, 0) + oscillator("d", 4, 1, 0), "d", "2*c^2 - 1", [cos(1), cos(2)], lambda c, d: d - 2 * c * c + 1),
        identity("fifth Chebyshev polynomial", table, oscillator("c", 1, 1, 0) + oscillator("d", 25, 1, 0), "d", "16*c^5 - 20*c^3 + 5*c", [cos(1), cos(5)], lambda c, d: d - 16 * c**5 + 20 * c**3 - 5 * c),
        identity("growth times decay", own, [["g", "1", "g"], ["d", "1", "-d"]], "g*d", "1", [exp(1), exp(-1)], lambda g, d: g * d - 1),
        identity("hyperbolic functions", table, [["c", "1", "s"], ["s", "0", "c"]], "c^2 - s^2", "1", [exp(1), exp(-1)], lambda g, d: ((g + d) / 2) ** 2 - ((g - d) / 2) ** 2 - 1),
        identity("amplitude of a damped oscillation", own, [["x", "1", "-x + y"], ["y", "0", "-x - y"], ["z", "1", "-2*z"]], "x^2 + y^2", "z",
                 [cos(1), sin(1), exp(-1)], lambda c, s, d: (d * c) ** 2 + (d * s) ** 2 - d * d),
        identity("square of a critically damped response", own, [["x", "0", "-x + y"], ["y", "1", "-y"], ["a", "0", "-2*a + b"], ["b", "0", "-2*b + d"], ["d", "1", "-2*d"]], "x^2", "2*a",
                 [lambda t: t, exp(-1)], lambda t, d: (t * d) ** 2 - t * t * d * d),
        identity("product of two waves", table, oscillator("c", 1, 1, 0) + oscillator("d", 2, 1, 0) + [["u", "1", "u1"], ["u1", "0", "u2"], ["u2", "-3", "u3"], ["u3", "0", "-6*u2 - u"]], "u", "c*d",
                 [cos(1), cos(root2), cos(root2 + 1), cos(root2 - 1)], lambda c, d, a, b: (a + b) / 2 - c * d),
        identity("energy of two coupled oscillators", "x'' = -2x + y, y'' = x - 2y: the energy is constant", [["x", "1", "v"], ["v", "0", "-2*x + y"], ["y", "1/2", "w"], ["w", "1/3", "x - 2*y"]],
                 "v^2 + w^2 + 2*x^2 + 2*y^2 - 2*x*y", "29/18", [], lambda: arb(0)),
        identity("in step: one state written twice", own, [["x", "1", "-x + y"], ["y", "2", "-3*x + y"], ["z", "1", "-z + w"], ["w", "2", "-3*z + w"]], "x*w", "y*z", [], lambda: arb(0)),
    ]


# trigonometric_extremes

def harmonics(cosines, sines):
    """States c1, s1, c2, ... with ck = cos(k t), sk = sin(k t) for the frequencies used; the polynomial as text."""
    states, text = [], []
    for k in sorted({*cosines, *sines}):
        states += [[f"c{k}", "1", f"-{k}*s{k}"], [f"s{k}", "0", f"{k}*c{k}"]]
        text += [f"({F(a[k])})*{x}{k}" for a, x in ((cosines, "c"), (sines, "s")) if k in a]
    return states, " + ".join(text)


def minimum(cosines, sines):
    """The minimal polynomial of the least value, its enclosure, and how often it is taken in a period."""
    u, m = sympy.symbols("u m")
    order = max([*cosines, *sines])
    # exp(i t) = (1 + i u)^2 / (1 + u^2)
    numerator = -m * (1 + u**2) ** order
    for k in range(1, order + 1):
        power = sympy.Poly(sympy.expand((1 + sympy.I * u) ** (2 * k)), u)
        real = sum(sympy.re(c) * u ** e[0] for e, c in power.terms())
        imaginary = sum(sympy.im(c) * u ** e[0] for e, c in power.terms())
        for a, part in ((cosines, real), (sines, imaginary)):
            if k in a:
                numerator += sympy.Rational(F(a[k]).numerator, F(a[k]).denominator) * part * (1 + u**2) ** (order - k)
    numerator = sympy.Poly(sympy.expand(numerator), u)
    resultant = sympy.resultant(numerator, numerator.diff(u), u)
    # t = pi is u = infinity: its value may be the least one, too
    at_pi = sum(F(a) * (-1) ** k for k, a in cosines.items())
    factors = [sympy.Poly(p, m) for p, _ in sympy.factor_list(resultant, m)[1]] + [sympy.Poly(m * at_pi.denominator - at_pi.numerator, m)]
    least = least_value(cosines, sines)
    fits = {p for p in factors if p.degree() > 0 and evaluated(p, least).contains(0)}
    if len(fits) != 1:
        raise ArithmeticError(f"{len(fits)} factors vanish at {least}")
    return fits.pop(), least


def evaluated(p, x):
    total = arb(0)
    for c in p.all_coeffs():
        total = total * x + rational(F(int(c.p), int(c.q)))
    return total


def least_value(cosines, sines):
    """The least value as a ball, by isolation of the derivative's zeros over a period from 1/3 on."""
    def series(t, n):
        total = arb(0)
        for a, shift in ((cosines, 0), (sines, -1)):
            for k, x in a.items():
                # derivatives of cos(k t + shift pi/2), by quarter turns
                turn = (n + shift) % 4
                wave = [(t * k).cos, lambda k=k: -(t * k).sin(), lambda k=k: -(t * k).cos(), (t * k).sin][turn]()
                total += rational(F(x) * F(k) ** n) * wave
        return total

    start = rational(F(1, 3))
    found = zeros(lambda t: series(t, 1), lambda t: series(t, 2), start, (start + 2 * arb.pi()).mid())
    values = [series(a, 0) + series(a.union(b), 1) * (b - a) * arb(0, 1) for a, b, _ in found]
    return min(values, key=lambda v: v.mid())


EXTREMES = [
    ("cos t + cos 2t", {1: 1, 2: 1}, {}), ("cos t + cos 2t + cos 3t", {1: 1, 2: 1, 3: 1}, {}), ("sin t + sin 2t", {}, {1: 1, 2: 1}), ("5 cos t + cos 2t", {1: 5, 2: 1}, {}),
    ("Fejer kernel of order 3", {1: F(3, 2), 2: 1, 3: F(1, 2)}, {}), ("cos 2t - 2 sin 3t", {2: 1}, {3: -2}), ("cos t + 2 sin 3t", {1: 1}, {3: 2}), ("cos 3t + cos 4t", {3: 1, 4: 1}, {}),
    ("sin t + sin 2t / 2 + sin 3t / 3", {}, {1: 1, 2: F(1, 2), 3: F(1, 3)}), ("2 cos t + 3 cos 2t - sin t", {1: 2, 2: 3}, {1: -1}),
]


def trigonometric_extremes():
    cases = []
    for name, cosines, sines in EXTREMES:
        p, least = minimum(cosines, sines)
        states, text = harmonics(cosines, sines)
        if p.degree() == 1:
            a, b = p.all_coeffs()
            m = F(int((-b / a).p), int((-b / a).q))
            zones = [zone(f"{text} <= ({m})", "enters"), zone(f"{text} < ({m})", "clear"), zone(f"{text} = ({m})", "enters"), zone(f"not {text} >= ({m})", "clear")]
            low = high = m
        else:
            low, high = ends(least)
            low, high = F(low * 10**20).__floor__() * F(1, 10**20), F(high * 10**20).__ceil__() * F(1, 10**20)
            zones = []
        zones += [zone(f"{text} <= ({low - BILLIONTH})", "clear"), zone(f"{text} < ({high + BILLIONTH})", "enters")]
        made = case(name, "own; discriminant by SymPy, minimum by python-flint", states, zones)
        cases.append({**made, "minimal_polynomial": [str(c) for c in reversed(p.all_coeffs())], "minimum": bounds(least, 30)})
    return cases


# dense_orbits and late_entries

class Waves:
    """sum A_k sin(w_k t + phase_k), w_k = sqrt(square), from rational starts and speeds; A_k rational."""

    def __init__(self, *parts):
        self.parts, self.waves, self.amplitude = parts, [], F(0)
        for square, start, speed in parts:
            size = F(start) ** 2 + F(speed) ** 2 / square
            root = F(sympy.sqrt(sympy.Rational(size.numerator, size.denominator)).p, sympy.sqrt(sympy.Rational(size.numerator, size.denominator)).q)
            self.amplitude += root
            self.waves.append((rational(square).sqrt(), rational(root), rational(F(start)), rational(F(speed)) / rational(square).sqrt()))

    def states(self):
        return [s for i, (square, start, speed) in enumerate(self.parts) for s in oscillator("xyz"[i], square, start, speed)]

    def text(self):
        return " + ".join("xyz"[: len(self.parts)])

    def at(self, t, n=0):
        total = arb(0)
        for w, _, start, speed in self.waves:
            c, s = (w * t).cos(), (w * t).sin()
            total += w**n * [start * c + speed * s, speed * c - start * s, -start * c - speed * s, start * s - speed * c][n % 4]
        return total

    def crest(self):
        """The time of the first wave's first crest at t >= 0, and its period."""
        w, _, start, speed = self.waves[0]
        angle = acb(start, speed).arg()
        return (angle if angle >= 0 else angle + 2 * arb.pi()) / w, 2 * arb.pi() / w

    def first_entry(self, level, begin, end):
        """The first zero of f - level in [begin, end], where f is below before; in a ball. None if there is none."""
        w, size, *_ = self.waves[0]
        depth = rational(self.amplitude - F(level))
        half = (1 - depth / size).acos() / w  # the first wave is within `depth` of its crest
        crest, period = self.crest()
        for k in range(int((end - begin) / float(period.mid())) + 2):
            a, b = crest + k * period - half, crest + k * period + half
            if ends(b)[1] < begin:
                continue
            if ends(a)[0] > end:
                return None
            low, high = ends(a)[0], ends(b)[1]
            found = self.crossing(level, arb(rational(max(low, F(begin)))).mid(), arb(rational(min(high, F(end)))).mid())
            if found is not None:
                return found
        return None

    def crossing(self, level, a, b):
        f = lambda t: self.at(t) - rational(level)
        middle = ((a + b) / 2).mid()
        cell = a.union(b)
        if f(middle) + abs(self.at(middle, 1)).upper() * (b - a) / 2 + abs(self.at(cell, 2)).upper() * (b - a) ** 2 / 8 < 0:
            return None
        found = zeros(f, lambda t: self.at(t, 1), a, b)
        return found[0][0].union(found[0][1]) if found else None


TWO = Waves((1, F(3, 5), F(4, 5)), (2, F(1, 3), F(4, 3)))
SYSTEMS = [
    ("rational data, frequencies 1 and sqrt(2)", TWO),
    ("frequencies 1 and sqrt(3)", Waves((1, F(-5, 13), F(12, 13)), (3, F(-1), F(0)))),
    ("frequencies sqrt(2) and sqrt(5)", Waves((2, F(-1, 3), F(-4, 3)), (5, F(2, 3), F(-5, 3)))),
    ("three frequencies 1, sqrt(2), sqrt(3)", Waves((1, F(-3, 5), F(4, 5)), (2, F(-1, 3), F(-4, 3)), (3, F(1, 2), F(3, 2)))),
]


def records(waves, start, end):
    """Records among the local maxima, in floats, as a guess: (the record before, time, the new record)."""
    import numpy as np

    times = np.arange(0, end, 0.02)
    value, slope, bend = np.zeros((3, len(times)))
    for w, _, a, b in waves.waves:
        w, a, b = float(w.mid()), float(a.mid()), float(b.mid())
        c, s = np.cos(w * times), np.sin(w * times)
        value, slope, bend = value + a * c + b * s, slope + w * (b * c - a * s), bend - w * w * (a * c + b * s)
    tops = np.flatnonzero((value[1:-1] > value[:-2]) & (value[1:-1] >= value[2:])) + 1
    peaks = value[tops] - slope[tops] ** 2 / (2 * bend[tops])
    before = np.concatenate([[-9.0], np.maximum.accumulate(peaks)[:-1]])
    return [(b, t, v) for b, t, v in zip(before, times[tops], peaks) if v > b and t > start]


def late_level(waves, start, end):
    """A level that is passed first between these times: two thirds of the way from one record to the next, where the step is the largest."""
    before, _, record = max(records(waves, start, end), key=lambda r: r[2] - r[0])
    gap = waves.amplitude - F((before + 2 * record) / 3)
    digits = 3
    while F(1, 10**digits) > gap / 100:
        digits += 1
    return F(round((waves.amplitude - gap) * 10**digits), 10**digits)


def late_cases():
    """Cases, and the same systems with what takes a program longer: that nothing is entered before."""
    source = "own; inhomogeneous approximation, searched crest by crest in balls"
    quick, long = [], []
    for name, waves in SYSTEMS:
        entries, stretches = [], []
        for start, end in ((1000, 10000), (10000, 100000)):
            inside = f"{waves.text()} >= {late_level(waves, start, end)}"
            time = waves.first_entry(late_level(waves, start, end), 0, end + 10)
            is_dear = end > 10000 or len(waves.parts) > 2
            (stretches if len(waves.parts) > 2 and end == 10000 else entries).append(zone(inside, "enters", bounds(time, 25)))
            (stretches if is_dear else entries).append(zone(inside, "clear", None, None, ends(time)[0].__floor__()))
        quick.append(case(name, source, waves.states(), entries))
        long.append(case(name, source, waves.states(), stretches))
    return quick, long


def late_entries():
    return late_cases()[0]


def late_stretches():
    return late_cases()[1]


CRESTS = Waves((1, F(1), F(0)), (2, F(1), F(0)))
THREE = Waves((1, F(1), F(0)), (2, F(1), F(0)), (3, F(1), F(0)))
KRONECKER = "Kronecker's theorem; own data"


def dense_orbits():
    crests = [
        zone("x + y >= 2", "enters", ["0", "0"]), zone("x + y > 2", "clear"), zone("x + y >= 2", "inseparable", None, 1), zone("x + y > 2", "clear", None, 1),
        zone("x + y >= 2.0000001", "clear"), zone("x + y >= 2", "clear", None, 1, 50),
    ]
    rational_data = [
        zone("x + y >= 2", "inseparable"), zone("x + y > 2", "clear"), zone("x + y >= 2.0001", "clear"),
        zone("x + y >= 1.99", "enters", bounds(TWO.first_entry(F(199, 100), 0, 1000), 25)), zone("x + y >= 2", "clear", None, 0, 100),
    ]
    three = [zone("x + y + z >= 3", "inseparable", None, 1), zone("x + y + z > 3", "clear"), zone("x + y + z >= 3.01", "clear")]
    return [
        case("crests together at t = 0", KRONECKER, CRESTS.states(), crests),
        case("crests together at no known time", KRONECKER, TWO.states(), rational_data),
        case("three frequencies", KRONECKER, THREE.states(), three),
    ]


def recurrences():
    """Returns close to where the motion was at t = 0; and waves that come up to their final height."""
    two = []
    for k in range(1, 5):
        level = 2 - F(1, 10**k)
        two.append(zone(f"x + y >= {level}", "enters", bounds(CRESTS.first_entry(level, F(1), F(100000)), 25), 1))
    three = [zone("x + y + z >= 2.9", "enters", bounds(THREE.first_entry(F(29, 10), F(1), F(100000)), 25), 1)]
    decay = [["x", "1", "2*v"], ["v", "1/2", "-x"], ["d", "1", "-d"]]
    root = arb(2).sqrt()
    f = lambda t: (root * t).cos() + (root * t).sin() / root - (-t).exp() - rational(F("1.2247448"))
    slope = lambda t: -root * (root * t).sin() + (root * t).cos() + (-t).exp()
    a, b, _ = zeros(f, slope, rational(0), rational(60))[0]
    return [
        case("crests together at t = 0", KRONECKER, CRESTS.states(), two),
        case("three frequencies", KRONECKER, THREE.states(), three),
        case("one frequency and a decay", "own; the limit's amplitude is sqrt(3/2)", decay, [zone("x - d >= 1.2247448", "enters", bounds(a.union(b), 25))]),
    ]


# transcendental_zeros

WAVE = [["c", "1", "-s"], ["s", "0", "c"]]
GROWTH = [["g", "1", "g"], ["d", "1", "-d"]]
BEAM = "roots of cosh x cos x = -1: 1.8751, 4.6941, 7.8548 seen in the user's guide of a signal conditioner (Vishay 2310, p. 97); cosh x cos x = 1: 4.730041 (memory)"
ZEROS = [
    ("clamped beam, free end", BEAM, WAVE + GROWTH, "c*(g + d) = -2", lambda t: (t.cosh() * t.cos() + 1), lambda t: t.sinh() * t.cos() - t.cosh() * t.sin(), [0, 2, 5], ["1.8751", "4.6941", "7.8548"]),
    ("clamped beam, both ends", BEAM, WAVE + GROWTH, "c*(g + d) = 2", lambda t: (t.cosh() * t.cos() - 1), lambda t: t.sinh() * t.cos() - t.cosh() * t.sin(), [1, 5], ["4.730041", "7.853205"]),
    ("tan x = x", "zeros of the spherical Bessel function j_1: 4.493409, 7.725252, 10.904122 (Abramowitz & Stegun, table 10.6, memory)", WAVE, "t*c = s", lambda t: t * t.cos() - t.sin(), lambda t: -t * t.sin(), [1, 5, 8], ["4.493409", "7.725252", "10.904122"]),
    ("displacement law of Wien", "5 - x = 5 exp(-x): x = 4.965114231744276 (memory)", GROWTH, "5 - t <= 5*d", lambda t: 5 - t - 5 * (-t).exp(), lambda t: -1 + 5 * (-t).exp(), [1], ["4.965114231744276"]),
    ("omega constant", "x exp(x) = 1: 0.567143290409784 (memory)", GROWTH, "t >= d", lambda t: t - (-t).exp(), lambda t: 1 + (-t).exp(), [0], ["0.567143290409784"]),
    ("fixed point of the cosine", "cos x = x: 0.739085133215161 (memory)", WAVE, "t >= c", lambda t: t - t.cos(), lambda t: 1 + t.sin(), [0], ["0.739085133215161"]),
    ("left for good by waves that come back", "cos t + cos(sqrt(2) t) - 2 + exp(-t), own", oscillator("x", 1, 1, 0) + oscillator("y", 2, 1, 0) + [["d", "1", "-d"]], "x + y + d < 2",
     lambda t: t.cos() + (t * arb(2).sqrt()).cos() - 2 + (-t).exp(), lambda t: -t.sin() - arb(2).sqrt() * (t * arb(2).sqrt()).sin() - (-t).exp(), [F(1, 10)], ["0.616"]),
]


def transcendental_zeros():
    cases = []
    for name, source, states, text, f, slope, starts, quoted in ZEROS:
        zones = []
        for start, digits in zip(starts, quoted):
            a, b, _ = zeros(f, slope, rational(F(start)), rational(F(start)) + 6)[0]
            pair = bounds(a.union(b), 25)
            if abs(F(pair[0]) - F(digits)) > F(1, 10 ** len(digits.partition(".")[2])):
                raise ArithmeticError(f"{name}: {digits} quoted, {pair} derived")
            zones.append(zone(text, "enters", pair, start))
            zones.append(zone(text, "clear", None, start, F(pair[0]) - BILLIONTH))
        cases.append(case(name, source, states, zones))
    return cases
