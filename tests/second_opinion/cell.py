"""Signs on one closed stretch of time (cover.md, entry.md)."""

from answer import Refuted, decide, ensure
from exponential import Exponentials
from signs import exact_sign, sign_of
from trace import Stretch


def enclosure_on(problem, position, begin, end, order):
    """An enclosure of a function over [begin, end]."""
    centre, half = (begin + end) / 2, (end - begin) / 2
    function = problem.function_at(position)
    if function is None:
        return Exponentials.on_stretch(problem, position, centre, half, order)
    return Stretch(function, centre, half, order).enclosure()


def check_sign(problem, position, sign, begin, cell):
    """A listed sign holds on the whole closed cell."""
    function = problem.function_at(position)
    if function is not None and (function.is_zero or cell.to == 0):
        ensure(exact_sign(function.value_at_start()) == sign, "SignOnCell")
        return
    found = sign_of(enclosure_on(problem, position, begin, cell.to, cell.order))
    ensure(found in (None, sign), "SignOnCell")
    decide(found == sign, "SignOnCell", f"function {position} up to {cell.to}")


def listed_signs(problem, begin, cell):
    """The sets of signs on the cell, before identities."""
    signs = problem.open_signs()
    for position, sign in cell.signs:
        check_sign(problem, position, sign, begin, cell)
        signs[position] = frozenset(sign)
    return signs


def later_signs(problem, signs, begin, cell):
    """The sets for t > 0 on a cell from 0: of a function listed at the start, the sign of function / t^power."""
    ensure(begin == 0, "VanishesAtStart", "the cell does not start at 0")
    signs = list(signs)
    for position, sign, power in cell.start:
        function = problem.function_at(position)
        if function is None:
            raise Refuted("SignOnCell", "a polynomial with exponentials at the start")
        series = function.series(power)
        ensure(all(series[k] == 0 for k in range(power)), "VanishesAtStart")
        if function.is_zero:
            ensure(sign == "0", "SignOnCell")
        else:
            stretch = Stretch(function, 0, cell.to, cell.order)
            found = sign_of(stretch.enclosure(power))
            ensure(found in (None, sign), "SignOnCell")
            decide(found == sign, "SignOnCell", f"function {position} at the start")
        signs[position] = frozenset(sign)
    return signs


def with_sign(problem, signs, position, sign):
    """The sets in one case of the pivot."""
    problem.function_at(position)
    signs = list(signs)
    signs[position] = frozenset(sign)
    return signs
