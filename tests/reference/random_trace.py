"""Polynomials along trajectories of random rational systems, at rational times near and far.

A kind fixes the real Jordan form B: stable, unstable, marginal (no growth, no decay), defective (a block of size two or more), or commensurate
(frequencies that are rational multiples of one another). The system is A = P B P^-1 with a random integer P of determinant 1; every third
system of the stable, unstable and marginal kinds is a random matrix with irrational eigenvalues instead.
"""

import random
from fractions import Fraction as F

from flint import arb

from ball import bounds, is_sharp, matrix, rational, rational_matrix, sharpened, texts

SOURCE = "random system, seed 20260; values computed with Arb"
KINDS = ["stable", "unstable", "marginal", "defective", "commensurate"]
TIMES = ["1/7", "1", "13/4", "10"]
# Where the values are as large as 1e200 or as small as 1e-75, or thousands of turns have been made.
FAR = {"stable": "40", "unstable": "100", "marginal": "1000000", "defective": "1000", "commensurate": "100000/3"}
DIGITS, SMALLEST = 30, -90


def fraction(rng, low, high, denominators=(1, 2, 3)):
    return F(rng.randint(low, high), rng.choice(denominators))


def place(b, at, block):
    for i, row in enumerate(block):
        for j, v in enumerate(row):
            b[at + i][at + j] = v


def block(rng, kind, room):
    """A block of the real Jordan form of the kind, at most this large."""
    if kind == "defective":
        size = rng.randint(2, 4)
        rate = F(0) if rng.random() < 0.4 else -abs(fraction(rng, 1, 3)) / 100
        if size == 4 and room >= 4:
            w = F(rng.randint(1, 4), rng.choice((1, 2)))
            return [[rate, w, 1, 0], [-w, rate, 0, 1], [0, 0, rate, w], [0, 0, -w, rate]]
        size = min(size, room, 3)
        return [[rate if i == j else F(int(j == i + 1)) for j in range(size)] for i in range(size)]
    rate = {"stable": -fraction(rng, 1, 4), "unstable": fraction(rng, 1, 3, (2, 3, 5))}.get(kind, F(0))
    if kind == "commensurate" and rng.random() < 0.4:
        rate = -F(rng.randint(1, 3), 1000)
    if room >= 2 and (kind in ("marginal", "commensurate") or rng.random() < 0.5):
        w = rng.choice([F(1), F(2), F(3), F(1, 2), F(3, 2)]) if kind == "commensurate" else fraction(rng, 1, 6)
        return [[rate, w], [-w, rate]]
    return [[rate]]


def similarity(rng, n):
    """An integer matrix of determinant 1."""
    lower = [[int(i == j) or (rng.randint(-1, 1) if j < i else 0) for j in range(n)] for i in range(n)]
    upper = [[int(i == j) or (rng.randint(-1, 1) if j > i else 0) for j in range(n)] for i in range(n)]
    return rational_matrix(lower) * rational_matrix(upper)


def dense(rng, kind, n):
    """A random matrix of the kind: skew-symmetric, or random with its diagonal shifted."""
    a = [[fraction(rng, -4, 4) for _ in range(n)] for _ in range(n)]
    if kind == "marginal":
        return [[F(0) if i == j else a[i][j] if i < j else -a[j][i] for j in range(n)] for i in range(n)]
    shift = -4 * n if kind == "stable" else 0
    scale = F(1, 4) if kind == "unstable" else F(1, 3)
    return [[scale * (v + (shift if i == j else 0)) for j, v in enumerate(row)] for i, row in enumerate(a)]


def system(rng, kind, number):
    n = rng.randint(2 if kind in ("defective", "commensurate") else 1, 5)
    if kind in ("stable", "unstable", "marginal") and number // len(KINDS) % 3 == 2:
        return dense(rng, kind, max(n, 2))
    b, at = [[F(0)] * n for _ in range(n)], 0
    while at < n:
        part = block(rng, kind, n - at)
        place(b, at, part)
        at += len(part)
    p = similarity(rng, n)
    product = p * rational_matrix(b) * p.inv()
    return [[F(int(product[i, j].p), int(product[i, j].q)) for j in range(n)] for i in range(n)]


def polynomial(rng, n):
    """Up to four terms (coefficient, exponents) of degree at most three, the first not constant."""
    terms = []
    wanted = rng.randint(1, 4)
    while len(terms) < wanted:
        powers = [0] * n
        for _ in range(rng.randint(0 if terms else 1, 3)):
            powers[rng.randrange(n)] += 1
        c = F(rng.choice([-5, -4, -3, -2, -1, 1, 2, 3, 4, 5]), rng.choice([1, 3, 7]))
        if all(p != powers for _, p in terms):
            terms.append((c, powers))
        elif n == 1:
            wanted = min(wanted, len(terms))
    return terms


def value(a, start, terms, t):
    x = (matrix(a) * rational(t)).exp() * matrix([[s] for s in start])
    total = arb(0)
    for c, powers in terms:
        product = rational(c)
        for i, k in enumerate(powers):
            for _ in range(k):  # not **, which has no value for balls around 0
                product *= x[i, 0]
        total += product
    return total


def traces():
    rng = random.Random(20260)
    result = []
    for number in range(60):
        kind = KINDS[number % len(KINDS)]
        a = system(rng, kind, number)
        n = len(a)
        start = [F(rng.choice([-3, -2, -1, 1, 2, 3]) if i == 0 else rng.randint(-3, 3), rng.choice([1, 2])) for i in range(n)]
        terms = polynomial(rng, n)
        def at(t):
            ball = sharpened(lambda: value(a, start, terms, t), lambda v: is_sharp(v, DIGITS + 2, SMALLEST - 2))
            return {"t": t, "value": bounds(ball, DIGITS, SMALLEST)}
        result.append({"kind": kind, "source": SOURCE, "a": [texts(row) for row in a], "start": texts(start),
                       "terms": [[str(c), p] for c, p in terms], "values": [at(t) for t in TIMES], "far": [at(FAR[kind])]})
    return result
