"""JSON texts with refusals, and the small kinds of texts: rationals, dyadics, counts."""

import json
import re
import sys

from answer import Malformed
from flint import fmpq

import limits

sys.set_int_max_str_digits(0)

STRING = re.compile(r'"((?:[^"\\]|\\.)*)"', re.DOTALL)
ESCAPE = re.compile(r"\\(u[0-9a-fA-F]{4}|.)", re.DOTALL)


def read(data):
    """The value of a text in bytes."""
    limits.at_most(len(data), limits.TEXT_BYTES, "text_bytes")
    try:
        text = data.decode("utf-8")
    except UnicodeDecodeError as error:
        raise Malformed("utf-8", str(error)) from error
    refuse_nesting(text)
    try:
        value = json.loads(text, object_pairs_hook=once, parse_int=number, parse_float=number, parse_constant=number)
    except ValueError as error:
        raise Malformed("json", str(error)) from error
    refuse_null(value)
    return value


def refuse_nesting(text):
    """Refuses surrogate escapes and deep nesting, before anything recursive looks at the text."""
    for string in STRING.findall(text):
        for escape in ESCAPE.findall(string):
            if re.fullmatch("u[dD][89a-fA-F]..", escape):
                raise Malformed("surrogate escape", escape)
    depth = 0
    for bracket in re.findall(r"[\[\]{}]", STRING.sub("", text)):
        depth += 1 if bracket in "[{" else -1
        limits.at_most(depth, limits.NESTING, "nesting")


def once(pairs):
    """An object without a repeated key."""
    limits.at_most(len(pairs), limits.ENTRIES, "statement_entries")
    if len({key for key, _ in pairs}) != len(pairs):
        raise Malformed("each key once")
    return dict(pairs)


def number(token):
    raise Malformed("a number is a string", token)


def refuse_null(value):
    """Refuses null, wherever it is."""
    open_values = [value]
    while open_values:
        value = open_values.pop()
        if value is None:
            raise Malformed("no null")
        if isinstance(value, dict):
            open_values += value.values()
        elif isinstance(value, list):
            open_values += value


def fields(value, required, optional=()):
    """The fields of an object with these keys, absent ones as None."""
    if not isinstance(value, dict):
        raise Malformed("an object", repr(value)[:60])
    for key in value:
        if key not in required and key not in optional:
            raise Malformed("a key of the format", key)
    for key in required:
        if key not in value:
            raise Malformed("missing key", key)
    return [value.get(key) for key in (*required, *optional)]


def variant(value, names):
    """The one key of an object, and what it holds."""
    if not isinstance(value, dict) or len(value) != 1 or next(iter(value)) not in names:
        raise Malformed("one of " + ", ".join(names), repr(value)[:60])
    return next(iter(value.items()))


def text(value):
    if not isinstance(value, str):
        raise Malformed("a text", repr(value)[:60])
    return value


def truth(value):
    if not isinstance(value, bool):
        raise Malformed("true or false", repr(value)[:60])
    return value


def each(value, read_one, limit=limits.ENTRIES, name="statement_entries"):
    """A tuple of what `read_one` makes of each entry of a list."""
    if not isinstance(value, list):
        raise Malformed("a list", repr(value)[:60])
    limits.at_most(len(value), limit, name)
    return tuple(read_one(entry) for entry in value)


def digits(value, pattern, what):
    """The groups of a number's text."""
    text(value)
    limits.at_most(len(value), limits.NUMBER_LENGTH, "number_length")
    match = re.fullmatch(pattern, value, re.ASCII)
    if not match:
        raise Malformed(what, value[:60])
    return match.groups()


def rational(value):
    p, q = digits(value, r"(-?\d+)(?:/(\d+))?", "a rational")
    if q is not None and int(q) == 0:
        raise Malformed("a rational", value)
    return fmpq(int(p), int(q or "1"))


def dyadic(value):
    """Mantissa and exponent."""
    mantissa, exponent = digits(value, r"(-?\d+)(?:p(-?\d+))?", "a dyadic")
    exponent = int(exponent or "0")
    limits.at_most(abs(exponent), limits.EXPONENT, "exponent")
    return int(mantissa), exponent


def count(value):
    return int(digits(value, r"(\d+)", "a count")[0])


def positive(value):
    found = count(value)
    if found < 1:
        raise Malformed("a count >= 1", value)
    return found


def integer(value):
    return int(digits(value, r"(-?\d+)", "an integer")[0])


def root_name(value):
    """Position of a root, and whether its conjugate is meant."""
    position, star = digits(value, r"(\d+)(\*?)", "a root")
    return int(position), star == "*"


def signed(value):
    """Position of a function and a sign."""
    position, sign = digits(value, r"(\d+):([-0+])", "a signed function")
    return int(position), sign


def power(value):
    """Position of a function and an exponent."""
    position, exponent = digits(value, r"(\d+)\^(\d+)", "a power")
    if int(exponent) < 1:
        raise Malformed("a power", value)
    return int(position), int(exponent)
