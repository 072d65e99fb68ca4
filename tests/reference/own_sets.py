"""Small systems of our own with sets of starts, bounded disturbances and uncertain constants: worst cases in closed form where there is one.

A case names its model, the output by weights of states, drives and the constant, the window, and the closed forms (arb, "unbounded", or None where only the
cover of worst_case.py gives the value).
"""

from dataclasses import dataclass
from fractions import Fraction as F

from flint import arb

from exponential_sum import ball
from set_model import Drive, Model, affine

UNBOUNDED = "unbounded"


@dataclass
class Case:
    name: str
    model: Model
    h: list
    top: object = None
    low: object = None
    note: str = ""
    start: F = F(0)
    end: F | None = None
    h_drives: tuple = ()
    constant: F = F(0)

    def output(self):
        drives = [(w, d.name) for w, d in zip(self.h_drives, self.model.drives)]
        return affine([*zip(map(F, self.h), self.model.names), *drives], self.constant)


def fractions(rows):
    return [[F(x) for x in row] for row in rows]


def free(a, box=None, **more):
    return Model(fractions(a), [F(0)] * len(a), None if box is None else [(F(lo), F(hi)) for lo, hi in box], **more)


def overshoot(z):
    z = ball(z)
    return (-arb.pi() * z / (1 - z * z).sqrt()).exp()


def coth_norm(z):
    """The L1 norm of w^2/(s^2 + 2zws + w^2)."""
    z = ball(z)
    return (arb.pi() * z / (2 * (1 - z * z).sqrt())).coth()


def damping_loops():
    for z in ("3/10", "1/2", "3/5", "4/5"):
        z = F(z)
        model = free([[0, 1], [-1, -2 * z]], [(0, 0)] * 2, names=["y", "rate"], disturbances=[("u", F(-1), F(1))], e=[[F(0), F(1)]])
        yield Case(f"second order, damping ratio {z}", model, [1, 0], coth_norm(z), -coth_norm(z), "coth(pi z / (2 sqrt(1 - z^2))), approached")


def blade_loop():
    model = free([[0, 1], [-25, -6]], [(0, 0)] * 2, names=["angle", "speed"], drives=[Drive("command", [("const", F(1))])], b=[[F(0), F(25)]],
                 disturbances=[("gust", F(-1, 10), F(1, 10))], e=[[F(0), F(25)]])
    top = ball(F(11, 10)) * (1 + overshoot(F(3, 5)))
    yield Case("blade loop, step and gust", model, [1, 0], top, arb(0), "1.1 (1 + exp(-3 pi/4)) at t = pi/4; 0 at the start")
    yield Case("blade loop, tracking error", model, [-1, 0], None, None, "command - angle", h_drives=(1,))
    regulated = free([[0, 1], [-25, -6]], [("1/5", "3/10"), ("-1/2", "1/2")], names=["angle", "speed"], disturbances=[("gust", F(-1, 20), F(1, 10))], e=[[F(0), F(25)]])
    yield Case("blade loop, regulated", regulated, [1, 0], None, None)
    yield Case("blade loop, regulated, speed", regulated, [0, 1], None, None)


def damped_mass():
    model = free([[0, 1], [-25, "-3/5"]], [("-1/50", "1/20"), ("-1/10", "1/10")], names=["position", "velocity"], disturbances=[("gust", F(-3), F(8))], e=[[F(0), F(1, 2)]])
    yield Case("mass of 2 kg on a spring, gust", model, [1, 0])
    yield Case("mass of 2 kg on a spring, gust, up to 2 s", model, [1, 0], end=F(2))
    yield Case("mass of 2 kg on a spring, gust, force on the ground", model, [50, "6/5"])


def ladder():
    a = [[-2, 1, 0], [1, -2, 1], [0, 1, -1]]
    model = free(a, [(0, "1/2"), (0, "1/4"), (0, 0)], names=["v1", "v2", "v3"], disturbances=[("supply", F(9, 2), F(11, 2)), ("load", F(0), F(1, 5))],
                 e=[[F(1), F(0), F(0)], [F(0), F(0), F(-1)]])
    yield Case("RC ladder, supply and load", model, [0, 0, 1], ball(F(11, 2)), None, "11/2, approached: the steady state without load")
    yield Case("RC ladder, supply and load, after 20", model, [0, 0, 1], ball(F(11, 2)), None, "11/2, approached; the least value is at 20, below 39/10, its limit", start=F(20))
    yield Case("RC ladder, drop over the first resistor", model, [1, -1, 0])


def double_integrator():
    a, names = [[0, 1], [0, 0]], ["place", "pace"]
    free_fall = free(a, [(-1, 1), (0, 1)], names=names)
    yield Case("double integrator, free", free_fall, [1, 0], UNBOUNDED, arb(-1), "the pace is at least 0")
    yield Case("double integrator, free, up to 3", free_fall, [1, 0], arb(4), arb(-1), "1 + t; the least at the start", end=F(3))
    pushed = free(a, [(-1, 1), (0, 1)], names=names, disturbances=[("push", F(-1, 10), F(1, 10))], e=[[F(0), F(1)]])
    yield Case("double integrator, pushed, up to 3", pushed, [1, 0], ball(F(89, 20)), ball(F(-29, 20)), "1 + t + t^2/20 and -1 - t^2/20", end=F(3))
    yield Case("double integrator, pushed", pushed, [1, 0], UNBOUNDED, UNBOUNDED)
    yield Case("double integrator, pushed, pace", pushed, [0, 1], UNBOUNDED, UNBOUNDED)


def oscillator():
    a, names = [[0, 1], [-4, 0]], ["x", "v"]
    model = free(a, [("9/10", "11/10"), ("-1/5", "2/5")], names=names)
    top = arb(5).sqrt() / 2
    yield Case("undamped oscillator, box", model, [1, 0], top, -top, "sqrt(1.1^2 + 0.2^2) = sqrt(5)/2: the corner (1.1, 0.4)")
    yield Case("undamped oscillator, box, velocity", model, [0, 1], 2 * top, -2 * top, "sqrt(5)")
    yield Case("undamped oscillator, box, up to 1/10", model, [1, 0], None, None, "starts with v < 0 and v > 0", end=F(1, 10))
    gusty = free(a, [("9/10", "11/10"), ("-1/5", "2/5")], names=names, disturbances=[("w", F(-1, 100), F(1, 100))], e=[[F(0), F(1)]])
    yield Case("undamped oscillator, gust", gusty, [1, 0], UNBOUNDED, UNBOUNDED, "resonance")
    yield Case("undamped oscillator, gust, up to pi rounded up", gusty, [1, 0], None, None, end=F(355, 113))
    level = free(a, ellipsoid=([F(0), F(0)], fractions([[1, 0], [0, 4]])), names=names)
    yield Case("undamped oscillator, invariant ellipse", level, [1, 0], arb(1), arb(-1), "x^2 + v^2/4 is constant: 1 at each instant")
    moved = free(a, ellipsoid=([F(1), F(0)], fractions([["1/4", "1/10"], ["1/10", "1/2"]])), names=names)
    yield Case("undamped oscillator, ellipse", moved, [1, 0])
    hull = free(a, points=fractions([[1, 0], [0, 3], ["-1/2", "-1/2"]]), names=names)
    yield Case("undamped oscillator, triangle of starts", hull, [1, 0], ball(F(3, 2)), ball(F(-3, 2)), "the greatest amplitude of a corner: (0, 3)")
    damped = free([[0, 1], [-4, "-2/5"]], ellipsoid=([F(1), F(0)], fractions([["1/4", "1/10"], ["1/10", "1/2"]])), names=names, disturbances=[("w", F(-1, 5), F(3, 10))], e=[[F(0), F(1)]])
    yield Case("damped oscillator, ellipse and gust", damped, [1, 0])
    yield Case("damped oscillator, ellipse and gust, velocity", damped, [0, 1])


def orbit():
    """Clohessy-Wiltshire, mean motion n; the box allows a drift along the track, the other two axes stay bounded."""
    n = F("0.00113")
    a = [[0, 0, 0, 1, 0, 0], [0, 0, 0, 0, 1, 0], [0, 0, 0, 0, 0, 1], [3 * n * n, 0, 0, 0, 2 * n, 0], [0, 0, 0, -2 * n, 0, 0], [0, 0, -n * n, 0, 0, 0]]
    box = [(200, 220), (30, 40), (-60, -50), ("0.01", "0.03"), ("-0.4758", "-0.4734"), ("0.04", "0.06")]
    names = ["radial", "along", "cross", "radial_rate", "along_rate", "cross_rate"]
    model = free(a, box, names=names)
    side = (arb(3600) + ball(F(6, 100) / n) ** 2).sqrt()
    yield Case("relative orbit, radial", model, [1, 0, 0, 0, 0, 0])
    yield Case("relative orbit, along the track", model, [0, 1, 0, 0, 0, 0], UNBOUNDED, UNBOUNDED, "the box allows drifts of both signs")
    yield Case("relative orbit, along the track, up to 6000 s", model, [0, 1, 0, 0, 0, 0], end=F(6000))
    yield Case("relative orbit, across the track", model, [0, 0, 1, 0, 0, 0], side, -side, "sqrt(60^2 + (0.06/n)^2)")
    yield Case("relative orbit, invariant of the drift", model, [6 * n, 0, 0, 0, 3, 0], ball(6 * n * 220 - 3 * F("0.4734")), ball(6 * n * 200 - 3 * F("0.4758")), "6 n radial + 3 along_rate is constant")


def two_carts():
    """Carts of 1 and 2 kg, spring 3 N/m, damper 1/2 N s/m; an internal force of at most 2/5 N leaves the centre of mass alone."""
    a = [[0, 0, 1, 0], [0, 0, 0, 1], [-3, 3, "-1/2", "1/2"], ["3/2", "-3/2", "1/4", "-1/4"]]
    names, force = ["x1", "x2", "v1", "v2"], dict(disturbances=[("force", F(-2, 5), F(2, 5))], e=[[F(0), F(0), F(1), F(-1, 2)]])
    still = free(a, [(0, 0)] * 4, names=names, **force)
    root = (arb(8) - ball(F(1, 4))).sqrt()  # z = (1/2) / (2 sqrt(2)): z / sqrt(1 - z^2) = (1/2) / sqrt(8 - 1/4)
    norm = (arb.pi() / 4 / root).coth() * ball(F(2, 15))
    yield Case("two carts, distance", still, [1, -1, 0, 0], norm, -norm, "(2/5)/3 coth(pi z / (2 sqrt(1 - z^2))), z = 1/(4 sqrt 2), approached: the rigid motion cancels")
    yield Case("two carts, momentum", still, [0, 0, 1, 2], arb(0), arb(0), "constant")
    moving = free(a, [(0, "1/10"), (0, "1/10"), ("-1/20", "1/20"), ("1/50", "1/50")], names=names, **force)
    yield Case("two carts, boxes, distance", moving, [1, -1, 0, 0])
    yield Case("two carts, boxes, first cart", moving, [1, 0, 0, 0], UNBOUNDED, UNBOUNDED, "the centre of mass drifts either way")


def forced():
    model = free([[-1, 1], [0, -2]], [("-1/2", "1/2"), (0, 1)], names=["level", "flow"], drives=[Drive("feed", [("const", F(1)), ("sin", F(1, 2), F(3)), ("exp", F(-1), F(-1, 2))])],
                 b=[[F(1), F(0)]], disturbances=[("leak", F(0), F(1, 4))], e=[[F(-1), F(0)]])
    yield Case("fed tank, wave and leak", model, [1, 0], None, None, "greatest: 1 + (1/2)/sqrt(10), approached, or an earlier peak")


def cases():
    for group in (damping_loops, blade_loop, damped_mass, ladder, double_integrator, oscillator, orbit, two_carts, forced):
        yield from group()


@dataclass
class Uncertain:
    """Constants in ranges: `text` of the model, `at` gives the model for values of the constants, closed forms over all of them."""

    name: str
    text: str
    output: str
    h: list
    ranges: list
    at: object
    top: object
    low: object
    note: str
    start: F = F(0)
    end: F | None = None


def states(rows, more=""):
    return "".join(f'[state.{name}]\nstart = {start}\nrate = "{rate}"\n' for name, start, rate in rows) + more


def uncertain():
    spring = [("x", 0, "v"), ("v", 1, "-k*x")]
    yield Uncertain("uncertain stiffness", states(spring, "[uncertain.k]\nrange = [4, 9]\n"), "x", [1, 0], [(4, 9)],
                    lambda k: free([[0, 1], [-k, 0]], [(0, 0), (1, 1)]), ball(F(1, 2)), ball(F(-1, 2)), "1/sqrt(k) at k = 4")
    loop = [("angle", 0, "speed"), ("speed", 0, "25*(command - angle) - d*speed")]
    yield Uncertain("uncertain damping", states(loop, '[drive.command]\nsignal = "1"\n[uncertain.d]\nrange = [5, 7]\n'), "angle", [1, 0], [(5, 7)],
                    lambda d: Model(fractions([[0, 1], [-25, -d]]), [F(0), F(25)], [(F(0), F(0))] * 2), 1 + overshoot(F(1, 2)), arb(0), "1 + exp(-pi/sqrt 3) at d = 5")
    for words in ("", "varying = true\n"):
        name = "uncertain leak" + (", varying" if words else "")
        yield Uncertain(name, states([("level", "[1, 2]", "-p*level")], f"[uncertain.p]\nrange = [1, 2]\n{words}"), "level", [1], [(1, 2)],
                        lambda p: free([[-p]], [(1, 2)]), 2 * arb(-1).exp(), arb(-6).exp(), "2 exp(-1) at t = 1, exp(-6) at t = 3", F(1), F(3))
    yield Uncertain("uncertain gain", states([("x", 0, "-2*x + p*w")], "[disturbance.w]\nrange = [-1, 1]\n[uncertain.p]\nrange = [1, 3]\n"), "x", [1], [(1, 3)],
                    lambda p: free([[-2]], [(0, 0)], disturbances=[("w", F(-1), F(1))], e=[[F(p)]]), ball(F(3, 2)), ball(F(-3, 2)), "p/2 at p = 3, approached")
    mass = [("x", 0, "v"), ("v", 0, "(1 - v - k*x)/m")]
    yield Uncertain("uncertain mass and stiffness", states(mass, "[uncertain.m]\nrange = [1, 2]\n[uncertain.k]\nrange = [3, 5]\n"), "x", [1, 0], [(1, 2), (3, 5)],
                    lambda m, k: Model(fractions([[0, 1], [-k / m, -1 / m]]), [F(0), 1 / m], [(F(0), F(0))] * 2), (1 + (-arb.pi() / arb(23).sqrt()).exp()) / 3, arb(0),
                    "(1 + exp(-pi z/sqrt(1 - z^2)))/k, z = 1/(2 sqrt(k m)), at m = 2, k = 3")
    yield Uncertain("uncertain rest point", states([("x", 1, "1 - p*x")], "[uncertain.p]\nrange = [1, 2]\n"), "x", [1], [(1, 2)],
                    lambda p: Model([[-p]], [F(1)], [(F(1), F(1))]), arb(1), ball(F(1, 2)), "1/p: 1 throughout at p = 1, 1/2 approached at p = 2")


@dataclass
class Corner:
    """Two half-spaces with a common level a: `inside` with LEVEL in its place, (h, sign) of each, the greatest a at which it is reached or approached."""

    name: str
    model: Model
    inside: str
    sides: list
    top: object
    note: str


def corners():
    push = lambda a, e: free(a, [(0, 0)] * 2, names=["x1", "x2"], disturbances=[("w", F(-1), F(1))], e=[[F(x) for x in e]])
    yield Corner("mirrored states", push([[-1, 0], [0, -1]], [1, -1]), "x1 >= LEVEL and x2 >= LEVEL", [([1, 0], 1), ([0, 1], 1)], arb(0),
                 "x1 + x2 = 0 throughout, though each comes close to 1")
    disc = free([[0, 1], [-1, 0]], ellipsoid=([F(0), F(0)], fractions([[1, 0], [0, 1]])), names=["x", "v"])
    yield Corner("turning disc", disc, "x >= LEVEL and v >= LEVEL", [([1, 0], 1), ([0, 1], 1)], arb(2).sqrt() / 2, "the unit disc throughout: 1/sqrt 2")
    yield Corner("one input, two lags", push([[-1, 0], [0, -2]], [1, 2]), "x1 >= LEVEL and x2 <= -LEVEL", [([1, 0], 1), ([0, 1], -1)], arb(5).sqrt() - 2,
                 "w = 1 for long, then -1 for s: 2q - 1 = 1 - 2q^2, q = exp(-s): sqrt 5 - 2, approached")
