"""region.md: a set from which every start is safe for ever."""

from answer import Malformed, Refuted, decide, ensure
from bisection import leaves, waves_on
from combination import check_rows
from flint import acb, arb, fmpq
from signs import sign_of, truth


def check_region(problem):
    statement = problem.statement
    ensure(statement.until is None, "EvidenceFitsClaim", "a window that ends")
    ensure(not statement.drives, "EvidenceFitsClaim", "known inputs")
    region = Region(problem)
    region.check_roots()
    check_rows(problem, region)
    region.check_exponents()
    region.check_set()
    region.expand_states()
    dimension = len(region.claim.base)
    _, _, _, _, leads, nodes = problem.certificate.evidence
    fields = region.fields(leads)
    for leaf, centre, half in leaves(nodes, dimension):
        signs = problem.open_signs()
        for position, sign in leaf.signs:
            found = region.sign(fields, position, centre, half)
            ensure(found in (None, sign), "SignOnLeaf")
            decide(found == sign, "SignOnLeaf")
            signs[position] = frozenset(sign)
        # No identities: they hold between functions of time, not on the set.
        ensure(truth(problem.formula, signs) is False, "ZoneIsRefutedOnLeaf")


class Region:
    """The set of the claim, with its named roots."""

    def __init__(self, problem):
        self.problem, self.roots = problem, problem.roots
        self.claim = problem.statement.claim[1]
        places, self.log_start = problem.certificate.evidence[:2]
        self.names = [(position, False) for position in places]
        ensure(len(self.names) == len(self.claim.roots), "EvidenceFitsClaim", "a root for each named one")
        for name in self.names:
            self.roots.named(name)

    def check_roots(self):
        """Each named root is the only root of its polynomial in its rectangle."""
        for name, (polynomial, re, im) in zip(self.names, self.claim.roots):
            family = self.roots.families[self.roots.named(name).family]
            ensure([family.polynomial[k] for k in range(family.degree + 1)] == list(polynomial), "RootIsNamed")
            own = self.roots.value(name)
            ensure(self.roots.named(name).real == (im == (0, 0)), "RootIsNamed", "a segment of the real axis for a real root")
            decide(lies_in(own.real, re) and lies_in(own.imag, im), "RootIsNamed", "not in the rectangle")
            for root in family.roots:
                for conjugate in (False,) if root.real else (False, True):
                    if not self.roots.same(name, (root.position, conjugate)):
                        other = root.value(conjugate)
                        decide(misses(other.real, re) or misses(other.imag, im), "RootIsNamed", "two in the rectangle")

    def real(self, place):
        """The real part of a root of the claim."""
        return self.roots.value(self.names[place]).real

    def imaginary(self, place):
        return self.roots.value(self.names[place]).imag

    def check_exponents(self):
        """All exponents of all states are listed, none twice; one that may be 0 stands still."""
        self.exponents = {}
        for place, growth, turns in self.claim.exponents:
            position, _ = self.names[place]
            ensure(position not in self.exponents, "ExponentsAreListed", "an exponent twice")
            root = self.roots.named(position)
            ensure(position in self.growths, "RateIsCombination", "an exponent without a row")
            ensure(self.growths[position] == list(growth), "RateIsCombination")
            if not root.real:
                ensure(position in self.turns, "AngleIsCombination", "an exponent without a row")
            row = [fmpq(n) for n in turns]
            ensure((self.turns[position] if not root.real else [0] * len(row)) == row, "AngleIsCombination")
            if root.box.contains(0):
                ensure(not any(growth) and not any(turns), "ExponentsAreListed", "an exponent that may be 0")
            self.exponents[position] = (growth, tuple(int(n) for n in row))
        for function in self.state_functions():
            for root, _ in function.members():
                ensure(root.position in self.exponents, "ExponentsAreListed", "an exponent of a state is missing")

    def state_functions(self):
        first = self.problem.first_state
        return self.problem.functions[first : first + len(self.problem.statement.states)]

    def check_set(self):
        """Bands, and that the trajectory is in the set from t0 on."""
        claim = self.claim
        ensure(claim.scale > 0, "ExponentsAreListed", "a scale above 0")
        for place, lo, hi in claim.rates:
            rho = self.real(place)
            ensure(not rho < arb(claim.scale * lo) and not rho > arb(claim.scale * hi), "RateIsInBand")
            decide(rho >= arb(claim.scale * lo) and rho <= arb(claim.scale * hi), "RateIsInBand")
        ensure(claim.begin > 0 and claim.start > 0, "SetContainsTrajectory")
        start = arb(claim.start)
        decide(arb(self.log_start).exp() <= start, "SetContainsTrajectory")
        decide(start <= arb(claim.scale * claim.begin).exp(), "SetContainsTrajectory")
        if claim.power is not None:
            ensure(claim.power > 0, "PowerBoundsTime")
            least = arb(claim.power * self.log_start).exp()
            decide(arb(claim.power * claim.scale) * least >= 1, "PowerBoundsTime")
            decide(arb(claim.begin) <= least, "PowerBoundsTime")

    def expand_states(self):
        """Each state as a dictionary from keys (growth, power of T, turns) to coefficients."""
        self.states = {}
        for name, function in zip(self.problem.statement.states, self.state_functions()):
            terms = {}
            for root, closed in function.closed_form():
                growth, turns = self.exponents[root.position]
                for j, c in enumerate(closed):
                    add_to(terms, (growth, j, turns), c)
                    if not root.real:
                        add_to(terms, (growth, j, tuple(-n for n in turns)), c.conjugate())
            self.states[name] = terms

    def expand(self, position):
        """A polynomial of the zone on the set, without the keys that are exactly 0 (Lemma 3)."""
        zero = (tuple(fmpq(0) for _ in range(1 + len(self.claim.rates))), 0, (0,) * len(self.claim.base))
        total = {}
        for monomial, times in self.problem.expanded[position].items():
            term = {zero: acb(times)}
            for name, k in monomial:
                ensure(name in self.states, "ZoneIsOfStates", name)
                for _ in range(k):
                    term = product(term, self.states[name])
            for key, c in term.items():
                add_to(total, key, c)
        values = {(g, n): self.exponent(g, n) for g, _, n in total}
        function = self.problem.functions[position]
        members = [(value, e) for root, e in function.members() for value in root.pair]
        return {key: c for key, c in total.items() if not is_zero(key, values, members)}

    def exponent(self, growth, turns):
        """lambda = sigma g_0 + rho . g + i n . omega."""
        re = arb(self.claim.scale * growth[0])
        for g, (place, _, _) in zip(growth[1:], self.claim.rates):
            re += arb(g) * self.real(place)
        im = arb(0)
        for n, place in zip(turns, self.claim.base):
            im += n * self.imaginary(place)
        return acb(re, im)

    def fields(self, leads):
        """For each polynomial of the zone "0", or the waves of its lead and a bound of the rest (Lemma 4)."""
        # The last lead of a function counts; those of functions beside the zone's polynomials are of no use.
        chosen = {}
        for position, growth, power in leads:
            self.problem.function_at(position)
            if len(growth) != 1 + len(self.claim.rates):
                raise Malformed("one growth for y and each rate")
            chosen[position] = (growth, power)
        found = {}
        for position in range(len(self.problem.polynomials)):
            keys = self.expand(position)
            if not keys:
                found[position] = "0"
            elif position in chosen:
                found[position] = self.field(keys, *chosen[position])
        return found

    def field(self, keys, growth, power):
        waves, rest = [], arb(0)
        for (g, j, turns), c in keys.items():
            if g == growth and j == power:
                waves.append((c, turns))
            else:
                rest += abs(c) * self.dominance([a - b for a, b in zip(g, growth)], j - power)
        return waves, rest

    def dominance(self, d, k):
        """A bound of y^d_0 u^d T^k on the set."""
        e = d[0]
        for slope, (_, lo, hi) in zip(d[1:], self.claim.rates):
            e += slope * (hi if slope > 0 else lo)
        if k > 0:
            decide(self.claim.power is not None, "LeadDominates", "a power of T without a bound")
            e += k * self.claim.power
        decide(e <= 0, "LeadDominates")
        return arb(e * self.log_start).exp() * arb(self.claim.begin) ** min(k, 0)

    def sign(self, fields, position, centre, half):
        """The sign of a polynomial of the zone for all points with these angles, or None."""
        if position >= len(self.problem.functions):
            raise Malformed("a position in the list of functions", str(position))
        if position not in fields:
            raise Refuted("SignOnLeaf", "a function without a lead")
        if fields[position] == "0":
            return "0"
        waves, rest = fields[position]
        return sign_of(waves_on(waves, centre, half) + arb(0, rest.upper()))


def lies_in(value, ends):
    return value >= arb(ends[0]) and value <= arb(ends[1])


def misses(value, ends):
    return value < arb(ends[0]) or value > arb(ends[1])


def is_zero(key, values, members):
    """Lemma 3: no other key and no term of the trace has this exponent."""
    growth, j, turns = key
    own = values[growth, turns]
    if any(own.overlaps(value) for other, value in values.items() if other != (growth, turns)):
        return False
    return not any(e > j and own.overlaps(value) for value, e in members)


def add_to(terms, key, c):
    terms[key] = terms[key] + c if key in terms else c


def product(left, right):
    total = {}
    for (g, j, n), c in left.items():
        for (h, k, m), d in right.items():
            key = (tuple(a + b for a, b in zip(g, h)), j + k, tuple(a + b for a, b in zip(n, m)))
            add_to(total, key, c * d)
    return total
