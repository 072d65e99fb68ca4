//! Approximations of roots for a certificate.

use keepout_checker::number::Dyadic;
use keepout_core::IntegerPolynomial;
use keepout_core::root::enclose_roots;
use std::cmp::Ordering;

/// The centres of the roots with imaginary part >= 0, to somewhat more than `bits` bits. None at all where the root finder
/// gives up: then the checker's discs cannot be formed, and this precision is passed over.
pub(crate) fn centres(polynomial: &IntegerPolynomial, bits: u32) -> Vec<(Dyadic, Dyadic)> {
    let discs = enclose_roots(polynomial, bits + 8).unwrap_or_default();
    discs.into_iter().filter(|d| d.im.sign() != Ordering::Less).map(|d| (d.re, d.im)).collect()
}
