//! Factors of a square-free polynomial modulo a small prime.
//!
//! Distinct-degree splitting for several primes; the prime with the fewest factors is kept, and the sets of possible
//! degrees of rational factors are intersected. Equal-degree splitting with a fixed pseudo-random sequence: the result
//! does not depend on chance. Source: Cantor and Zassenhaus, Math. Comp. 36 (1981) 587-592.

use crate::integer_polynomial::IntegerPolynomial;
use crate::modular::{Field, small_primes};
use crate::modular_polynomial as mp;
use num_bigint::BigUint;
use std::collections::BTreeSet;

/// Primes from here on are used: small enough for cheap lifting, large enough to be rarely bad.
const FIRST_PRIME: u64 = 29;
/// So many good primes are compared.
const TRIED_PRIMES: usize = 6;

/// Pairs (g, d): g the product of all irreducible factors of degree d.
type DegreeParts = Vec<(mp::Residues, usize)>;

/// The factors modulo one prime.
pub(super) struct ModularFactors {
    pub(super) field: Field,
    /// Monic, irreducible modulo p, pairwise coprime.
    pub(super) factors: Vec<mp::Residues>,
    /// No rational factor has a degree outside this set; it contains 0 and deg f.
    pub(super) possible_degrees: BTreeSet<usize>,
}

/// The factorisation modulo the most favourable of a few primes. f is square-free of degree >= 2.
pub(super) fn best_modular_factors(f: &IntegerPolynomial) -> ModularFactors {
    let mut best: Option<(usize, Field, DegreeParts)> = None;
    let mut possible: BTreeSet<usize> = (0..=f.degree()).collect();
    let mut good = 0;
    for p in small_primes(FIRST_PRIME) {
        let field = Field::new(p);
        let residues = f.residues(&field);
        if residues.len() != f.coefficients().len() {
            continue;
        }
        let monic = mp::monic(&field, &residues);
        if mp::gcd(&field, &monic, &mp::derivative(&field, &monic)).len() != 1 {
            continue;
        }
        let parts = distinct_degree(&field, &monic);
        let degrees: Vec<usize> = parts.iter().flat_map(|(g, d)| std::iter::repeat_n(*d, (g.len() - 1) / d)).collect();
        let sums = subset_sums(&degrees);
        possible.retain(|d| sums.contains(d));
        if best.as_ref().is_none_or(|(count, _, _)| degrees.len() < *count) {
            best = Some((degrees.len(), field, parts));
        }
        good += 1;
        let fewest = best.as_ref().map_or(usize::MAX, |(count, _, _)| *count);
        if good >= TRIED_PRIMES || fewest <= 2 || possible.len() <= 2 {
            break;
        }
    }
    let Some((_, field, parts)) = best else {
        unreachable!("a square-free polynomial stays so modulo almost all primes")
    };
    let mut state = 0x9e37_79b9_7f4a_7c15u64;
    let mut factors = Vec::new();
    if possible.len() > 2 {
        for (g, d) in parts {
            equal_degree(&field, g, d, &mut state, &mut factors);
        }
        factors.sort();
    }
    ModularFactors { field, factors, possible_degrees: possible }
}

fn subset_sums(degrees: &[usize]) -> BTreeSet<usize> {
    let mut sums = BTreeSet::from([0]);
    for d in degrees {
        sums = sums.iter().flat_map(|s| [*s, s + d]).collect();
    }
    sums
}

/// Splits a monic square-free polynomial by the degrees of its factors.
fn distinct_degree(field: &Field, f: &[u64]) -> DegreeParts {
    let mut parts = Vec::new();
    let mut rest = f.to_vec();
    let exponent = mp::bits_of(&BigUint::from(field.prime()));
    let z = vec![0, field.one()];
    let mut power = z.clone();
    for d in 1.. {
        if rest.len() < 2 * d + 1 {
            break;
        }
        power = mp::pow_mod(field, &power, &exponent, &rest);
        let g = mp::gcd(field, &rest, &mp::sub(field, &power, &z));
        if g.len() > 1 {
            rest = mp::div_rem(field, &rest, &g).0;
            power = mp::rem(field, &power, &rest);
            parts.push((g, d));
        }
    }
    if rest.len() > 1 {
        let degree = rest.len() - 1;
        parts.push((rest, degree));
    }
    parts
}

/// Splits a product of irreducible factors of degree d.
fn equal_degree(field: &Field, g: mp::Residues, d: usize, state: &mut u64, factors: &mut Vec<mp::Residues>) {
    if g.len() - 1 == d {
        factors.push(g);
        return;
    }
    let exponent = mp::bits_of(&((BigUint::from(field.prime()).pow(d as u32) - 1u32) / 2u32));
    loop {
        let random = mp::trim((1..g.len()).map(|_| field.residue(xorshift(state))).collect());
        let power = mp::pow_mod(field, &random, &exponent, &g);
        let split = mp::gcd(field, &g, &mp::sub(field, &power, &[field.one()]));
        if split.len() > 1 && split.len() < g.len() {
            let other = mp::div_rem(field, &g, &split).0;
            equal_degree(field, split, d, state, factors);
            equal_degree(field, other, d, state, factors);
            return;
        }
    }
}

/// Marsaglia's xorshift64: a fixed sequence of varied words.
fn xorshift(state: &mut u64) -> u64 {
    *state ^= *state << 13;
    *state ^= *state >> 7;
    *state ^= *state << 17;
    *state
}
