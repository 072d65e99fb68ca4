"""cone.md: the formula is false for all t >= t0, and on the trajectory cone."""

from answer import ensure
from bisection import leaves
from cell import with_sign
from cover import check_cover
from far_field import FarField
from signs import truth


def check_never(problem):
    statement = problem.statement
    cells, cone = problem.certificate.evidence
    if cone is None:
        ensure(statement.until is not None, "EvidenceFitsClaim", "a window without an end needs a cone")
        check_cover(problem, cells, statement.begin, statement.until)
        return
    far = check_cone(problem, cone)
    if far.begin > statement.begin:
        check_cover(problem, cells, statement.begin, far.begin)
    else:
        ensure(not cells, "EvidenceFitsClaim", "cells without a use")


def check_eventually(problem):
    statement = problem.statement
    cells, cone = problem.certificate.evidence
    ensure(cone is not None and not cells, "EvidenceFitsClaim", "a cone alone")
    ensure(statement.until is None, "EvidenceFitsClaim", "a window that ends")
    far = check_cone(problem, cone)
    ensure(far.begin <= statement.claim[1], "EvidenceFitsClaim", "the cone starts after the claim")
    ensure(statement.begin <= statement.claim[1], "EvidenceFitsClaim", "the claim starts before the window")


def check_cone(problem, cone):
    field, nodes = cone
    far = FarField(problem, field)
    for leaf, centre, half in leaves(nodes, len(far.base)):
        signs = far.signs(leaf.signs, centre, half)
        cases = [signs]
        if leaf.pivot is not None:
            cases = [with_sign(problem, signs, leaf.pivot, sign) for sign in "-0+"]
        for case in cases:
            ensure(truth(problem.formula, problem.narrowed(case)) is False, "ZoneIsRefutedOnLeaf")
    return far
