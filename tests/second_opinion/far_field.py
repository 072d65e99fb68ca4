"""Leads, angles and signs for all times from t0 on (cone.md)."""

from answer import Malformed, Refuted, decide, ensure
from bisection import waves_on
from exponential_range import range_of_sum
from flint import arb, fmpq_poly
from signs import sign_of


class Lead:
    """g = t^power exp(rho t) (f + r): the waves of f, a bound of abs(r), and what is known of rho."""

    def __init__(self, power, rho, is_level, waves, rest):
        self.power, self.rho, self.is_level, self.waves, self.rest = power, rho, is_level, waves, rest

    def enclosure(self, centre, half):
        return waves_on(self.waves, centre, half) + arb(0, self.rest.upper())


class FarField:
    def __init__(self, problem, far):
        self.problem, self.roots, self.begin = problem, problem.roots, far.begin
        ensure(far.begin > 0, "FarFieldStartsLate")
        self.base = [self.roots.named(position) for position in far.base]
        self.angles = {}
        for angle in far.angles:
            self.add_angle(angle)
        self.leads = {}
        for lead in far.leads:
            self.leads[lead.function] = self.lead(lead)

    def add_angle(self, angle):
        position = self.roots.named(angle.root).position
        if len(angle.row) != len(self.base):
            raise Malformed("one turn for each base root")
        if angle.sum is None:
            places = [i for i, root in enumerate(self.base) if root.position == position]
            ensure(len(places) == 1, "AngleIsCombination", "not one of the base roots")
            turns = [int(i == places[0]) for i in range(len(self.base))]
        else:
            claim = self.problem.sum_at(angle.sum)
            ensure(claim.root[0] == position, "AngleIsCombination", "another root")
            turns = [0] * len(self.base)
            for times, of in claim.parts:
                turns = [a + times * b for a, b in zip(turns, self.turns_of(of))]
            turns = [-n for n in turns] if claim.root[1] else turns
        ensure(turns == list(angle.row), "AngleIsCombination")
        self.angles[position] = turns

    def turns_of(self, name):
        """The integer vector of a root's angle."""
        root = self.roots.named(name)
        if root.real:
            return [0] * len(self.base)
        ensure(root.position in self.angles, "AngleIsCombination", "a root without an angle")
        turns = self.angles[root.position]
        return [-n for n in turns] if name[1] else turns

    def lead(self, lead):
        function = self.problem.function_at(lead.function)
        if function is None:
            raise Refuted("EvidenceFitsClaim", "the lead of a polynomial with exponentials")
        # A listed root that is no root of the function has no term there: multiplicity 0.
        leading = [self.roots.named(position) for position in lead.roots]
        multiplicities = {root.position: e for root, e in function.members()}
        ensure(lead.roots, "RealPartsAreEqual", "no leading root")
        self.check_equal(lead)
        lowest = greatest(root.box.real.lower() for root in leading)
        highest = -greatest(-root.box.real.upper() for root in leading)
        power = max(multiplicities.get(root.position, 0) for root in leading) - 1
        t0 = arb(self.begin)
        waves, rest = [], arb(0)
        for root, closed in function.closed_form():
            weight = 1 if root.real else 2
            leads = root.position in lead.roots
            decide(leads or root.box.real < lowest, "LowerRealPartIsLess")
            for j, c in enumerate(closed):
                if leads and j == power:
                    waves.append((weight * c, self.turns_of((root.position, False))))
                elif leads:
                    rest += weight * abs(c) * t0 ** (j - power)
                else:
                    gap = lowest - root.box.real
                    decide(gap * t0 >= j - power, "LowerTermDecreases")
                    rest += weight * abs(c) * t0 ** (j - power) * (-gap * t0).exp()
        family = self.roots.families[leading[0].family]
        level = family.polynomial == fmpq_poly([0, 1]) or (lead.line is not None and lead.line == 0)
        return Lead(power, lowest.union(highest), level, waves, rest)

    def check_equal(self, lead):
        """Equal real parts, for a named reason."""
        if lead.line is not None:
            for position in lead.roots:
                self.roots.check_line(position, lead.line)
        elif lead.doubled is not None:
            ensure(len(lead.doubled) == len(lead.roots), "RealPartsAreEqual", "a sum for each root")
            names = []
            for position, place in zip(lead.roots, lead.doubled):
                claim = self.problem.sum_at(place)
                names.append(claim.root)
                self.check_doubled(position, claim)
            ensure(all(self.roots.same(name, names[0]) for name in names), "RealPartsAreEqual", "another double")
        else:
            ensure(len(lead.roots) == 1, "RealPartsAreEqual", "no reason")

    def check_doubled(self, position, claim):
        if self.roots.named(position).real:
            total = sum(times for times, of in claim.parts if of[0] == position)
            fits = total == 2 and all(of[0] == position for _, of in claim.parts)
        else:
            fits = sorted(claim.parts) == [(1, (position, False)), (1, (position, True))]
        ensure(fits, "RealPartsAreEqual", "not root + conjugate")

    def enclosure(self, position, centre, half):
        """Of f + r for a function with a lead, of the function itself for one with exponentials."""
        function = self.problem.function_at(position)
        if function is None:
            return range_of_sum(self, self.problem.exponentials[position], centre, half)
        ensure(position in self.leads, "SignOnLeaf", "a function without a lead")
        return self.leads[position].enclosure(centre, half)

    def sign(self, position, centre, half):
        """The sign of a function for all angles in a box and all t >= t0, or None."""
        function = self.problem.function_at(position)
        if function is not None and function.is_zero:
            return "0"
        return sign_of(self.enclosure(position, centre, half))

    def signs(self, listed, centre, half):
        """The sets of signs on a box, before identities."""
        signs = self.problem.open_signs()
        for position, sign in listed:
            found = self.sign(position, centre, half)
            ensure(found in (None, sign), "SignOnLeaf")
            decide(found == sign, "SignOnLeaf", f"function {position}")
            signs[position] = frozenset(sign)
        return signs


def greatest(values):
    """The greatest of exact balls."""
    values = list(values)
    found = values[0]
    for value in values[1:]:
        found = found.max(value)
    return found
