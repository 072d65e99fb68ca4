"""Factorisations of integer polynomials and characteristic polynomials of integer matrices, by FLINT."""

import random

from flint import fmpz_mat, fmpz_poly

FACTORED = "factored by FLINT"
CHARACTERISTIC = "random matrix, seed 11; characteristic polynomial by FLINT"


def product(factors):
    p = fmpz_poly([1])
    for f in factors:
        p *= f
    return p


def hard_cases():
    """Polynomials known for being awkward: many factors modulo every prime, close roots, large content, high multiplicity."""
    x = fmpz_poly([0, 1])
    yield from (x**n - 1 for n in (2, 6, 12, 15, 24, 30))
    yield from (x**n + 1 for n in (4, 8, 16))
    yield x**4 + 4
    yield x**4 - 10 * x**2 + 1  # minimal polynomial of sqrt 2 + sqrt 3: reducible modulo every prime
    yield fmpz_poly.swinnerton_dyer(3)
    yield fmpz_poly.swinnerton_dyer(4)
    yield fmpz_poly.swinnerton_dyer(3) * fmpz_poly.swinnerton_dyer(2)
    yield from (fmpz_poly.cyclotomic(n) for n in (1, 2, 7, 36, 105))
    yield from (fmpz_poly.chebyshev_t(n) for n in (9, 12))
    yield product([x - k for k in range(1, 13)])  # Wilkinson
    yield x**9 - 2 * (100 * x - 1) ** 2  # Mignotte: two roots very close
    yield (x - 1) ** 7 * (x + 1) ** 5 * (x**2 + 1) ** 3
    yield 360 * (2 * x - 3) ** 2 * (3 * x + 2)
    yield -7 * x**5
    yield fmpz_poly([10**30 + 57]) * (x**2 + x + 1)
    yield (10**20 * x + 1) * (x - 10**20)
    yield fmpz_poly([0, 1])
    yield fmpz_poly([-1, -1])
    yield fmpz_poly([12])
    yield x**3 - 2
    yield (x**3 - 2) ** 2 * (x**3 - 3)
    yield (x**2 - 2) * (x**2 - 3) * (x**2 - 6)
    yield (x**5 - x - 1) * (x**5 - x + 1)
    yield x**8 + x**7 - x**5 - x**4 - x**3 + x + 1  # cyclotomic 15 with x -> -x


def random_products():
    rng = random.Random(7)
    while True:
        factors = []
        for _ in range(rng.randint(1, 4)):
            factor = fmpz_poly([rng.randint(-9, 9) for _ in range(rng.randint(1, 4))] + [rng.randint(1, 5)])
            factors.append(factor ** rng.randint(1, 2))
        yield product(factors)


def factorisations():
    cases = list(hard_cases())
    cases += [p for p, _ in zip(random_products(), range(100 - len(cases)))]
    result = []
    for p in cases:
        unit, factors = p.factor()
        if fmpz_poly([unit]) * product([f**e for f, e in factors]) != p:
            raise ArithmeticError("not a factorisation")
        listed = [{"factor": [str(c) for c in f.coeffs()], "multiplicity": str(e)} for f, e in factors]
        listed.sort(key=lambda item: (len(item["factor"]), [int(c) for c in item["factor"]]))
        result.append({"source": FACTORED, "polynomial": [str(c) for c in p.coeffs()], "unit": str(unit), "factors": listed})
    return result


def characteristic_polynomials():
    rng = random.Random(11)
    result = []
    for _ in range(20):
        n = rng.randint(1, 12)
        a = [[rng.randint(-99, 99) for _ in range(n)] for _ in range(n)]
        coefficients = fmpz_mat(a).charpoly().coeffs()
        result.append({"source": CHARACTERISTIC, "a": [[str(v) for v in row] for row in a], "charpoly": [str(c) for c in coefficients]})
    return result
