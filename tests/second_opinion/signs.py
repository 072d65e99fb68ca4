"""Sets of possible signs, identities that narrow them, and the formula in three-valued logic (cover.md)."""

from statement import RELATIONS

ALL = frozenset("-0+")
PRODUCT = {("-", "-"): "+", ("-", "+"): "-", ("+", "-"): "-", ("+", "+"): "+"}


def sum_of(left, right):
    found = set()
    for a in left:
        for b in right:
            if a == "0" or b == "0" or a == b:
                found.add(b if a == "0" else a)
            else:
                found |= ALL
    return frozenset(found)


def product_of(left, right):
    return frozenset(PRODUCT.get((a, b), "0") for a in left for b in right)


def power_of(signs, exponent):
    return frozenset("0" if s == "0" else "+" if exponent % 2 == 0 else s for s in signs)


def narrowed(signs, identities):
    """The sets after all identities, in order."""
    signs = list(signs)
    for target, summands in identities:
        total = frozenset("0")
        for powers in summands:
            term = frozenset("+")
            for of, k in powers:
                term = product_of(term, power_of(signs[of], k))
            total = sum_of(total, term)
        signs[target] = (signs[target] & total) or signs[target]
    return signs


def truth(formula, signs):
    """True, False, or None where the signs do not tell."""
    if formula[0] == "atom":
        allowed = set(RELATIONS[formula[2]])
        possible = signs[formula[1]]
        return True if possible <= allowed else None if possible & allowed else False
    values = [truth(part, signs) for part in formula[1]]
    short = formula[0] == "any"
    if short in values:
        return short
    return None if None in values else not short


def sign_of(enclosure):
    """The sign that all members of an enclosure have, or None."""
    if enclosure > 0:
        return "+"
    if enclosure < 0:
        return "-"
    return "0" if enclosure.is_zero() else None


def exact_sign(value):
    return "+" if value > 0 else "-" if value < 0 else "0"
