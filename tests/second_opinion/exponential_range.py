"""exponential.md, large times: ranges of exponentials for all t >= t0. An end that is None is unbounded."""

from answer import ensure
from flint import arb


def range_of_sum(far, parts, centre, half):
    """An enclosure of the sum of c_k exp(b_k): a ball, or one with an infinite end given by its bounded side."""
    low, high = arb(0), arb(0)
    for c, b in parts:
        low_c, high_c = range_of(far, c, centre, half)
        low_b, high_b = range_of(far, b, centre, half)
        low_e = arb(0) if low_b is None else low_b.exp()
        high_e = None if high_b is None else high_b.exp()
        low = added(low, lowest_product(low_c, low_e, high_e))
        high = added(high, negated(lowest_product(negated(high_c), low_e, high_e)))
    return Range(low, high)


class Range:
    """Compares with 0 like a ball."""

    def __init__(self, low, high):
        self.low, self.high = low, high

    def __gt__(self, zero):
        return self.low is not None and bool(self.low > zero)

    def __lt__(self, zero):
        return self.high is not None and bool(self.high < zero)

    def is_zero(self):
        return False


def added(a, b):
    return None if a is None or b is None else a + b


def negated(a):
    return None if a is None else -a


def lowest_product(low, low_e, high_e):
    """A lower bound of x e for x >= low, low_e <= e <= high_e, e > 0."""
    if low is None:
        return None
    if low >= 0:
        return low * low_e
    if high_e is None:
        return None
    return (low * high_e).min(low * low_e)


def range_of(far, position, centre, half):
    """Bounds of a trace for all t >= t0 and all angles in a box."""
    function = far.problem.functions[position]
    if function.is_zero:
        return arb(0), arb(0)
    ensure(position in far.leads, "SignOnLeaf", "a coefficient or an argument without a lead")
    lead = far.leads[position]
    v = lead.enclosure(centre, half)
    if lead.is_level and lead.power == 0:
        return v.lower(), v.upper()
    t0 = arb(far.begin)
    first = t0**lead.power * (lead.rho * t0).exp()
    if lead.rho < 0 and -lead.rho * t0 >= lead.power:
        low, high = v.lower() * first, v.upper() * first
        return low.min(arb(0)), high.max(arb(0))
    if lead.power >= 0 and (lead.is_level or lead.rho >= 0):
        return (v.lower() * first if v >= 0 else None), (v.upper() * first if v <= 0 else None)
    return None, None
