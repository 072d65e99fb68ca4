"""What all rules work on: the claimed formula, its functions with their closed forms, sums and identities, all confirmed."""

import flint
from answer import Malformed, ensure
from exponential import Exponentials
from flint import fmpq
from model import Flow, affine_polynomial, claimed_formula, expanded
from roots import Roots
from signs import ALL, exact_sign, narrowed
from trace import auxiliary, check_identity, trace


# Any precision is sound; with a few bits more than the certificate names, rounding does not decide where that does.
GUARD_BITS = 32


class Problem:
    def __init__(self, statement, certificate):
        self.statement, self.certificate = statement, certificate
        flint.ctx.prec = certificate.bits + GUARD_BITS
        self.roots = Roots(certificate.families, certificate.bits)
        self.formula, self.polynomials = claimed_formula(statement)
        flow = Flow(statement)
        outputs = dict(statement.outputs)
        self.expanded = [expanded(polynomial, outputs) for polynomial in self.polynomials]
        self.read_traces(flow)
        self.functions += [auxiliary(self.roots, *entry) for entry in certificate.auxiliaries]
        for function in self.functions:
            if function is not None:
                function.closed_form()
        for target, summands in certificate.identities:
            for of in [target] + [of for powers in summands for of, _ in powers]:
                self.function_at(of)
                ensure(of not in self.exponentials, "IdentityHolds", "a polynomial with exponentials")
            check_identity(self.functions, (target, summands))
        for claim in certificate.sums:
            self.roots.check_sum(claim)

    def read_traces(self, flow):
        """Traces of the polynomials; of coefficients and arguments of those with exponentials; of the states of a region."""
        statement = self.statement
        arguments = {name: affine_polynomial(affine) for name, affine in statement.exponentials}
        wanted, self.exponentials, terms = [], {}, []
        for position, polynomial in enumerate(self.expanded):
            parts = Exponentials.parts(self.polynomials[position], polynomial, arguments)
            if parts is None:
                wanted.append(polynomial)
            else:
                wanted.append(None)
                terms.append((position, parts))
        for position, parts in terms:
            first = len(wanted)
            for coefficient, argument in parts:
                wanted += [coefficient, argument]
            self.exponentials[position] = [(first + 2 * k, first + 2 * k + 1) for k in range(len(parts))]
        self.first_state = len(wanted)
        if statement.claim[0] == "region":
            wanted += [{((name, 1),): fmpq(1)} for name in statement.states]
        lists = self.certificate.traces
        ensure(len(lists) == len(wanted), "EvidenceFitsClaim", "number of lists of factors")
        self.functions = []
        for polynomial, factors in zip(wanted, lists):
            if polynomial is None:
                ensure(not factors, "EvidenceFitsClaim", "factors of a polynomial with exponentials")
                self.functions.append(None)
            else:
                self.functions.append(trace(flow, self.roots, polynomial, factors))

    def function_at(self, position):
        """The function at a position; None if it is a polynomial with exponentials."""
        if position >= len(self.functions):
            raise Malformed("a position in the list of functions", str(position))
        return self.functions[position]

    def sum_at(self, position):
        if position >= len(self.certificate.sums):
            raise Malformed("a position in the list of sums", str(position))
        return self.certificate.sums[position]

    def open_signs(self):
        """All three signs for each function."""
        return [ALL for _ in self.functions]

    def exact_signs(self):
        """The signs at t = 0; of a polynomial with exponentials by an enclosure."""
        signs = []
        for position, function in enumerate(self.functions):
            if function is None:
                sign = Exponentials.sign_at_start(self, position)
                signs.append(frozenset(sign) if sign else ALL)
            else:
                signs.append(frozenset(exact_sign(function.value_at_start())))
        return signs

    def narrowed(self, signs):
        return narrowed(signs, self.certificate.identities)

