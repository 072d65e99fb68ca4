"""A second opinion on worst cases that shares nothing with exponential_sum.py: the rows h exp(At) step by step with scipy's matrix exponential, the integral of
|h exp(A tau) b| by Gauss-Legendre between the sign changes. Floating point, no closed forms, no eigenvalues.
"""

import math

import numpy as np
from scipy.linalg import expm

NODES, WEIGHTS = np.polynomial.legendre.leggauss(12)


class Simulation:
    """Values of S on a grid of equal steps."""

    def __init__(self, model, h, h_drives, constant, end, steps):
        a, start, rows = model.augmented()
        self.a = np.array([[float(x) for x in row] for row in a])
        n, size = len(h), len(a)
        plain = np.array([float(x) for x in h] + [0.0] * (size - n))
        row = plain + sum((float(w) * np.array([float(x) for x in r]) for w, r in zip(h_drives, rows)), np.zeros(size))
        row[-1] += float(constant)
        self.step = float(end) / steps
        self.times = np.linspace(0, float(end), steps + 1)
        once = expm(self.a * self.step)
        full, own = [row], [plain]
        for _ in range(steps):
            full.append(full[-1] @ once)
            own.append(own[-1] @ once)
        self.own = np.array(own)
        self.values = np.array(full) @ np.array([float(x) for x in start])
        self.add_starts(model, n)
        for column, (_, lo, hi) in zip(model.e, model.disturbances):
            b = np.array([float(x) for x in column] + [0.0] * (size - n)) * (float(hi) - float(lo)) / 2
            self.values += np.concatenate([[0.0], np.cumsum(self.integrals(b))])

    def add_starts(self, model, n):
        f = self.own[:, :n]
        if model.box is not None:
            self.values += np.abs(f) @ np.array([float(hi - lo) / 2 for lo, hi in model.box])
        if model.ellipsoid:
            shape = np.array([[float(x) for x in row] for row in model.ellipsoid[1]])
            self.values += np.sqrt(np.maximum(0, np.einsum("ti,ij,tj->t", f, shape, f)))
        if model.points:
            self.values += np.max(f @ np.array([[float(x) for x in p] for p in model.points]).T, axis=1)

    def integrals(self, b):
        """The integral of |q| over each step."""
        inner = (NODES + 1) / 2 * self.step
        columns = np.array([expm(self.a * s) @ b for s in inner]).T
        q = self.own[:-1] @ columns
        total = np.abs(q) @ WEIGHTS * self.step / 2
        ends = self.own @ b
        whole = np.concatenate([ends[:-1, None], q, ends[1:, None]], axis=1)
        for i in np.flatnonzero((whole.min(axis=1) < 0) & (whole.max(axis=1) > 0)):
            total[i] = self.split(self.own[i], b, np.concatenate([[0.0], inner, [self.step]]), whole[i])
        return total

    def split(self, row, b, times, values):
        """The integral over one step in which q changes sign."""
        q = lambda s: row @ (expm(self.a * s) @ b)
        cuts = [0.0]
        for i in np.flatnonzero(values[:-1] * values[1:] < 0):
            low, high, left = times[i], times[i + 1], values[i]
            for _ in range(40):
                middle = (low + high) / 2
                low, high = (middle, high) if q(middle) * left > 0 else (low, middle)
            cuts.append((low + high) / 2)
        cuts.append(self.step)
        return sum(abs(sum(w * q((NODES[k] + 1) / 2 * (v - u) + u) for k, w in enumerate(WEIGHTS))) * (v - u) / 2 for u, v in zip(cuts, cuts[1:]))


def steps_for(model, end, most):
    a, _, _ = model.augmented()
    return int(min(most, max(200, math.ceil(float(end) * 4 * np.abs(np.linalg.eigvals(np.array([[float(x) for x in row] for row in a]))).max()))))


def disagreement(model, h, h_drives, constant, start, end, extreme, horizon, sign=1, most=20000):
    """How far a supremum (of sign h x) is from the simulation, relative to the values; None where there is too much to simulate.

    S at the time of the maximum is compared, or at the horizon for a limit that has no undamped part; and no value of the grid is beyond the supremum.
    """
    h, h_drives, constant = [sign * x for x in h], [sign * w for w in h_drives], sign * constant
    at = float(extreme.at) if extreme.at is not None else None
    last = float(end) if end is not None else max(horizon, 2 * (at or 0))
    if steps_for(model, last, math.inf) > most:
        return None
    s = Simulation(model, h, h_drives, constant, last, steps_for(model, last, most))
    inside = s.values[s.times >= float(start) - 1e-12]
    scale = np.abs(s.values).max() + 1e-4
    value = sign * float(extreme)
    beyond = max(0.0, (inside.max() - value) / scale)
    if at is None:
        return max(beyond, (value - inside.max()) / scale)
    there = Simulation(model, h, h_drives, constant, at, steps_for(model, at, most)).values[-1] if at > 0 else s.values[0]
    return max(beyond, abs(there - value) / scale)


def both_values(model, parts, share, t):
    """(g_1(x), g_2(x)), scaled, at the point x of the reachable set at t where share * g_1 + (1 - share) * g_2 is greatest: by a bang-bang signal on a fine grid."""
    a, start, rows = model.augmented()
    a, n, size = np.array(a, dtype=float), len(model.a), len(a)
    g = []
    for out, sign, level, unit in parts:
        row = np.array([float(x) for x in out.h] + [0.0] * (size - n)) + sum((float(w) * np.array(r, dtype=float) for w, r in zip(out.h_drives, rows)), np.zeros(size))
        row[-1] += float(out.constant - level)
        g.append(row * sign / float(unit))
    mix = float(share) * g[0] + (1 - float(share)) * g[1]
    whole = expm(a * t)
    x = whole @ best_start(model, mix @ whole, np.array(start, dtype=float), n)
    if model.e and t > 0:
        steps = 400
        once, own = expm(a * t / steps), np.array(mix)
        half = expm(a * t / steps / 2)
        columns = [np.array([float(v) for v in c] + [0.0] * (size - n)) * float(hi - lo) / 2 for c, (_, lo, hi) in zip(model.e, model.disturbances)]
        # tau runs back from t: the state reached gets exp(A tau) b w(t - tau) d tau, w constant on each step
        left = phi(a, t / steps)
        at = np.eye(size)
        for _ in range(steps):
            for b in columns:
                x += at @ left @ b * np.sign(own @ at @ half @ b)
            at = at @ once
    return [float(row @ x) for row in g]


def phi(a, s):
    """The integral of exp(A tau) over [0, s]."""
    n = len(a)
    big = np.zeros((2 * n, 2 * n))
    big[:n, :n], big[:n, n:] = a, np.eye(n)
    return expm(big * s)[:n, n:]


def best_start(model, row, centre, n):
    """The start at which the row is greatest."""
    x, h = centre.copy(), row[:n]
    if model.box is not None:
        x[:n] += np.sign(h) * np.array([float(hi - lo) / 2 for lo, hi in model.box])
    if model.ellipsoid:
        shape = np.array(model.ellipsoid[1], dtype=float)
        size = np.sqrt(max(0.0, h @ shape @ h))
        x[:n] += shape @ h / size if size > 0 else 0
    if model.points:
        points = np.array(model.points, dtype=float)
        x[:n] = points[np.argmax(points @ h)]
    return x
