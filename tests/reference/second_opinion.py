"""A second opinion with mpmath at 60 to 500 digits: its own exponential, its own root finder, its own exp, cos and sin.

mpmath's results carry no proof; they must lie within 10^-20 (relative) of the proven bounds.
"""

from fractions import Fraction as F

import mpmath as mp

mp.mp.dps = 60
CLOSE = mp.mpf(10) ** -20


def number(q):
    q = F(q)
    return mp.mpf(q.numerator) / q.denominator


def near(pair, x):
    low, high = (number(end) for end in pair)
    slack = CLOSE * max(1, abs(high))
    return low - slack <= x <= high + slack


def exponentials(cases):
    for case in cases:
        a = mp.matrix([[number(v) for v in row] for row in case["a"]])
        exp = mp.expm(a * number(case["t"]), method="taylor")
        for i, row in enumerate(case["exp"]):
            for j, pair in enumerate(row):
                if not near(pair, exp[i, j]):
                    yield f"{case['source']}, t = {case['t']}: entry {i}, {j} is {exp[i, j]}"


def step_responses(cases):
    """At the time of the supremum, y is the supremum and h = y' is 0."""
    for case in cases:
        d = [number(v) for v in case["denominator"]]
        roots = mp.polyroots([1] + d[::-1], maxsteps=500, extraprec=500)
        weights = [d[0] / mp.polyval([(k + 1) * c for k, c in reversed(list(enumerate(d[1:] + [1])))], mu) for mu in roots]
        t = number(case["time"][0])
        rate = sum(c * mp.exp(mu * t) for c, mu in zip(weights, roots)).real
        value = 1 + sum(c / mu * mp.exp(mu * t) for c, mu in zip(weights, roots)).real
        if abs(rate) > CLOSE or not near(case["supremum"], value):
            yield f"{case['name']}: y = {value}, y' = {rate}"


def late_peaks(cases):
    yield from step_responses(cases)


def functions(cases):
    for case in cases:
        x = number(case["x"])
        for name in ("cos", "sin", "exp"):
            if name in case and not near(case[name], getattr(mp, name)(x)):
                yield f"{name} {case['x']}"


def exponential(a):
    """exp(a) by halving a until its norm is below 1, a Taylor sum, and squaring."""
    halvings = 0
    while mp.mnorm(a, 1) > 1:
        a /= 2
        halvings += 1
    e = mp.expm(a, method="taylor")
    for _ in range(halvings):
        e = e * e
    return e


def traces(cases):
    for position, case in enumerate(cases):
        for value in case["values"] + case["far"]:
            with mp.workdps(500 if value in case["far"] else 60):
                a = mp.matrix([[number(v) for v in row] for row in case["a"]])
                x = exponential(a * number(value["t"])) * mp.matrix([number(v) for v in case["start"]])
                total = mp.mpf(0)
                for c, powers in case["terms"]:
                    total += number(c) * mp.fprod(x[i] ** k for i, k in enumerate(powers))
                if not near(value["value"], total):
                    yield f"trace {position}, t = {value['t']}: {total}"


def relative_motion(cases):
    """The distance at the stated time by mpmath's exponential, and none below it among 4,000 samples over 40 radians."""
    for case in cases:
        a = mp.matrix([[number(v) for v in row] for row in case["a"]])
        start, centre = [[number(v) for v in case[key]] for key in ("start", "centre")]

        def distance(flow, start=start, centre=centre):
            x = flow * mp.matrix(start)
            return mp.sqrt(sum((x[i] - centre[i]) ** 2 for i in range(3)))

        if not near(case["distance"], distance(exponential(a * number(case["time"][0])))):
            yield f"{case['name']}: not the distance at the time"
        step = exponential(a * (1 / number(case["mean_motion"]) / 100))
        with mp.workdps(20):
            flow = mp.eye(6)
            for _ in range(4000):
                if distance(flow) < number(case["distance"][0]) * (1 - mp.mpf(10) ** -9):
                    yield f"{case['name']}: a smaller distance"
                    break
                flow = step * flow


def disagreements(values):
    for opinion in (exponentials, step_responses, late_peaks, functions, relative_motion, traces):
        yield from opinion(values[opinion.__name__])
