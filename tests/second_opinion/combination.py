"""Real and imaginary parts of roots as rational combinations of base ones (region.md, equality.md)."""

from answer import Malformed, ensure
from flint import fmpq


def check_rows(problem, region):
    """Sets `growths` and `turns` of the region: the rows of all listed roots, turns of the listed (upper) roots."""
    _, _, growths, angles, _, _ = problem.certificate.evidence
    ensure(region.claim.scale > 0, "ExponentsAreListed", "a scale above 0")
    rates = [region.names[place] for place, _, _ in region.claim.rates]
    base = [region.names[place] for place in region.claim.base]
    region.growths, region.turns = {}, {}
    for entry in growths:
        check_length(entry, 1 + len(rates))
        position = problem.roots.named(entry.root).position
        region.growths[position] = growth_row(problem, region, rates, entry)
    for entry in angles:
        check_length(entry, len(base))
        position = problem.roots.named(entry.root).position
        region.turns[position] = angle_row(problem, region, base, entry)


def check_length(entry, length):
    if len(entry.row) != length:
        raise Malformed("one number for each base part")


def growth_row(problem, region, rates, entry):
    row = list(entry.row)
    if entry.line is not None:
        problem.roots.check_line(entry.root, entry.line)
        found = [entry.line / region.claim.scale] + [fmpq(0)] * len(rates)
        ensure(row == found, "RateIsCombination", "another line")
    elif entry.sum is not None:
        known = dict(region.growths)
        ensure(row == by_sum(problem, known, entry, lambda name: 1), "RateIsCombination")
    else:
        places = [1 + j for j, name in enumerate(rates) if name[0] == entry.root]
        ensure(places and row == unit(places[0], len(row)), "RateIsCombination", "no base rate")
    return row


def angle_row(problem, region, base, entry):
    """The row of the listed (upper) root."""
    row = list(entry.row)

    def direction(name):
        return 0 if problem.roots.named(name).real else -1 if name[1] else 1

    if entry.sum is not None and problem.roots.named(entry.root).real:
        problem.sum_at(entry.sum)
        ensure(not any(row), "AngleIsCombination", "a real root")
    elif entry.sum is not None:
        ensure(row == by_sum(problem, dict(region.turns), entry, direction), "AngleIsCombination")
    else:
        places = [j for j, name in enumerate(base) if name[0] == entry.root]
        ensure(len(places) == 1 and row == unit(places[0], len(row)), "AngleIsCombination", "no base frequency")
    return row


def unit(place, length):
    return [fmpq(int(i == place)) for i in range(length)]


def by_sum(problem, known, entry, direction):
    """The row that the sum of the parts minus the root, being 0, gives to the entry's root."""
    claim = problem.sum_at(entry.sum)
    own, total = 0, [fmpq(0)] * len(entry.row)
    for times, name in (*claim.parts, (-1, claim.root)):
        times *= direction(name)
        if name[0] == entry.root:
            own += times
        elif times:
            ensure(name[0] in known, "RateIsCombination", "a root that does not stand before")
            total = [a + times * b for a, b in zip(total, known[name[0]])]
    ensure(own != 0, "RateIsCombination", "the sum says nothing about the root")
    return [-a / own for a in total]
