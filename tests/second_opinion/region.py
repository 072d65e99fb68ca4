"""region.md: a set from which every start is safe."""

from answer import NotCovered


def check_region(problem):
    raise NotCovered("region")
