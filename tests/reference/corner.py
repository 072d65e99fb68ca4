"""How deep a reachable set gets into the corner of two half-spaces.

    depth = sup over t of max over x in R(t) of min_i s_i (h_i x - l_i) / u_i  =  sup over t of min over mu in [0, 1] of the support of mu g_1 + (1 - mu) g_2,

g_i the scaled functionals, because R(t) is compact and convex. The inner function is convex in mu: it is minimised by narrowing, the outer one on a fine grid of times,
then by narrowing both together.
"""

from fractions import Fraction as F

import numpy as np

from worst_case import Support, grid


class Corner:
    def __init__(self, model, parts):
        """`parts`: (output, sign, level, unit); inside where sign * (output - level) >= 0."""
        self.supports = []
        for out, sign, level, unit in parts:
            weight = F(sign) / unit
            self.supports.append(model.support([weight * x for x in out.h], [weight * x for x in out.h_drives], weight * (out.constant - level)))

    def joined(self, mu):
        """The support of mu g_1 + (1 - mu) g_2."""
        first, second = self.supports
        mix = lambda a, b: a.scaled(mu) + b.scaled(1 - mu)
        pairs = lambda a, b: [mix(x, y) for x, y in zip(a, b)]
        ellipsoid = first.ellipsoid and (first.ellipsoid[0], pairs(first.ellipsoid[1], second.ellipsoid[1]))
        return Support(mix(first.drift, second.drift), pairs(first.all_boxes, second.all_boxes), pairs(first.all_inputs, second.all_inputs), ellipsoid, pairs(first.hull, second.hull))

    def values(self, mu, times):
        support = self.joined(F(mu))
        support.prepared(float(times[-1]))
        return support.floats(times)


def depth(model, parts, start, end):
    """The depth as a float; None where it is not settled by the window or the horizon."""
    corner = Corner(model, parts)
    last = end
    if end is None:
        supports = corner.supports
        if any(root.growth >= 0 for s in supports for q in s.inputs for _, root in q.terms) or any(s.growing_terms() for s in supports):
            return None
        last = start + F(int(max(s.horizon() for s in supports)) + 1)
    roots = corner.supports[0].roots() | corner.supports[1].roots()
    times = grid(roots, float(start), float(last)) if last > start else np.array([float(start)])
    if len(times) > 40000:
        return None
    shares = np.linspace(0, 1, 17)
    table = np.array([corner.values(mu, times) for mu in shares])
    least = table.min(axis=0)
    best = None
    for i in separate(least, 3):
        t, mu = times[i], shares[table[:, i].argmin()]
        before, after = times[max(i - 1, 0)], times[min(i + 1, len(times) - 1)]
        found = narrowed(corner, t, mu, max(after - t, t - before), float(start), float(last))
        best = found if best is None else max(best, found)
    return best


def separate(values, count):
    """Indices of the highest local maxima."""
    padded = np.concatenate([[-np.inf], values, [-np.inf]])
    peaks = np.flatnonzero((padded[1:-1] >= padded[:-2]) & (padded[1:-1] >= padded[2:]))
    return peaks[np.argsort(values[peaks])[-count:]]


def narrowed(corner, t, mu, span, start, last):
    spread, value = 1 / 16, None
    for _ in range(16):
        times = np.unique(np.clip(t + span * np.linspace(-1, 1, 9), start, last))
        shares = np.unique(np.clip(mu + spread * np.linspace(-1, 1, 9), 0, 1))
        table = np.array([corner.values(share, times) for share in shares])
        least = table.min(axis=0)
        i = least.argmax()
        t, mu, value = times[i], shares[table[:, i].argmin()], least[i]
        span, spread = span / 2, spread / 3
    return float(value)
