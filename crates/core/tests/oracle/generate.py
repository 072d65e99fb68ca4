"""Writes the expected values in exponential.txt, roots.txt and factors.txt with python-flint (ball arithmetic, independent of this project).

Run: python generate.py, in an environment with python-flint 0.9. The files are committed: the tests need no Python.
exponential.txt: lines `n t e_11 .. e_nn | v_11 .. v_nn`, v = exp(A t) to 40 significant digits or to 1e-60.
roots.txt: lines `c_0 .. c_d | re,im re,im ..`, all complex roots to 40 digits.
factors.txt: lines `c_0 .. c_d | degree^multiplicity ..`, the irreducible factors.
"""

import random
from flint import arb_mat, arb, fmpq, fmpq_mat, fmpz_poly, ctx

ctx.dps = 120
random.seed(20240607)


def decimal(x):
    return x.str(40, radius=False)


def exponentials():
    lines = []
    for n in (1, 2, 3, 4, 5, 6, 8, 10):
        for size in (1, 20, 300):
            a = [fmpq(random.randint(-size, size), random.randint(1, 9)) for _ in range(n * n)]
            t = fmpq(random.randint(1, 9), random.randint(1, 9))
            m = arb_mat(fmpq_mat(n, n, [x * t for x in a]))
            ctx.dps = 120 + 10 * size
            m = arb_mat(fmpq_mat(n, n, [x * t for x in a])).exp()
            values = [decimal(m[i, j]) for i in range(n) for j in range(n)]
            ctx.dps = 120
            lines.append(" ".join([str(n), str(t)] + [str(x) for x in a] + ["|"] + values))
    return lines


def roots():
    lines = []
    for degree in (2, 3, 5, 8, 13, 21):
        for size in (3, 1000, 10**12):
            while True:
                p = fmpz_poly([random.randint(-size, size) for _ in range(degree)] + [random.randint(1, size)])
                if p.gcd(p.derivative()).degree() == 0:
                    break
            values = [f"{decimal(z.real)},{decimal(z.imag)}" for z, _ in p.complex_roots()]
            lines.append(" ".join([str(c) for c in p.coeffs()] + ["|"] + values))
    return lines


def factors():
    lines = []
    for k in range(150):
        p = fmpz_poly([1])
        for _ in range(random.randint(1, 4)):
            degree, size = random.randint(1, 6), random.choice((2, 9, 1000))
            part = fmpz_poly([random.randint(-size, size) for _ in range(degree)] + [random.randint(1, 3)])
            if k % 3 == 0:
                part = part(fmpz_poly([random.randint(-2, 2), 0, 1]))
            p *= part ** random.randint(1, 2)
        found = sorted((f.degree(), e) for f, e in p.factor()[1])
        lines.append(" ".join([str(c) for c in p.coeffs()] + ["|"] + [f"{d}^{e}" for d, e in found]))
    return lines


outputs = (("exponential.txt", exponentials()), ("roots.txt", roots()), ("factors.txt", factors()))
for name, lines in outputs:
    with open(name, "w") as f:
        f.write("\n".join(lines) + "\n")
