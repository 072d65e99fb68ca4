"""Statements: keepout-statement/1 read into values that compare equal if they claim the same."""

import re
from typing import Any, NamedTuple

from answer import Malformed, NotCovered
from flint import fmpq
from reading import each, fields, integer, positive, rational, text, truth, variant
from reading import count as position

import limits

FORMAT = "keepout-statement/1"
RESERVED = set("t exp sin cos abs sqrt pi and or not true false".split())
RELATIONS = {"< 0": "-", "<= 0": "-0", "= 0": "0", ">= 0": "0+", "> 0": "+", "!= 0": "-+"}
EXTENSIONS = ("starts", "disturbances", "uncertain")


class Wave(NamedTuple):
    """times t^power exp(rate t) cos(frequency t), or sin; without both the frequency is 0."""

    times: Any
    power: int
    rate: Any
    kind: str
    frequency: Any


class Affine(NamedTuple):
    """offset + the sum of times * name."""

    terms: tuple
    offset: Any


class Statement(NamedTuple):
    title: str
    starts: tuple
    drives: tuple
    outputs: tuple
    exponentials: tuple
    rates: tuple
    inside: Any
    begin: Any
    until: Any
    claim: tuple
    labels: tuple

    @property
    def states(self):
        return tuple(name for name, _ in self.starts)


class Region(NamedTuple):
    begin: Any
    scale: Any
    start: Any
    roots: tuple
    rates: tuple
    base: tuple
    exponents: tuple
    power: Any


def read_statement(value):
    """The statement in a JSON value."""
    if isinstance(value, dict):
        for key in EXTENSIONS:
            if key in value:
                raise NotCovered(key)
    keys = ("format", "title", "states", "drives", "outputs", "phases", "zone", "claim")
    form, title, states, drives, outputs, phases, zone, claim, exponentials = fields(value, keys, ("exponentials",))
    if form != FORMAT:
        raise Malformed(FORMAT)
    text(title)
    starts, units = unzip(each(states, read_state))
    if not starts:
        raise Malformed("at least one state")
    drives, drive_units = unzip(each(drives, read_drive))
    names = Names([name for name, _ in starts], [name for name, _ in drives])
    outputs, output_units = unzip(each(outputs, lambda v: read_output(v, names)))
    names.outputs = [name for name, _ in outputs]
    exponentials = each(exponentials, lambda v: read_exponential(v, names)) if exponentials is not None else ()
    names.exponentials = [name for name, _ in exponentials]
    names.check()
    phases = each(phases, lambda v: read_phase(v, names))
    if len(phases) != 1:
        raise Malformed("exactly one phase")
    label, inside, begin, until = read_zone(zone, names)
    claim = read_claim(claim, inside, until)
    labels = (units, drive_units, output_units, label)
    return Statement(title, starts, drives, outputs, exponentials, phases[0], inside, begin, until, claim, labels)


def unzip(entries):
    return tuple(first for first, _ in entries), tuple(second for _, second in entries)


class Names:
    """Which names there are, and in which order they stand in a monomial."""

    def __init__(self, states, drives):
        self.states, self.drives, self.outputs, self.exponentials = states, drives, [], []

    def affine(self):
        return [*self.states, *self.drives]

    def all(self):
        return [*self.states, *self.drives, *self.outputs, "t", *self.exponentials]

    def check(self):
        names = [name for name in self.all() if name != "t"]
        if len(set(names)) != len(names):
            raise Malformed("distinct names")


def read_name(value):
    if not re.fullmatch("[A-Za-z_][A-Za-z0-9_]*", text(value), re.ASCII) or value in RESERVED:
        raise Malformed("a name", value[:60])
    return value


def label(value):
    return None if value is None else text(value)


def read_state(value):
    name, start, unit = fields(value, ("name", "start"), ("unit",))
    if isinstance(start, dict):
        raise NotCovered("a range of starts")
    return (read_name(name), rational(start)), label(unit)


def read_drive(value):
    name, signal, unit = fields(value, ("name", "signal"), ("unit",))
    return (read_name(name), each(signal, read_wave)), label(unit)


def read_wave(value):
    times, power, rate, cos, sin = fields(value, ("times", "power", "rate"), ("cos", "sin"))
    if cos is not None and sin is not None:
        raise Malformed("cos or sin, not both")
    kind = "cos" if cos is not None else "sin" if sin is not None else ""
    frequency = rational(cos if cos is not None else sin) if kind else fmpq(0)
    if kind and frequency <= 0:
        raise Malformed("a frequency > 0")
    power = position(power)
    limits.at_most(power, limits.DEGREE, "degree")
    return Wave(rational(times), power, rational(rate), kind, frequency)


def read_output(value, names):
    name, polynomial, unit = fields(value, ("name", "value"), ("unit",))
    return (read_name(name), read_polynomial(polynomial, names)), label(unit)


def read_exponential(value, names):
    name, terms, offset = fields(value, ("name", "terms", "offset"))
    return read_name(name), read_affine(terms, offset, [*names.affine(), "t"])


def read_affine(terms, offset, allowed):
    def term(value):
        times, of = fields(value, ("times", "of"))
        if text(of) not in allowed:
            raise Malformed("a known name", of[:60])
        return of, factor(times)

    terms = each(terms, term)
    if len({of for of, _ in terms}) != len(terms):
        raise Malformed("each name once")
    return Affine(terms, rational(offset))


def factor(value):
    times = rational(value)
    if times == 0:
        raise Malformed("a factor other than 0")
    return times


def read_phase(value, names):
    (rates,) = fields(value, ("rates",))

    def rate(entry):
        of, terms, offset, uncertain = fields(entry, ("of", "terms", "offset"), ("uncertain",))
        if uncertain is not None:
            raise NotCovered("uncertain terms")
        return text(of), read_affine(terms, offset, names.affine())

    rates = each(rates, rate)
    if [of for of, _ in rates] != list(names.states):
        raise Malformed("a rate for each state, in order")
    return tuple(affine for _, affine in rates)


def read_polynomial(value, names):
    """A tuple of (times, ((name, power), ...))."""
    order = {name: i for i, name in enumerate(names.all())}

    def variable(entry):
        if isinstance(entry, dict):
            name, power = fields(entry, ("name", "power"))
            return text(name), positive(power)
        return text(entry), 1

    def term(entry):
        times, of = fields(entry, ("times", "of"))
        variables = each(of, variable)
        places = [order.get(name) for name, _ in variables]
        if None in places or any(a >= b for a, b in zip(places, places[1:])):
            raise Malformed("known names in order")
        limits.at_most(sum(power for _, power in variables), limits.DEGREE, "degree")
        return factor(times), variables

    terms = each(value, term)
    if len({variables for _, variables in terms}) != len(terms):
        raise Malformed("distinct terms")
    return terms


def read_formula(value, names):
    if isinstance(value, dict) and ("all" in value or "any" in value):
        word, parts = variant(value, ("all", "any"))
        return word, each(parts, lambda part: read_formula(part, names))
    polynomial, relation = fields(value, ("polynomial", "is"))
    if relation not in RELATIONS:
        raise Malformed("a comparison", repr(relation)[:60])
    return "atom", read_polynomial(polynomial, names), relation


def read_zone(value, names):
    name, inside, begin, ref, until = fields(value, ("name", "inside", "from"), ("ref", "until"))
    inside = read_formula(inside, names)
    begin = rational(begin)
    until = None if until is None else rational(until)
    if begin < 0 or (until is not None and until < begin):
        raise Malformed("0 <= from <= until")
    return (text(name), label(ref)), inside, begin, until


def read_claim(value, inside, until):
    kind, held = variant(value, ("never", "enters", "eventually", "inseparable", "region"))
    if kind == "never":
        margin = rational(*fields(held, ("margin",)))
        if margin < 0:
            raise Malformed("a margin >= 0")
        return kind, margin
    if kind == "enters":
        begin, end, first = fields(held, ("from", "to", "first"))
        begin, end = rational(begin), rational(end)
        if not 0 <= begin <= end:
            raise Malformed("0 <= from <= to")
        return kind, begin, end, truth(first)
    if kind == "eventually":
        begin = rational(*fields(held, ("from",)))
        if begin < 0:
            raise Malformed("from >= 0")
        return kind, begin
    if kind == "inseparable":
        fields(held, ())
        return (kind,)
    return kind, read_region(held)


def read_region(value):
    keys = ("from", "scale", "start", "roots", "rates", "base", "exponents")
    begin, scale, start, roots, rates, base, exponents, power = fields(value, keys, ("power",))

    def root(entry):
        polynomial, re_, im = fields(entry, ("polynomial", "re", "im"))
        return read_monic(polynomial), pair(re_), pair(im)

    def rate(entry):
        of, lo, hi = fields(entry, ("root", "lo", "hi"))
        return position(of), rational(lo), rational(hi)

    def exponent(entry):
        of, growth, turns = fields(entry, ("root", "growth", "turns"))
        return position(of), each(growth, rational), each(turns, integer)

    roots = each(roots, root)
    rates, base, exponents = each(rates, rate), each(base, position), each(exponents, exponent)
    limits.at_most(len(base), limits.DIMENSION, "dimension")
    named = [of for of, _, _ in rates] + list(base) + [of for of, _, _ in exponents]
    if any(of >= len(roots) for of in named):
        raise Malformed("a position in the list of roots")
    for _, growth, turns in exponents:
        if len(growth) != 1 + len(rates) or len(turns) != len(base):
            raise Malformed("one growth for y and each rate, one turn for each base frequency")
    power = None if power is None else rational(power)
    return Region(rational(begin), rational(scale), rational(start), roots, rates, base, exponents, power)


def pair(value):
    ends = each(value, rational)
    if len(ends) != 2:
        raise Malformed("two rationals")
    return ends


def read_monic(value):
    """Coefficients, constant term first, the last one other than 0 is 1."""
    coefficients = each(value, rational)
    while coefficients and coefficients[-1] == 0:
        coefficients = coefficients[:-1]
    limits.at_most(len(coefficients) - 1, limits.ROOTS, "roots")
    if len(coefficients) < 2 or coefficients[-1] != 1:
        raise Malformed("a monic polynomial of degree >= 1")
    return coefficients
