//! From factors modulo p^k to factors over the rationals.
//!
//! Subsets of growing size are multiplied out modulo p^k with the leading coefficient, reduced to least absolute
//! value, made primitive and tried by exact division. A quick test on the constant coefficient skips most subsets.
//! When all subsets of at most half the remaining factors fail, the rest is irreducible.
//! Source: Zassenhaus, J. Number Theory 1 (1969) 291-311 (from memory).

use super::Irreducibility;
use super::hensel::{LiftedFactors, balanced, reduce};
use crate::integer_polynomial::IntegerPolynomial;
use num_bigint::BigInt;
use num_traits::Zero;
use std::collections::BTreeSet;

/// The rational factors of f (primitive, square-free, f(0) != 0).
pub(super) fn recombine(
    f: &IntegerPolynomial,
    lifted: LiftedFactors,
    possible_degrees: &BTreeSet<usize>,
    subset_limit: usize,
) -> Vec<(IntegerPolynomial, Irreducibility)> {
    let mut found = Vec::new();
    let mut rest = f.clone();
    let mut pool = lifted.factors;
    let mut tried = 0;
    let mut size = 1;
    while 2 * size <= pool.len() {
        match next_factor(&rest, &pool, size, &lifted.modulus, possible_degrees, subset_limit, &mut tried) {
            Search::Found { factor, quotient, subset } => {
                found.push((factor, Irreducibility::Proved));
                rest = quotient;
                for i in subset.into_iter().rev() {
                    pool.remove(i);
                }
            }
            Search::Nothing => size += 1,
            Search::LimitReached => {
                found.push((rest, Irreducibility::NotFactoredFurther));
                return found;
            }
        }
    }
    if !rest.is_constant() {
        found.push((rest, Irreducibility::Proved));
    }
    found
}

enum Search {
    Found { factor: IntegerPolynomial, quotient: IntegerPolynomial, subset: Vec<usize> },
    Nothing,
    LimitReached,
}

/// The first factor made of `size` members of the pool. All smaller subsets have failed, so it is irreducible.
fn next_factor(
    rest: &IntegerPolynomial,
    pool: &[IntegerPolynomial],
    size: usize,
    modulus: &BigInt,
    possible_degrees: &BTreeSet<usize>,
    subset_limit: usize,
    tried: &mut usize,
) -> Search {
    let lead = rest.leading();
    let scaled_constant = rest.coefficient(0) * &lead;
    let mut subset: Vec<usize> = (0..size).collect();
    loop {
        *tried += 1;
        if *tried > subset_limit {
            return Search::LimitReached;
        }
        let degree = subset.iter().map(|i| pool[*i].degree()).sum();
        if possible_degrees.contains(&degree) {
            let constant = subset.iter().fold(lead.clone(), |c, i| balanced(&(c * pool[*i].coefficient(0)), modulus));
            if !constant.is_zero() && (&scaled_constant % &constant).is_zero() {
                let start = IntegerPolynomial::constant(lead.clone());
                let product = subset.iter().fold(start, |m, i| reduce(&(&m * &pool[*i]), modulus));
                let factor = product.primitive_part();
                if let Some(quotient) = rest.divide_exact(&factor) {
                    return Search::Found { factor, quotient, subset };
                }
            }
        }
        if !advance(&mut subset, pool.len()) {
            return Search::Nothing;
        }
    }
}

/// The next subset in lexicographic order; false after the last.
fn advance(subset: &mut [usize], total: usize) -> bool {
    let size = subset.len();
    for k in (0..size).rev() {
        if subset[k] + size - k < total {
            subset[k] += 1;
            for j in k + 1..size {
                subset[j] = subset[j - 1] + 1;
            }
            return true;
        }
    }
    false
}
