"""inseparable.md: each trajectory cone meets the zone."""

from math import isqrt, lcm

from answer import Malformed, decide, ensure
from far_field import FarField
from flint import arb, fmpq, fmpq_poly
from signs import truth


def check_inseparable(problem):
    ensure(problem.statement.until is None, "EvidenceFitsClaim", "a window that ends")
    field, box, zeros, listed = problem.certificate.evidence
    far = FarField(problem, field)
    ensure(len(box) == len(far.base), "EvidenceFitsClaim", "an interval for each base root")
    centre, half = [c for c, _ in box], [r for _, r in box]
    ensure(all(r >= 0 for r in half), "EvidenceFitsClaim", "a radius below 0")
    check_independence(problem.roots, far.base)
    axes = [axis for _, axis in zeros]
    ensure(len(set(axes)) == len(axes), "FacesHaveOppositeSigns", "an axis twice")
    signs = far.signs(listed, centre, half)
    for position, axis in zeros:
        if axis >= len(box):
            raise Malformed("an axis of the torus", str(axis))
        check_faces(far, position, axis, centre, half)
        signs[position] = frozenset("0")
    ensure(truth(problem.formula, problem.narrowed(signs)) is True, "ZoneIsProvedOnTorus")


def check_faces(far, position, axis, centre, half):
    found = []
    for direction in (-1, 1):
        face = [c + direction * half[i] if i == axis else c for i, c in enumerate(centre)]
        found.append(far.sign(position, face, [fmpq(0) if i == axis else h for i, h in enumerate(half)]))
    decide(None not in found, "FacesHaveOppositeSigns")
    ensure(set(found) == {"-", "+"}, "FacesHaveOppositeSigns")


def check_independence(roots, base):
    ensure(not any(root.real for root in base), "FrequenciesAreIndependent", "a real base root")
    if len(base) < 2:
        return
    polynomials = [roots.families[root.family].polynomial for root in base]
    if all(q.degree() == 2 for q in polynomials):
        squares = [q[0] - q[1] * q[1] / 4 for q in polynomials]
        for i, a in enumerate(squares):
            ensure(not any(is_square(a * b) for b in squares[:i]), "FrequenciesAreIndependent")
        return
    ensure(len(base) == 2, "FrequenciesAreIndependent", "no reason")
    scales, constants = [], []
    for root, q in zip(base, polynomials):
        mean = -q[q.degree() - 1] / q.degree()
        roots.check_line(root.position, mean)
        shifted = q(fmpq_poly([mean, 1]))
        scale = lcm(*(int(shifted[k].q) for k in range(shifted.degree() + 1)))
        scales.append(scale)
        constants.append(shifted[0] * scale ** shifted.degree())
    ensure(constants[1] != 0, "FrequenciesAreIndependent", "a root 0")
    quotient = arb(abs(constants[1])) * scales[0] * base[0].box.imag / (scales[1] * base[1].box.imag)
    decide(not quotient.contains_integer(), "FrequenciesAreIndependent")


def is_square(value):
    """Whether a rational is the square of one."""
    p, q = int(value.p), int(value.q)
    return p >= 0 and isqrt(p) ** 2 == p and isqrt(q) ** 2 == q
