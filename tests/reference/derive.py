"""Derives the outside values that the tests compare with, and writes values.json beside this file.

    python3 -m venv venv
    venv/bin/pip install -r requirements.txt
    venv/bin/python derive.py

The tests read values.json; they never need Python. Each group has a module: the mathematics is described there. A group is derived
with balls (python-flint, the Arb part of FLINT), compared with closed forms where there are any, with the values quoted in
docs/references.md, and with a second opinion by mpmath; nothing is written if one of them disagrees.
"""

import json
import sys
from pathlib import Path

sys.dont_write_bytecode = True
if hasattr(sys, "set_int_max_str_digits"):
    sys.set_int_max_str_digits(0)

import elementary
import exact
import exponential
import exponential_zone
import integer_polynomial
import quoted
import random_trace
import relative_motion
import second_opinion
import spectrum
import step_response

HERE = Path(__file__).resolve().parent


def derived():
    return {
        "step_responses": step_response.step_responses(),
        "late_peaks": step_response.late_peaks(),
        "exponentials": exponential.exponentials(),
        "exponential_zones": exponential_zone.exponential_zones(),
        "functions": elementary.functions(),
        "relative_motion": relative_motion.relative_motion(),
        "traces": random_trace.traces(),
        "factorisations": integer_polynomial.factorisations(),
        "characteristic_polynomials": integer_polynomial.characteristic_polynomials(),
        "spectra": spectrum.spectra(),
        "identities": exact.identities(),
        "trigonometric_extremes": exact.trigonometric_extremes(),
        "dense_orbits": exact.dense_orbits(),
        "recurrences": exact.recurrences(),
        "late_entries": exact.late_entries(),
        "late_stretches": exact.late_stretches(),
        "transcendental_zeros": exact.transcendental_zeros(),
    }


def written(values):
    """JSON with one case a line, so that a change of one case is a change of one line."""
    groups = []
    for name, cases in values.items():
        lines = ",\n".join("  " + json.dumps(case, ensure_ascii=True) for case in cases)
        groups.append(f' "{name}": [\n{lines}\n ]')
    return "{\n" + ",\n".join(groups) + "\n}\n"


def main():
    values = derived()
    contradictions = [*quoted.disagreements(values), *second_opinion.disagreements(values)]
    for line in contradictions:
        print(line, file=sys.stderr)
    if contradictions:
        sys.exit(1)
    (HERE / "values.json").write_text(written(values))
    for name, cases in values.items():
        print(f"{name}: {len(cases)}")


if __name__ == "__main__":
    main()
