"""Motion relative to a circular orbit (Clohessy-Wiltshire or Hill equations): the least distance to the centre of a keep-out sphere.

x'' = 3 n^2 x + 2 n y', y'' = -2 n x', z'' = -n^2 z. With u = n t and velocities over n, the closed form (any astrodynamics text) is
    x = (4 - 3 cos u) x0 + sin u vx + 2 (1 - cos u) vy
    y = 6 (sin u - u) x0 + y0 - 2 (1 - cos u) vx + (4 sin u - 3 u) vy
    z = cos u z0 + sin u vz;
free of drift iff 2 x0 + vy = 0, and then periodic: one period holds all times. With drift, y leaves every bound linearly, so that after
some u the distance stays above the least one found. The closed form must meet Arb's exponential of the system matrix.
"""

from fractions import Fraction as F

from flint import arb

from ball import bounds, matrix, rational, sign, texts, value_near, zeros

SOURCE = "Clohessy-Wiltshire equations (textbook closed form); least distance computed with Arb"
TIMES = ["0", "100", "5000/3", "20000", "1000000"]
# mean motion, start (x, y, z, x', y', z'), centre
CASES = [
    ("closed ellipse around the centre", "1/1000", ["100", "30", "20", "1/50", "-1/5", "1/40"], ["0", "0", "0"]),
    ("closed ellipse ahead of the centre", "1/1000", ["50", "400", "-35", "-3/100", "-1/10", "1/50"], ["0", "0", "0"]),
    ("closed ellipse in the plane", "11/10000", ["80", "12", "0", "1/80", "-22/125", "0"], ["10", "25", "0"]),
    ("closed ellipse out of the plane, shifted centre", "3/2500", ["-40", "-250", "60", "1/20", "12/125", "-1/25"], ["5", "-120", "-10"]),
    ("slow drift past the centre", "1/1000", ["20", "900", "15", "1/100", "-1/50", "1/100"], ["0", "0", "0"]),
    ("drift away from the centre", "1/1000", ["60", "-150", "10", "0", "0", "1/50"], ["0", "0", "0"]),
    ("drift towards the centre from below", "11/10000", ["-50", "-2000", "25", "1/40", "3/40", "-1/50"], ["0", "10", "0"]),
    ("drift by along-track speed alone", "7/6000", ["0", "-500", "0", "1/30", "-1/100", "1/60"], ["3", "4", "5"]),
]


class Motion:
    def __init__(self, mean_motion, start, centre):
        n = F(mean_motion)
        self.n, self.start = n, [F(v) for v in start]
        (self.x0, self.y0, self.z0), (self.vx, self.vy, self.vz) = self.start[:3], [v / n for v in self.start[3:]]
        self.centre = [rational(c) for c in centre]
        # each coordinate as constant + rate u + sine sin u + cosine cos u
        x0, y0, vx, vy = self.x0, self.y0, self.vx, self.vy
        exact = [
            (4 * x0 + 2 * vy, F(0), vx, -3 * x0 - 2 * vy),
            (y0 - 2 * vx, -6 * x0 - 3 * vy, 6 * x0 + 4 * vy, 2 * vx),
            (F(0), F(0), self.vz, self.z0),
        ]
        self.drift = exact[1][1]
        self.rows = [[rational(v) for v in row] for row in exact]

    def position(self, u):
        s, c = u.sin(), u.cos()
        return [k + r * u + a * s + b * c for k, r, a, b in self.rows]

    def offset(self, u):
        return [p - q for p, q in zip(self.position(u), self.centre)]

    def velocity(self, u):
        s, c = u.sin(), u.cos()
        return [r + a * c - b * s for _, r, a, b in self.rows]

    def acceleration(self, u):
        s, c = u.sin(), u.cos()
        return [-a * s - b * c for _, _, a, b in self.rows]

    def square(self, u):
        return sum((p * p for p in self.offset(u)), arb(0))

    def slope(self, u):
        return 2 * sum((p * v for p, v in zip(self.offset(u), self.velocity(u))), arb(0))

    def curvature(self, u):
        triples = zip(self.offset(u), self.velocity(u), self.acceleration(u))
        return 2 * sum((v * v + p * a for p, v, a in triples), arb(0))

    def horizon(self):
        """After this u nothing is as near as the start, or everything has been seen."""
        if self.drift == 0:
            return (2 * arb.pi()).upper()
        k, r, a, b = self.rows[1]
        reach = abs(k - self.centre[1]) + abs(a) + abs(b) + self.square(arb(0)).sqrt()
        return (reach / abs(r)).upper() + 1

    def nearest(self):
        """The least square of the distance, and u where it is first attained."""
        candidates = [(arb(0), self.square(arb(0)))]
        for a, b, left in zeros(self.slope, self.curvature, arb(0), self.horizon()):
            if left == -1:
                candidates.append((a.union(b), value_near(self.square, self.slope, a, b)))
        best = candidates[0]
        for candidate in candidates[1:]:
            if not sign(candidate[1] - best[1]):
                raise ArithmeticError("two minima are too close to be compared")
            best = candidate if candidate[1] < best[1] else best
        return best

    def system(self):
        n = self.n
        return [[0, 0, 0, 1, 0, 0], [0, 0, 0, 0, 1, 0], [0, 0, 0, 0, 0, 1],
                [3 * n * n, 0, 0, 0, 2 * n, 0], [0, 0, 0, -2 * n, 0, 0], [0, 0, -n * n, 0, 0, 0]]

    def positions(self):
        for t in TIMES:
            known = self.position(rational(self.n * F(t)))
            flow = (matrix(self.system()) * rational(t)).exp() * matrix([[v] for v in self.start])
            if not all(known[i].overlaps(flow[i, 0]) for i in range(3)):
                raise ArithmeticError("the closed form is not the flow")
            yield {"t": t, "position": [bounds(v, 30) for v in known]}


def relative_motion():
    result = []
    for name, mean_motion, start, centre in CASES:
        motion = Motion(mean_motion, start, centre)
        u, square = motion.nearest()
        result.append({
            "name": name, "source": SOURCE, "mean_motion": mean_motion, "start": start, "centre": centre,
            "drift_per_radian": str(motion.drift), "a": [texts(row) for row in motion.system()],
            "distance": bounds(square.sqrt(), 30), "distance_squared": bounds(square, 30), "time": bounds(u / rational(motion.n), 30),
            "positions": list(motion.positions()),
        })
    return result
