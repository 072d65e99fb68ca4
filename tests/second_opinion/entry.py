"""entry.md: an instant at which the formula is true."""

from answer import decide, ensure
from cell import enclosure_on, later_signs, listed_signs, with_sign
from cover import check_cover
from signs import exact_sign, sign_of, truth


def check_entry(problem):
    statement = problem.statement
    _, begin, end, first = statement.claim
    before, start, cell = problem.certificate.evidence
    ensure(start <= cell.to, "InstantIsInWindow", "the cell ends before it starts")
    ensure(begin <= start and cell.to <= end, "InstantIsInWindow", "outside the bracket")
    ensure(statement.begin <= start, "InstantIsInWindow", "before the window")
    ensure(statement.until is None or cell.to <= statement.until, "InstantIsInWindow", "after the window")
    check_instant(problem, start, cell)
    if first and begin > statement.begin:
        check_cover(problem, before, statement.begin, begin)
    else:
        ensure(not before, "EvidenceFitsClaim", "cells before the bracket")


def check_instant(problem, start, cell):
    def proves(signs):
        return truth(problem.formula, problem.narrowed(signs)) is True

    signs = listed_signs(problem, start, cell)
    if cell.start is not None:
        later = later_signs(problem, signs, start, cell)
        ensure(proves(problem.exact_signs()) or (cell.to > 0 and proves(later)), "ZoneIsProvedAtInstant")
    elif cell.pivot is not None:
        ends = [sign_at(problem, cell.pivot, t, cell.order) for t in (start, cell.to)]
        decide(None not in ends, "PivotChangesSign")
        ensure(set(ends) == {"-", "+"}, "PivotChangesSign")
        ensure(proves(with_sign(problem, signs, cell.pivot, "0")), "ZoneIsProvedAtInstant")
    else:
        ensure(proves(signs), "ZoneIsProvedAtInstant")


def sign_at(problem, position, t, order):
    """The sign of a function at an instant, or None."""
    function = problem.function_at(position)
    if function is not None and t == 0:
        return exact_sign(function.value_at_start())
    return sign_of(enclosure_on(problem, position, t, t, order))
