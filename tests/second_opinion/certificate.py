"""Certificates: keepout-certificate/1 read into values."""

from typing import Any, NamedTuple

from answer import Malformed, NotCovered
from reading import count, dyadic, each, fields, integer, positive, power, rational, root_name, signed, variant
from statement import read_monic, read_statement

import limits

FORMAT = "keepout-certificate/1"


class Sum(NamedTuple):
    root: tuple
    parts: tuple
    factors: tuple


class Cell(NamedTuple):
    to: Any
    order: int
    signs: tuple
    start: Any
    pivot: Any


class Lead(NamedTuple):
    function: int
    roots: tuple
    line: Any
    doubled: Any


class FarField(NamedTuple):
    begin: Any
    base: tuple
    angles: tuple
    leads: tuple


class Leaf(NamedTuple):
    signs: tuple
    pivot: Any


class Combination(NamedTuple):
    """The real or imaginary part of a root as a row of base ones, and why."""

    root: int
    row: tuple
    line: Any
    sum: Any


class Certificate(NamedTuple):
    statement: Any
    bits: int
    families: tuple
    traces: tuple
    auxiliaries: tuple
    identities: tuple
    sums: tuple
    kind: str
    evidence: Any


def read_certificate(value):
    """The certificate in a JSON value."""
    keys = ("format", "statement", "bits", "families", "traces", "auxiliaries", "identities", "sums", "evidence")
    form, statement, bits, families, traces, auxiliaries, identities, sums, evidence = fields(value, keys)
    if form != FORMAT:
        raise Malformed(FORMAT)
    bits = count(bits)
    if bits < 2:
        raise Malformed("bits >= 2")
    limits.at_most(bits, limits.BITS, "bits")
    families = each(families, read_family, limits.ROOTS, "roots")
    limits.at_most(sum(len(centres) for _, centres in families), limits.ROOTS, "roots")
    kind, evidence = variant(evidence, (*EVIDENCE, *NOT_COVERED))
    if kind in NOT_COVERED:
        raise NotCovered(kind)
    return Certificate(
        read_statement(statement),
        bits,
        families,
        each(traces, read_factors),
        each(auxiliaries, read_auxiliary),
        each(identities, read_identity),
        each(sums, read_sum),
        kind,
        EVIDENCE[kind](evidence),
    )


def read_family(value):
    polynomial, centres = fields(value, ("polynomial", "centres"))

    def centre(entry):
        re, im = fields(entry, ("re", "im"))
        re, im = dyadic(re), dyadic(im)
        if im[0] < 0:
            raise Malformed("im >= 0")
        return re, im

    return read_monic(polynomial), each(centres, centre, limits.ROOTS, "roots")


def read_factors(value):
    def factor(entry):
        family, multiplicity = fields(entry, ("family", "multiplicity"))
        return count(family), positive(multiplicity)

    return each(value, factor)


def read_auxiliary(value):
    factors, derivatives = fields(value, ("factors", "derivatives"))
    return read_factors(factors), each(derivatives, rational)


def read_identity(value):
    target, summands = fields(value, ("target", "summands"))
    small = (limits.DEGREE, "degree")
    return count(target), each(summands, lambda s: each(s, power, *small), *small)


def read_sum(value):
    root, parts, factors = fields(value, ("root", "parts", "factors"))

    def part(entry):
        times, of = fields(entry, ("times", "root"))
        return multiplier(times), root_name(of)

    parts = each(parts, part)
    if len(parts) not in (1, 2):
        raise Malformed("one or two parts")
    return Sum(root_name(root), parts, read_factors(factors))


def multiplier(value):
    found = integer(value)
    limits.at_most(abs(found).bit_length(), limits.MULTIPLIER_BITS, "multiplier_bits")
    return found


def optional(value, read):
    return None if value is None else read(value)


def read_cell(value):
    to, order, signs, start, pivot = fields(value, ("to", "order", "signs"), ("start", "pivot"))
    order = positive(order)
    limits.at_most(order, limits.ORDER, "order")
    start = optional(start, lambda v: each(v, read_start))
    if start is not None and pivot is not None:
        raise Malformed("start or pivot, not both")
    return Cell(rational(to), order, each(signs, signed), start, optional(pivot, count))


def read_start(value):
    sign, vanishing = fields(value, ("sign", "power"))
    vanishing = count(vanishing)
    limits.at_most(vanishing, limits.ORDER, "order")
    return (*signed(sign), vanishing)


def read_cells(value):
    return each(value, read_cell, limits.CELLS, "cells")


def read_far(value):
    begin, base, angles, leads = fields(value, ("from", "base", "angles", "leads"))

    def angle(entry):
        root, turns, reason = fields(entry, ("root", "turns"), ("sum",))
        return Combination(count(root), each(turns, multiplier), None, optional(reason, count))

    def lead(entry):
        function, roots, line, doubled = fields(entry, ("function", "roots"), ("line", "doubled"))
        if line is not None and doubled is not None:
            raise Malformed("line or doubled, not both")
        doubled = optional(doubled, lambda v: each(v, count))
        return Lead(count(function), each(roots, count), optional(line, rational), doubled)

    base = each(base, count, limits.DIMENSION, "dimension")
    return FarField(rational(begin), base, each(angles, angle), each(leads, lead))


def read_nodes(value, pivots=True):
    """A list of axes (splits) and leaves."""

    def node(entry):
        if isinstance(entry, dict) and "split" in entry:
            return count(*fields(entry, ("split",)))
        signs, pivot = fields(entry, ("signs",), ("pivot",))
        if pivot is not None and not pivots:
            raise Malformed("no pivot in a region")
        return Leaf(each(signs, signed), optional(pivot, count))

    return each(value, node, limits.NODES, "nodes")


def read_never(value):
    cells, cone = fields(value, ("cells",), ("cone",))

    def read_cone(entry):
        far, nodes = fields(entry, ("far", "nodes"))
        return read_far(far), read_nodes(nodes)

    return read_cells(cells), optional(cone, read_cone)


def read_enters(value):
    before, begin, cell = fields(value, ("before", "from", "cell"))
    return read_cells(before), rational(begin), read_cell(cell)


def read_inseparable(value):
    far, angles, zeros, signs = fields(value, ("far", "angles", "zeros", "signs"))

    def box(entry):
        centre, radius = fields(entry, ("centre", "radius"))
        return rational(centre), rational(radius)

    def zero(entry):
        function, axis = fields(entry, ("function", "axis"))
        return count(function), count(axis)

    return read_far(far), each(angles, box), each(zeros, zero), each(signs, signed)


def read_region_evidence(value):
    keys = ("roots", "log_start", "growths", "angles", "leads", "nodes")
    roots, log_start, growths, angles, leads, nodes = fields(value, keys)

    def growth(entry):
        root, row, line, reason = fields(entry, ("root", "row"), ("line", "sum"))
        if line is not None and reason is not None:
            raise Malformed("line or sum, not both")
        return Combination(count(root), each(row, rational), optional(line, rational), optional(reason, count))

    def angle(entry):
        root, row, reason = fields(entry, ("root", "row"), ("sum",))
        return Combination(count(root), each(row, rational), None, optional(reason, count))

    def lead(entry):
        function, row, exponent = fields(entry, ("function", "growth", "power"))
        return count(function), each(row, rational), count(exponent)

    roots = each(roots, count)
    return roots, rational(log_start), each(growths, growth), each(angles, angle), each(leads, lead), read_nodes(nodes, False)


EVIDENCE = {
    "never": read_never,
    "enters": read_enters,
    "inseparable": read_inseparable,
    "region": read_region_evidence,
}
NOT_COVERED = ("many", "witness")
