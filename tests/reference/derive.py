"""Derives the outside values that the tests compare with, using python-flint (Arb balls) and the closed forms of textbooks.

    python3 -m venv venv && venv/bin/pip install -r requirements.txt && venv/bin/python derive.py

writes values.json beside this file. The tests read that file; they do not need Python. Each group of values names its source.
All balls are printed as rigorous decimals [lower, upper].
"""

import json
import random
from fractions import Fraction as F
from math import factorial, lcm
from pathlib import Path

from flint import acb, acb_poly, arb, arb_mat, ctx, fmpq, fmpq_mat, fmpz_mat, fmpz_poly

HERE = Path(__file__).parent
ctx.prec = 500


def ball(x, digits=40):
    """A ball as decimals below and above it."""
    x = arb(x)
    scale = 10**digits

    def exact(end):
        mantissa, exponent = end.man_exp()
        return F(int(mantissa)) * F(2) ** int(exponent)

    low, high = exact(x.lower()), exact(x.upper())
    return [str(F((low * scale).__floor__(), scale)), str(F((high * scale).__ceil__(), scale))]


def rational(q):
    q = F(q)
    return arb(q.numerator) / arb(q.denominator)


def matrix(rows):
    return arb_mat([[rational(v) for v in row] for row in rows])


# ---- step responses ---------------------------------------------------------------------------------------------


def step_supremum(denominator):
    """All-time supremum of the unit step response of d_0 / (s^n + d_(n-1) s^(n-1) + ... + d_0), and the time where it is attained.

    y' is the impulse response sum c_k exp(mu_k t); its sign changes are isolated on [0, 60 time constants], each critical value is
    enclosed, and all peaks are compared.
    """
    d = [F(x) for x in denominator]
    n = len(d)
    poly = acb_poly([acb(rational(x)) for x in d] + [acb(1)])
    common = lcm(*(x.denominator for x in d))
    integers = fmpz_poly([int(x * common) for x in d] + [common])
    roots = [root for root, _ in integers.complex_roots()]
    # h(t) = sum d_0 / q'(mu) exp(mu t), y(t) = 1 + sum d_0 / (mu q'(mu)) exp(mu t)
    derivative = poly.derivative()
    residues = [acb(rational(d[0])) / derivative(mu) for mu in roots]

    def h(t):
        return sum((c * (mu * t).exp() for c, mu in zip(residues, roots)), acb(0)).real

    def y(t):
        return (acb(1) + sum((c / mu * (mu * t).exp() for c, mu in zip(residues, roots)), acb(0))).real

    slowest = min(-float(mu.real) for mu in roots)
    fastest = max(abs(complex(mu)) for mu in roots)
    horizon, step = 30 / slowest, 0.05 / fastest
    best, where = arb(1), None
    steps = int(horizon / step)
    previous = None
    for k in range(1, steps):
        t = arb(k) * arb(step)
        sign = 1 if h(t) > 0 else -1
        if previous == 1 and sign == -1:
            a, b = (k - 1) * step, k * step
            a, b = arb(a), arb(b)
            for _ in range(220):
                m = ((a + b) / 2).mid()
                value = h(m)
                if value > 0:
                    a = m
                elif value < 0:
                    b = m
                else:
                    break
            t_star = a.union(b)
            # y is stationary there: evaluate at the middle, error at most |b - a| * sup |h|, far below the digits kept.
            value = y(((a + b) / 2).mid()) + arb(0, abs(float(b - a)) + 1e-60)
            if value > best:
                best, where = value, t_star
        previous = sign
    return best, where


def bessel(n):
    c = [F(factorial(2 * n - k), 2 ** (n - k) * factorial(k) * factorial(n - k)) for k in range(n + 1)]
    return [x / c[n] for x in c[:n]]


def step_responses():
    cases = {f"bessel {n}": bessel(n) for n in range(2, 7)}
    cases["butterworth 3"] = [F(1), F(2), F(2)]
    itae = {2: ["1", "1.4"], 3: ["1", "2.15", "1.75"], 4: ["1", "2.7", "3.4", "2.1"], 5: ["1", "3.4", "5.5", "5", "2.8"]}
    for n, c in itae.items():
        cases[f"itae {n}"] = [F(x) for x in c]
    for z in ["1/10", "1/5", "3/10", "1/2", "3/5", "4/5"]:
        cases[f"damping ratio {z}"] = [F(1), 2 * F(z)]
    cases["6 s + 25"] = [F(25), F(6)]
    result = []
    for name, denominator in cases.items():
        value, where = step_supremum(denominator)
        result.append({"name": name, "denominator": [str(x) for x in denominator], "supremum": ball(value, 24), "time": ball(where, 20)})
    # the closed form of the second-order overshoot, exp(-pi z / sqrt(1 - z^2)) (textbook), must lie in the same balls
    for case in result:
        if case["name"].startswith("damping"):
            z = rational(case["name"].split()[-1])
            exact = 1 + (-arb.pi() * z / (1 - z * z).sqrt()).exp()
            low, high = (rational(x) for x in case["supremum"])
            assert low < exact < high, case
    return result


# ---- matrix exponentials ----------------------------------------------------------------------------------------


def slicot(name, skip):
    """The numbers of a SLICOT reference example's data file, read exactly."""
    text = (HERE.parent / "data" / "slicot_ref" / name).read_text().split()
    return [F(w.replace("D", "e").replace("d", "e")) if not w.isalpha() else w for w in text[skip:]]


def exponentials():
    matrices = {
        "Moler & Van Loan, doi:10.1137/S00361445024180": [["-49", "24"], ["-64", "31"]],
        "Moler & Van Loan, nilpotent": [["0", "6", "0", "0"], ["0", "0", "6", "0"], ["0", "0", "0", "6"], ["0", "0", "0", "0"]],
        "Laub, SIAM Rev. 52(4):779-781": [["0", "1"], ["-39", "-40"]],
        "Ward, SINUM 14:600-610, example 1": [["4", "2", "0"], ["1", "4", "1"], ["1", "1", "4"]],
        "Ward, SINUM 14:600-610, example 3": [["-131", "19", "18"], ["-390", "56", "54"], ["-387", "57", "52"]],
        "textbook Jordan block": [["21", "17", "6"], ["-5", "-1", "-6"], ["4", "4", "16"]],
        "real Jordan block": [["-1", "2", "1", "0"], ["-2", "-1", "0", "1"], ["0", "0", "-1", "2"], ["0", "0", "-2", "-1"]],
    }
    result = []
    for source, rows in matrices.items():
        for t in ["1/10", "1", "5/2"]:
            value = (matrix(rows) * rational(t)).exp()
            n = len(rows)
            entries = [[ball(value[i, j]) for j in range(n)] for i in range(n)]
            result.append({"source": source, "a": rows, "t": t, "exp": entries})
    return result


# ---- interval functions -----------------------------------------------------------------------------------------


def functions():
    points = ["0", "1", "-1", "1/3", "-1/3", "1/1000000", "-1/1000000", "1/1267650600228229401496703205376", "7/2", "-7/2", "10", "-10",
              "22/7", "-22/7", "355/113", "100", "-100", "1000", "-1000", "-100000", "12345/67", "-98765/43", "1000000", "5/1024"]
    result = []
    for x in points:
        v = rational(x)
        entry = {"x": x, "cos": ball(v.cos(), 100), "sin": ball(v.sin(), 100)}
        if abs(F(x)) <= 1000:
            entry["exp"] = ball(v.exp(), 100 if F(x) <= 0 else 60)
        else:
            # scaled so that the digits mean something: exp(x) / 10^(order)
            entry["log_exp"] = x
        result.append(entry)
    return result


# ---- traces of random systems -----------------------------------------------------------------------------------


def random_traces():
    """Values of polynomials along exp(At) x0 at rational times, for random systems of all kinds of spectra."""
    rng = random.Random(20260)
    result = []
    while len(result) < 60:
        n = rng.randint(1, 5)
        kind = len(result) % 5
        a = [[F(rng.randint(-4, 4), rng.choice([1, 1, 2, 3])) for _ in range(n)] for _ in range(n)]
        if kind == 1:  # skew-symmetric: marginal
            a = [[F(0) if i == j else (a[i][j] if i < j else -a[j][i]) for j in range(n)] for i in range(n)]
        if kind == 2:  # upper triangular with equal diagonal: defective
            a = [[a[0][0] if i == j else (a[i][j] if i < j else F(0)) for j in range(n)] for i in range(n)]
        if kind == 3:  # shifted to the left: mostly stable
            a = [[a[i][j] - (4 if i == j else 0) for j in range(n)] for i in range(n)]
        start = [F(rng.randint(-3, 3), rng.choice([1, 2])) for _ in range(n)]
        terms = []
        for _ in range(rng.randint(1, 4)):
            powers = [0] * n
            for _ in range(rng.randint(0, 3)):
                powers[rng.randrange(n)] += 1
            c = F(rng.randint(-5, 5), rng.choice([1, 3]))
            if c and all(p != powers for _, p in terms):
                terms.append((c, powers))
        values = []
        for t in ["1/7", "1", "13/4", "10"]:
            x = (matrix(a) * rational(t)).exp() * arb_mat([[rational(s)] for s in start])
            value = arb(0)
            for c, powers in terms:
                product = rational(c)
                for i, k in enumerate(powers):
                    for _ in range(k):
                        product *= x[i, 0]
                value += product
            values.append({"t": t, "value": ball(value, 30)})
        result.append({"a": [[str(v) for v in row] for row in a], "start": [str(s) for s in start],
                       "terms": [[str(c), p] for c, p in terms], "values": values})
    return result


# ---- polynomials ------------------------------------------------------------------------------------------------


def factorisations():
    rng = random.Random(7)
    result = []
    for _ in range(60):
        p = fmpz_poly([1])
        for _ in range(rng.randint(1, 4)):
            p *= fmpz_poly([rng.randint(-9, 9) for _ in range(rng.randint(1, 4))] + [rng.randint(1, 5)]) ** rng.randint(1, 2)
        unit, factors = p.factor()
        entry = {"polynomial": [str(c) for c in p.coeffs()], "unit": str(unit),
                 "factors": sorted([[[str(c) for c in f.coeffs()], e] for f, e in factors])}
        result.append(entry)
    return result


def characteristic_polynomials():
    rng = random.Random(11)
    result = []
    for _ in range(20):
        n = rng.randint(1, 12)
        a = [[rng.randint(-99, 99) for _ in range(n)] for _ in range(n)]
        result.append({"a": a, "charpoly": [str(c) for c in fmpz_mat(a).charpoly().coeffs()]})
    return result


# ---- spectra of open models -------------------------------------------------------------------------------------


def market(name):
    lines = [l for l in (HERE.parent / "data" / name).read_text().splitlines() if l and not l.startswith("%")]
    rows, columns, _ = (int(x) for x in lines[0].split())
    a = [[F(0)] * columns for _ in range(rows)]
    for line in lines[1:]:
        i, j, v = line.split()
        a[int(i) - 1][int(j) - 1] = F(v)
    return a


def spectra():
    result = []
    for name in ["building_A.mtx", "distillation_A.mtx", "dlr_A.mtx", "jetengine_A.mtx"]:
        a = market(name)
        p = fmpq_mat([[fmpq(v.numerator, v.denominator) for v in row] for row in a]).charpoly()
        roots = [root for factor, _ in p.numer().factor_squarefree()[1] for root, _ in factor.complex_roots()]
        top = max(roots, key=lambda z: float(z.real))
        result.append({"model": name, "order": len(a), "abscissa": ball(top.real, 30)})
    return result


def main():
    values = {
        "step_responses": step_responses(),
        "exponentials": exponentials(),
        "functions": functions(),
        "traces": random_traces(),
        "factorisations": factorisations(),
        "characteristic_polynomials": characteristic_polynomials(),
        "spectra": spectra(),
    }
    (HERE / "values.json").write_text(json.dumps(values, indent=1) + "\n")


if __name__ == "__main__":
    main()
