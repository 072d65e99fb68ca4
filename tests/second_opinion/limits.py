"""The limits of docs/certificate-format.md. `work` is not counted here."""

from answer import Limit

TEXT_BYTES = 33554432
NESTING = 64
NUMBER_LENGTH = 10000
ENTRIES = 10000
DEGREE = 24
DERIVATIVES = 4000
ROOTS = 3000
BITS = 20000
ORDER = 400
CELLS = 200000
DEPTH = 200
NODES = 400000
DIMENSION = 8
MULTIPLIER_BITS = 16
EXPONENT = 2**24


def at_most(found, limit, name):
    """Refuses a size beyond its limit."""
    if found > limit:
        raise Limit(name, f"{found} > {limit}")
