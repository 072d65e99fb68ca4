//! The ring Q[z]/(q) for a square-free q: elements as an integer polynomial over a positive denominator.
//!
//! Invariant: deg numerator < deg q, and numerator and denominator have no common integer factor.

use crate::integer_polynomial::IntegerPolynomial;
use num_bigint::BigInt;
use num_integer::Integer;
use num_traits::{One, Signed};

#[derive(Clone, Debug)]
pub(super) struct Residue {
    pub(super) numerator: IntegerPolynomial,
    pub(super) denominator: BigInt,
}

impl Residue {
    /// numerator / denominator modulo q; the denominator is not 0.
    pub(super) fn new(numerator: &IntegerPolynomial, denominator: &BigInt, q: &IntegerPolynomial) -> Self {
        let (factor, rest) = numerator.pseudo_remainder(q);
        let mut denominator = denominator * factor;
        let mut common = rest.content().gcd(&denominator);
        if denominator.is_negative() {
            common = -common;
        }
        if common.is_one() {
            return Self { numerator: rest, denominator };
        }
        denominator /= &common;
        let coefficients = rest.coefficients().iter().map(|c| c / &common).collect();
        Self { numerator: IntegerPolynomial::new(coefficients), denominator }
    }

    pub(super) fn zero() -> Self {
        Self { numerator: IntegerPolynomial::zero(), denominator: BigInt::one() }
    }

    pub(super) fn one() -> Self {
        Self { numerator: IntegerPolynomial::one(), denominator: BigInt::one() }
    }

    pub(super) fn mul(&self, other: &Self, q: &IntegerPolynomial) -> Self {
        Self::new(&(&self.numerator * &other.numerator), &(&self.denominator * &other.denominator), q)
    }

    pub(super) fn sub(&self, other: &Self, q: &IntegerPolynomial) -> Self {
        let (a, b) = (self.numerator.scale(&other.denominator), other.numerator.scale(&self.denominator));
        Self::new(&(&a - &b), &(&self.denominator * &other.denominator), q)
    }

    /// 1 / self; `None` if the element has a common root with q.
    ///
    /// Source: Euclid's scheme with content removed at each step: c_i r_i = s_i a modulo q throughout.
    pub(super) fn inverse(&self, q: &IntegerPolynomial) -> Option<Self> {
        let (mut r0, mut r1) = (q.clone(), self.numerator.clone());
        let (mut s0, mut s1) = (IntegerPolynomial::zero(), IntegerPolynomial::one());
        while !r1.is_constant() {
            let (factor, quotient, rest) = r0.pseudo_division(&r1);
            let s = &s0.scale(&factor) - &(&quotient * &s1);
            let common = rest.content().gcd(&s.content());
            if rest.is_zero() {
                return None;
            }
            let divided =
                |p: &IntegerPolynomial| IntegerPolynomial::new(p.coefficients().iter().map(|c| c / &common).collect());
            (r0, r1) = (r1, divided(&rest));
            (s0, s1) = (s1, divided(&s));
        }
        // r1 = s1 numerator modulo q with r1 a constant, so 1/self = denominator s1 / r1.
        let constant = r1.leading();
        (!r1.is_zero()).then(|| Self::new(&s1.scale(&self.denominator), &constant, q))
    }
}
