//! Minimal annihilators of integer sequences that obey a linear recurrence.
//!
//! A sequence y is annihilated by m = sum m_j z^j if sum_j m_j y_(k+j) = 0 for all k. The annihilators form an ideal;
//! if it contains a monic integer polynomial, its monic generator has integer coefficients too (Gauss's lemma). The
//! generator is found modulo word-size primes (Berlekamp-Massey), lifted until stable, and verified on the whole
//! sequence in integers. It is minimal because the Hankel rank modulo a prime is never above the rank over the
//! rationals. Source: Massey, IEEE Trans. IT 15 (1969) 122-127, doi:10.1109/TIT.1969.1054260.

use crate::integer_polynomial::IntegerPolynomial;
use crate::modular::{Field, Reconstruction, large_field};
use num_bigint::BigInt;
use num_traits::Zero;

/// The monic integer polynomial of least degree that annihilates the given terms.
///
/// `sequence` holds y_0 .. y_(2N-1). `None` if no monic integer annihilator of degree <= N was found.
///
/// # Guarantee
/// The result annihilates all terms given, exactly. If the sequence is known to obey *some* recurrence of order <= N,
/// the result annihilates the infinite sequence and is its minimal annihilator; 1 stands for the zero sequence.
///
/// # Cost
/// O(N^2) word operations for each 62 bits of the result, and N^2 integer products for the verification.
///
/// ```
/// use keepout_core::linear_recurrence::minimal_annihilator;
/// use keepout_core::IntegerPolynomial;
/// let fibonacci: Vec<_> = [0, 1, 1, 2, 3, 5, 8, 13].into_iter().map(Into::into).collect();
/// assert_eq!(minimal_annihilator(&fibonacci), Some(IntegerPolynomial::from_small(&[-1, -1, 1])));
/// ```
pub fn minimal_annihilator(sequence: &[BigInt]) -> Option<IntegerPolynomial> {
    if sequence.iter().all(Zero::is_zero) {
        return Some(IntegerPolynomial::one());
    }
    // By Cramer's rule the coefficients are quotients of Hankel determinants of order <= N, of at most N (bits +
    // log2(N)/2) bits (Hadamard). The cap allows twice that and some unlucky primes; it ends the search for sequences
    // without integer annihilator.
    let largest = sequence.iter().map(BigInt::bits).max().unwrap_or(0) + 16;
    let cap = 16 + usize::try_from(largest).ok()?.checked_mul(sequence.len())? / 61;
    let mut best = 0;
    let mut lifted = Reconstruction::default();
    for index in 0..cap {
        let field = large_field(index);
        let residues: Vec<u64> = sequence.iter().map(|y| field.residue_of(y)).collect();
        let connection = berlekamp_massey(&field, &residues);
        let degree = connection.len() - 1;
        if 2 * degree > sequence.len() {
            return None;
        }
        if degree < best {
            continue;
        }
        if degree > best {
            best = degree;
            lifted = Reconstruction::default();
        }
        if lifted.push(field, &connection) {
            let candidate = IntegerPolynomial::new(lifted.values());
            if annihilates(&candidate, sequence) {
                return Some(candidate);
            }
        }
    }
    None
}

/// Whether sum_j m_j y_(k+j) = 0 for each k for which all terms are given.
pub fn annihilates(m: &IntegerPolynomial, sequence: &[BigInt]) -> bool {
    if m.is_zero() {
        return true;
    }
    sequence.windows(m.degree() + 1).all(|window| {
        let sum: BigInt = m.coefficients().iter().zip(window).map(|(c, y)| c * y).sum();
        sum.is_zero()
    })
}

/// The monic annihilator of least degree modulo p, ascending: z^L C(1/z) for the connection polynomial C.
pub(crate) fn berlekamp_massey(field: &Field, sequence: &[u64]) -> Vec<u64> {
    let mut current = vec![field.one()];
    let mut previous = vec![field.one()];
    let (mut order, mut gap, mut last) = (0usize, 1usize, field.one());
    for n in 0..sequence.len() {
        let mut discrepancy = 0;
        for (i, c) in current.iter().enumerate().take(order + 1) {
            discrepancy = field.add(discrepancy, field.mul(*c, sequence[n - i]));
        }
        if discrepancy == 0 {
            gap += 1;
            continue;
        }
        let factor = field.mul(discrepancy, field.inverse(last));
        let saved = (2 * order <= n).then(|| current.clone());
        if current.len() < previous.len() + gap {
            current.resize(previous.len() + gap, 0);
        }
        for (slot, b) in current[gap..].iter_mut().zip(&previous) {
            *slot = field.sub(*slot, field.mul(factor, *b));
        }
        match saved {
            Some(old) => {
                order = n + 1 - order;
                previous = old;
                last = discrepancy;
                gap = 1;
            }
            None => gap += 1,
        }
    }
    current.resize(order + 1, 0);
    current.reverse();
    current
}
