"""Balls (python-flint's arb) and exact rationals: reading, printing, isolating zeros.

A printed value is a pair [lower, upper] of rationals between which the true number lies, proved by ball arithmetic. `bounds` refuses
a ball that is wider than the digits asked for, so that no printed pair is vacuous.
"""

from fractions import Fraction as F

from flint import arb, arb_mat, ctx, fmpq, fmpq_mat


# Closed forms are evaluated at this precision; `sharpened` raises it where it does not give the digits.
ctx.prec = 512


def exact(end):
    """The rational value of an exact ball."""
    mantissa, exponent = end.man_exp()
    return F(int(mantissa)) * F(2) ** int(exponent)


def ends(x):
    """The ends of a ball, exactly, whatever the precision."""
    middle, radius = exact(x.mid()), exact(x.rad())
    return middle - radius, middle + radius


def text(q):
    """A rational as p or p/q."""
    return str(F(q))


def texts(row):
    return [text(v) for v in row]


def rational(q):
    """The ball of a rational."""
    q = F(q)
    return arb(fmpq(q.numerator, q.denominator))


def matrix(rows):
    return arb_mat([[rational(v) for v in row] for row in rows])


def rational_matrix(rows):
    return fmpq_mat([[fmpq(F(v).numerator, F(v).denominator) for v in row] for row in rows])


def order_of(q):
    """The k with 10^k <= |q| < 10^(k+1); 0 for 0."""
    q = abs(F(q))
    if q == 0:
        return 0
    k = len(str(q.numerator)) - len(str(q.denominator))
    while F(10) ** k > q:
        k -= 1
    while F(10) ** (k + 1) <= q:
        k += 1
    return k


def is_sharp(x, digits, smallest=-80):
    """Whether a ball gives this many significant digits, or else digits down to 10^smallest."""
    if not x.is_finite():
        return False
    low, high = ends(x)
    return high - low <= F(10) ** max(order_of(max(abs(low), abs(high))) + 1 - digits, smallest)


def bounds(x, digits, smallest=-80):
    """A ball as [lower, upper], two rationals with a power of ten below, `digits` significant digits, none below 10^smallest."""
    if not is_sharp(x, digits + 1, smallest - 1):
        raise ArithmeticError(f"{x} does not give {digits} digits")
    low, high = ends(x)
    if low == high and low.denominator == 1 and abs(low) < 10**digits:
        return [str(low), str(low)]
    places = -max(order_of(max(abs(low), abs(high))) + 1 - digits, smallest)
    unit = F(10) ** -places
    below, above = (low / unit).__floor__(), (high / unit).__ceil__()
    if places > 0:
        return [f"{below}/{10**places}", f"{above}/{10**places}"]
    return [str(below * 10**-places), str(above * 10**-places)]


def sharpened(compute, sharp, first=512, last=1 << 17):
    """What `compute` returns at the first precision at which `sharp` is content with it."""
    before, ctx.prec = ctx.prec, first
    try:
        while ctx.prec <= last:
            value = compute()
            if sharp(value):
                return value
            ctx.prec *= 2
        raise ArithmeticError("no precision suffices")
    finally:
        ctx.prec = before


def sign(x):
    """1 or -1 if the ball has this sign for certain, else 0."""
    return 1 if x > 0 else -1 if x < 0 else 0


def zeros(f, slope, a, b):
    """All zeros of f in [a, b], each in a ball [lower, upper] that holds exactly one, in order, with the sign of f left of it.

    f and slope = f' map a ball to a ball that holds all values. A cell is done when f has no zero there, or when f' has none and the
    signs of f at the ends are known; else it is cut in two. Raises if a cell becomes smaller than 2^-60.
    """
    found, open_ = [], [(a, b)]
    while open_:
        a, b = open_.pop()
        cell, middle = a.union(b), (a * arb(0.53125) + b * arb(0.46875)).mid()
        rate = slope(cell)
        if sign(f(cell)) or sign(f(middle) + rate * (cell - middle)):
            continue
        left, right = sign(f(a)), sign(f(b))
        if sign(rate) and left and right:
            if left != right:
                found.append((*narrowed(f, a, b, left), left))
            continue
        if b - a < arb(2) ** -60:
            raise ArithmeticError(f"a zero near {a} is not simple")
        open_ += [(middle, b), (a, middle)]
    return found


def narrowed(f, a, b, left):
    """Bisects [a, b] until the precision is used up."""
    for _ in range(ctx.prec):
        middle = ((a + b) / 2).mid()
        here = sign(f(middle))
        if not here:
            break
        a, b = (middle, b) if here == left else (a, middle)
    return a, b


def value_near(f, slope, a, b):
    """f at every point of the small cell [a, b]."""
    middle = ((a + b) / 2).mid()
    return f(middle) + slope(a.union(b)) * (a.union(b) - middle)
