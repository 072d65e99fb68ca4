//! Factorisation of integer polynomials over the rationals.
//!
//! Square-free decomposition; then, for each square-free part: factors modulo a small prime (Cantor-Zassenhaus),
//! lifted to a modulus above twice the factor bound (Hensel), and recombined by exact trial division, subsets of
//! growing size first. The number of subsets is capped: what is left over is reported as
//! [`Irreducibility::NotFactoredFurther`]. The product of the factors with their multiplicities is the input, exactly,
//! in every case. Source: von zur Gathen and Gerhard, Modern Computer Algebra, ch. 14 and 15 (from memory); Mignotte,
//! Math. Comp. 28 (1974) 1153-1157.

mod hensel;
mod modular_factor;
mod recombination;

use crate::integer_polynomial::IntegerPolynomial;
use num_bigint::BigInt;

/// What is known about a factor.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash)]
pub enum Irreducibility {
    /// Proved irreducible over the rationals.
    Proved,
    /// The search ended at its limit: the factor may split further.
    NotFactoredFurther,
}

/// One factor of a [`Factorization`].
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Factor {
    /// Primitive, square-free, not constant, leading coefficient positive.
    pub polynomial: IntegerPolynomial,
    /// Its exponent in the product.
    pub multiplicity: usize,
    /// Whether it is proved irreducible.
    pub irreducibility: Irreducibility,
}

/// A polynomial as `unit` times a product of powers of pairwise coprime primitive factors.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Factorization {
    /// The constant factor, with sign.
    pub unit: BigInt,
    /// The factors, by degree, then coefficients.
    pub factors: Vec<Factor>,
}

impl Factorization {
    /// unit * prod factor^multiplicity.
    pub fn product(&self) -> IntegerPolynomial {
        let unit = IntegerPolynomial::constant(self.unit.clone());
        self.factors.iter().fold(unit, |product, f| &product * &f.polynomial.power(f.multiplicity))
    }

    /// Whether every factor is proved irreducible.
    pub fn is_complete(&self) -> bool {
        self.factors.iter().all(|f| f.irreducibility == Irreducibility::Proved)
    }
}

/// The cap on tried subsets used by [`factorize`].
pub const DEFAULT_SUBSET_LIMIT: usize = 200_000;

/// The factorisation of a polynomial over the rationals; for 0 the unit 0 and no factor.
///
/// # Guarantee
/// [`Factorization::product`] is the input. A factor marked [`Irreducibility::Proved`] is irreducible.
///
/// ```
/// use keepout_core::{IntegerPolynomial, factorize};
/// let f = factorize(&IntegerPolynomial::from_small(&[-2, 0, 0, 0, 0, 0, 2])); // 2 z^6 - 2
/// let degrees: Vec<_> = f.factors.iter().map(|f| f.polynomial.degree()).collect();
/// assert_eq!(degrees, [1, 1, 2, 2]);
/// assert!(f.is_complete());
/// ```
pub fn factorize(polynomial: &IntegerPolynomial) -> Factorization {
    factorize_within(polynomial, DEFAULT_SUBSET_LIMIT)
}

/// The same as [`factorize`], trying at most `subset_limit` subsets of modular factors for each square-free part.
pub fn factorize_within(polynomial: &IntegerPolynomial, subset_limit: usize) -> Factorization {
    let primitive = polynomial.primitive_part();
    let unit = if polynomial.is_zero() { BigInt::ZERO } else { polynomial.leading() / primitive.leading() };
    let mut factors = Vec::new();
    for (part, multiplicity) in primitive.square_free_decomposition() {
        for (polynomial, irreducibility) in factor_square_free(&part, subset_limit) {
            factors.push(Factor { polynomial, multiplicity, irreducibility });
        }
    }
    factors.sort_by(|a, b| {
        let key = |f: &Factor| (f.polynomial.degree(), f.polynomial.bits());
        key(a).cmp(&key(b)).then_with(|| a.polynomial.coefficients().cmp(b.polynomial.coefficients()))
    });
    Factorization { unit, factors }
}

/// The factors of a primitive square-free polynomial of positive degree.
fn factor_square_free(f: &IntegerPolynomial, subset_limit: usize) -> Vec<(IntegerPolynomial, Irreducibility)> {
    if f.degree() <= 1 {
        return vec![(f.clone(), Irreducibility::Proved)];
    }
    let variable = IntegerPolynomial::variable();
    if let Some(rest) = f.divide_exact(&variable) {
        let mut factors = factor_square_free(&rest, subset_limit);
        factors.push((variable, Irreducibility::Proved));
        return factors;
    }
    let modular = modular_factor::best_modular_factors(f);
    if modular.factors.len() == 1 || modular.possible_degrees.len() <= 2 {
        return vec![(f.clone(), Irreducibility::Proved)];
    }
    let lifted = hensel::lift(f, &modular);
    recombination::recombine(f, lifted, &modular.possible_degrees, subset_limit)
}
