"""python check.py STATEMENT CERTIFICATE: verifies a certificate a second time, independently of keepout-check.

Exit status: 0 verified, 1 refuted, 2 inconclusive or a limit, 3 malformed or for another statement, 4 not covered here.
"""

import sys
from pathlib import Path

from answer import Answer, Malformed, Refuted
from certificate import read_certificate
from cone import check_eventually, check_never
from entry import check_entry
from inseparable import check_inseparable
from problem import Problem
from reading import read
from region import check_region
from statement import read_statement

# The rule for a claim, and the kind of evidence it needs.
RULES = {
    "never": ("never", check_never),
    "enters": ("enters", check_entry),
    "eventually": ("never", check_eventually),
    "inseparable": ("inseparable", check_inseparable),
    "region": ("region", check_region),
}


def check(statement_text, certificate_text):
    """Returns if the certificate proves the statement; raises an Answer if not."""
    statement = read_statement(read(statement_text))
    verify(statement, read_certificate(read(certificate_text)))


def verify(statement, certificate):
    if statement != certificate.statement:
        raise Malformed("the certificate is for another statement")
    kind, rule = RULES[statement.claim[0]]
    if certificate.kind != kind:
        raise Refuted("EvidenceFitsClaim", f"evidence of the kind {certificate.kind}")
    rule(Problem(statement, certificate))


def main():
    if len(sys.argv) != 3:
        print(__doc__, file=sys.stderr)
        return 3
    try:
        texts = [Path(name).read_bytes() for name in sys.argv[1:]]
        check(*texts)
    except OSError as error:
        print(f"unreadable: {error}")
        return 3
    except Answer as answer:
        print(answer)
        return answer.status
    print("verified")
    return 0


if __name__ == "__main__":
    sys.exit(main())
