"""exp, cos and sin at rational points, by Arb: small, large, negative, exact dyadics, close to multiples of pi/2."""

from fractions import Fraction as F
from math import floor, log

from flint import arb

from ball import bounds, is_sharp, rational, sharpened

POINTS = [
    "0", "1", "-1", "1/2", "-1/2", "1/3", "-1/3", "2/3", "7/10", "3", "-3", "7/2", "-7/2", "10", "-10", "100", "-100", "1000", "-1000",
    "1/1000000", "-1/1000000", f"1/{2**100}", f"-1/{2**100}", f"{2**200 + 1}/{2**200}", "5/1024", "-12345/65536", "1048577/1048576",
    # convergents of pi and pi/2: sin or cos is small there
    "22/7", "-22/7", "355/113", "11/7", "103993/33102", "-104348/66317", "208341/132630",
    "12345/67", "-98765/43", "100000", "-100000", "1000000", "-1000000", "999999/7", "-31415926535/31416",
]
DIGITS = 100
WRITTEN_OUT = 1000
SOURCE = "computed with Arb"


def sharp(values):
    return all(is_sharp(v, DIGITS + 2, -400) for v in values)


def scaled(x):
    """exp x as a mantissa, about 1 to 10, and a power of ten."""
    k = floor(float(F(x)) / log(10))
    mantissa = sharpened(lambda: (rational(x) - k * arb(10).log()).exp(), lambda v: is_sharp(v, DIGITS + 2))
    return {"mantissa": bounds(mantissa, DIGITS), "power_of_ten": str(k)}


def functions():
    result = []
    for x in POINTS:
        cos, sin = sharpened(lambda: [rational(x).cos(), rational(x).sin()], sharp)
        entry = {"x": x, "source": SOURCE, "cos": bounds(cos, DIGITS, -400), "sin": bounds(sin, DIGITS, -400)}
        if abs(F(x)) <= WRITTEN_OUT:
            exp, = sharpened(lambda: [rational(x).exp()], lambda v: is_sharp(v[0], DIGITS + 2, -600))
            entry["exp"] = bounds(exp, DIGITS, -600)
        else:
            entry["exp_scaled"] = scaled(x)
        result.append(entry)
    return result
