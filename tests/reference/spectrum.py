"""Spectra of the open models: from exact characteristic polynomials of the files' decimals, or from closed forms.

The three models that are formulas are generated here and in the tests from the same description; `trace`, `nonzeros` and `squares`
(sum of the squared entries) tell whether two generators agree.
"""

from fractions import Fraction as F
from pathlib import Path

from flint import acb, acb_poly, arb, ctx, fmpz_mat

from ball import bounds, rational, rational_matrix, text

DATA = Path(__file__).resolve().parent.parent / "data"
FILES = ["building_A.mtx", "distillation_A.mtx", "dlr_A.mtx", "jetengine_A.mtx"]
# Large, but made of small blocks that do not act on each other: the abscissa alone is kept.
BLOCK_FILES = ["cdplayer_A.mtx", "iss_A.mtx"]
CHAHLAOUI = "Chahlaoui & Van Dooren, SLICOT Working Note 2002-2; decimals read exactly, see data/README.md"


def market(name):
    """The matrix in a Matrix Market file, each decimal read exactly."""
    lines = [line for line in (DATA / name).read_text().splitlines() if line and not line.startswith("%")]
    rows, columns, count = (int(x) for x in lines[0].split())
    a = [[F(0)] * columns for _ in range(rows)]
    for line in lines[1 : count + 1]:
        i, j, v = line.split()
        a[int(i) - 1][int(j) - 1] += F(v)
    return a


def eigenvalues(a):
    """Disjoint balls around the distinct roots of the characteristic polynomial, with multiplicities, by growing real part."""
    p = rational_matrix(a).charpoly().numer()
    found = [(root, e) for factor, e in p.factor_squarefree()[1] for root, _ in factor.complex_roots()]
    if sum(e for _, e in found) != len(a):
        raise ArithmeticError("eigenvalues are missing")
    return sorted(found, key=lambda item: (float(item[0].real.mid()), float(item[0].imag.mid())))


def top(values):
    """The largest of some balls; equal ones (conjugates) may overlap."""
    best = max(values, key=lambda v: float(v.mid()))
    if any(not (v < best or v.overlaps(best)) for v in values):
        raise ArithmeticError("no largest value")
    for v in values:
        if v.overlaps(best):
            best = best.union(v)
    return best


def fingerprint(a):
    entries = [v for row in a for v in row if v]
    return {"trace": text(sum(a[i][i] for i in range(len(a)))), "nonzeros": str(len(entries)), "squares": text(sum(v * v for v in entries))}


def pair(z, digits):
    return {"re": bounds(z.real, digits), "im": bounds(z.imag, digits)}


def spectra_of_files():
    result = []
    for name in FILES:
        a = market(name)
        before, ctx.prec = ctx.prec, 256
        values = eigenvalues(a)
        result.append({
            "model": name, "source": CHAHLAOUI, "order": str(len(a)), "abscissa": bounds(top([z.real for z, _ in values]), 30), **fingerprint(a),
            "eigenvalues": [{**pair(z, 24), "multiplicity": str(e)} for z, e in values],
        })
        ctx.prec = before
    return result


def blocks(a):
    """The sets of indices that A does not connect."""
    label = list(range(len(a)))

    def root(i):
        while label[i] != i:
            i = label[i]
        return i

    for i, row in enumerate(a):
        for j, v in enumerate(row):
            if v:
                label[root(i)] = root(j)
    found = {}
    for i in range(len(a)):
        found.setdefault(root(i), []).append(i)
    return list(found.values())


def spectra_in_blocks():
    result = []
    for name in BLOCK_FILES:
        a = market(name)
        parts = blocks(a)
        reals = [z.real for part in parts for z, _ in eigenvalues([[a[i][j] for j in part] for i in part])]
        result.append({
            "model": name, "source": CHAHLAOUI, "order": str(len(a)), "abscissa": bounds(top(reals), 30), **fingerprint(a),
            "blocks": str(len(parts)), "largest_block": str(max(len(part) for part in parts)),
        })
    return result


def heat(n):
    """A = (n+1)^2/100 tridiag(1, -2, 1)."""
    unit = F((n + 1) ** 2, 100)
    return [[-2 * unit if i == j else unit if abs(i - j) == 1 else F(0) for j in range(n)] for i in range(n)]


def pde():
    """Twelve blocks of seven: tridiag(-9, -734, 171) in a block, 196 at distance seven."""
    def entry(i, j):
        if i == j:
            return F(-734)
        if abs(i - j) == 7:
            return F(196)
        if abs(i - j) == 1 and i // 7 == j // 7:
            return F(-9) if j < i else F(171)
        return F(0)
    return [[entry(i, j) for j in range(84)] for i in range(84)]


def fom():
    """The three rotating blocks and the diagonal -1, ..., -1000; B' = C = [10 (six times), 1 (a thousand times)]."""
    a = [[F(0)] * 1006 for _ in range(1006)]
    for k, w in enumerate((100, 200, 400)):
        i = 2 * k
        a[i][i], a[i][i + 1], a[i + 1][i], a[i + 1][i + 1] = F(-1), F(w), F(-w), F(-1)
    for k in range(1, 1001):
        a[5 + k][5 + k] = F(-k)
    return a


def heat_case(n):
    a = heat(n)
    values = [-4 * rational(F((n + 1) ** 2, 100)) * (arb.pi() * k / (2 * (n + 1))).sin() ** 2 for k in range(1, n + 1)]
    for k, value in enumerate(values, 1):  # A v = value v for v_i = sin(i k pi / (n + 1))
        v = [(arb.pi() * i * k / (n + 1)).sin() for i in range(n + 2)]
        unit = rational(F((n + 1) ** 2, 100))
        if not all((unit * (v[i - 1] - 2 * v[i] + v[i + 1]) - value * v[i]).contains(0) for i in range(1, n + 1)):
            raise ArithmeticError("heat: not an eigenvector")
    return {
        "model": f"heat {n}", "source": "Chahlaoui & Van Dooren, SLICOT Working Note 2002-2; closed form -4 (n+1)^2/100 sin^2(k pi / (2n+2)), k = 1..n",
        "order": str(n), **fingerprint(a), "abscissa": bounds(values[0], 30),
        "first": [bounds(v, 30) for v in values[:5]], "last": [bounds(v, 30) for v in values[-5:]],
    }


def pde_case():
    a = pde()
    root = arb(1539).sqrt()
    values = [acb(-734 + 392 * (arb.pi() * k / 13).cos(), 2 * root * (arb.pi() * j / 8).cos()) for j in range(1, 8) for k in range(1, 13)]
    for known, found in zip(fmpz_mat([[int(v) for v in row] for row in a]).charpoly().coeffs(), acb_poly.from_roots(values).coeffs(), strict=True):
        if not found.contains(acb(known)):
            raise ArithmeticError("pde: the closed form does not give the characteristic polynomial")
    return {
        "model": "pde", "source": "Chahlaoui & Van Dooren, SLICOT Working Note 2002-2; closed form -734 + 2i sqrt(1539) cos(j pi/8) + 392 cos(k pi/13)",
        "order": "84", **fingerprint(a), "abscissa": bounds(top([z.real for z in values]), 30),
        "eigenvalues": [{"j": str(1 + i // 12), "k": str(1 + i % 12), **pair(z, 30)} for i, z in enumerate(values)],
    }


def fom_case():
    def impulse(t):
        t = rational(t)
        first = 200 * (-t).exp() * sum(((w * t).cos() for w in (100, 200, 400)), arb(0))
        return first + sum(((-k * t).exp() for k in range(1, 1001)), arb(0))
    return {
        "model": "fom", "source": "Chahlaoui & Van Dooren, SLICOT Working Note 2002-2; closed form", "order": "1006", **fingerprint(fom()), "abscissa": ["-1", "-1"],
        "impulse_response": [{"t": t, "value": bounds(impulse(t), 30)} for t in ("0", "1/100", "1/7", "1", "10")],
    }


def spectra():
    before, ctx.prec = ctx.prec, 1024  # for the polynomial from 84 roots
    formulas = [heat_case(200), pde_case(), fom_case()]
    ctx.prec = before
    return spectra_of_files() + spectra_in_blocks() + formulas
