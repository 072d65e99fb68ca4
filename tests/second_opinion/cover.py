"""cover.md: the formula is false on a bounded stretch of time."""

from answer import ensure
from cell import later_signs, listed_signs, with_sign
from signs import truth


def check_cover(problem, cells, begin, end):
    """The cells cover [begin, end], and the formula is false on each."""
    ensure(cells, "CellsCoverWindow", "no cell")
    for cell in cells:
        ensure(begin <= cell.to, "CellsCoverWindow", "an end before the one before it")
        check_cell(problem, begin, cell)
        begin = cell.to
    ensure(begin == end, "CellsCoverWindow", "another end")


def check_cell(problem, begin, cell):
    signs = listed_signs(problem, begin, cell)
    cases = [signs]
    if cell.start is not None:
        cases = [problem.exact_signs(), later_signs(problem, signs, begin, cell)]
    elif cell.pivot is not None:
        cases = [with_sign(problem, signs, cell.pivot, sign) for sign in "-0+"]
    for case in cases:
        ensure(truth(problem.formula, problem.narrowed(case)) is False, "ZoneIsRefutedOnCell", f"up to {cell.to}")
