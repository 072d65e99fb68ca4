"""Exponentials exp(tA) of published matrices, and integrals of them.

Every entry comes from Arb's exponential of the rational matrix; where the source states a closed form, that is evaluated as well, and
the two balls must meet. The examples of the SLICOT reference must meet the four decimals printed with them.
"""

from fractions import Fraction as F
from pathlib import Path

from flint import arb, arb_mat

from ball import bounds, is_sharp, matrix, rational, sharpened, texts

DATA = Path(__file__).resolve().parent.parent / "data" / "slicot_ref"
TIMES = ["1/10", "1", "5/2", "7"]
DIGITS = 32


def e(rate, t):
    return (t * rate).exp()


def moler_van_loan(t):
    a, b = e(-1, t), e(-17, t)
    return [[3 * b - 2 * a, 3 * (a - b) / 2], [4 * b - 4 * a, 3 * a - 2 * b]]


def nilpotent(t):
    row = [arb(1), 6 * t, 18 * t**2, 36 * t**3]
    return [[arb(0)] * i + row[: 4 - i] for i in range(4)]


def laub(t):
    a, b = e(-1, t), e(-39, t)
    return [[(39 * a - b) / 38, (a - b) / 38], [(39 * b - 39 * a) / 38, (39 * b - a) / 38]]


def ward_1(t):
    a, b = e(6, t), e(3, t)
    return [[a / 3 + 2 * b / 3, 2 * t * b / 3 + 4 * a / 9 - 4 * b / 9, None], [None] * 3, [None] * 3]


def ward_3(t):
    a, b, c = e(-1, t), e(-2, t), e(-20, t)
    return [[7 * c - 3 * a - 3 * b, a - c, b - c], [None] * 3, [None] * 3]


def jordan(t):
    b = e(16, t)
    return [[None] * 3, [None] * 3, [4 * t * b, 4 * t * b, b]]


def real_jordan(t):
    d, c, s = e(-1, t), (2 * t).cos(), (2 * t).sin()
    rows = [[c, s, t * c, t * s], [-s, c, -t * s, t * c], [0, 0, c, s], [0, 0, -s, c]]
    return [[arb(v) * d for v in row] for row in rows]


CASES = [
    ("Moler & Van Loan, SIAM Rev. 45:3-49, doi:10.1137/S00361445024180", moler_van_loan, [[-49, 24], [-64, 31]]),
    ("Moler & Van Loan, SIAM Rev. 45:3-49, doi:10.1137/S00361445024180, nilpotent", nilpotent,
     [[0, 6, 0, 0], [0, 0, 6, 0], [0, 0, 0, 6], [0, 0, 0, 0]]),
    ("Laub, SIAM Rev. 52(4):779-781", laub, [[0, 1], [-39, -40]]),
    ("Ward, SIAM J. Numer. Anal. 14:600-610, example 1", ward_1, [[4, 2, 0], [1, 4, 1], [1, 1, 4]]),
    ("Ward, SIAM J. Numer. Anal. 14:600-610, example 3", ward_3, [[-131, 19, 18], [-390, 56, 54], [-387, 57, 52]]),
    ("textbook: Jordan block of size 2", jordan, [[21, 17, 6], [-5, -1, -6], [4, 4, 16]]),
    ("textbook: real Jordan block, a defective complex pair", real_jordan,
     [[-1, 2, 1, 0], [-2, -1, 0, 1], [0, 0, -1, 2], [0, 0, -2, -1]]),
]


def entries(m):
    return [[m[i, j] for j in range(m.ncols())] for i in range(m.nrows())]


def sharp(rows):
    return all(is_sharp(v, DIGITS + 2) for row in rows for v in row)


def exponential(a, t):
    return sharpened(lambda: entries((matrix(a) * rational(t)).exp()), sharp)


def integral(a, t):
    """The integral of exp(sA) over [0, t]: the upper right block of the exponential of [A I; 0 0]."""
    n = len(a)
    big = [list(row) + [int(i == j) for j in range(n)] for i, row in enumerate(a)] + [[0] * (2 * n)] * n
    return sharpened(lambda: [row[n:] for row in entries((matrix(big) * rational(t)).exp())[:n]], sharp)


def must_meet(computed, known, source):
    for row, other in zip(computed, known, strict=True):
        for value, expected in zip(row, other, strict=True):
            if expected is not None and not value.overlaps(arb(expected)):
                raise ArithmeticError(f"{source}: {value} is not {expected}")


def printed_rows(rows):
    return [[bounds(v, DIGITS) for v in row] for row in rows]


def slicot(name):
    """Matrix (its rows one after another, as the printed results confirm), time, and the matrices in the result file, as texts."""
    words = (DATA / f"{name}.dat").read_text().split()[4:]
    n, t = int(words[0]), words[1]
    numbers = words[2:] if name == "MB05MD" else words[3:]
    a = [[F(numbers[i * n + j]) for j in range(n)] for i in range(n)]
    blocks = []
    for block in (DATA / f"{name}.res").read_text().split("\n\n"):
        lines = block.splitlines()
        if lines and ("exp(A*DELTA) is" in lines[0] or "its integral" in lines[0]):
            blocks.append([line.split() for line in lines[1 : n + 1]])
    return a, F(t), blocks


def printed_ball(word):
    """What a number printed with four decimals may stand for."""
    return arb(rational(F(word)), rational(F(1, 20000) + F(1, 10**12)))


def slicot_examples():
    for name in ("MB05MD", "MB05ND", "MB05OD"):
        a, t, blocks = slicot(name)
        case = {"source": f"SLICOT reference example {name}, data/slicot_ref/{name}.dat and .res, BSD-3-Clause", "a": [texts(r) for r in a], "t": str(t)}
        exp = exponential(a, t)
        must_meet(exp, [[printed_ball(w) for w in row] for row in blocks[0]], name)
        case["exp"] = printed_rows(exp)
        case["printed_exp"] = blocks[0]
        if len(blocks) > 1:
            area = integral(a, t)
            must_meet(area, [[printed_ball(w) for w in row] for row in blocks[1]], name)
            case["integral"] = printed_rows(area)
            case["printed_integral"] = blocks[1]
        yield case


def exponentials():
    result = []
    for source, closed_form, a in CASES:
        for t in TIMES:
            exp = exponential(a, t)
            must_meet(exp, closed_form(rational(t)), source)
            result.append({"source": source, "a": [texts(r) for r in a], "t": t, "exp": printed_rows(exp)})
    return result + list(slicot_examples())
