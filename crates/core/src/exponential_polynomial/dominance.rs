//! The order of growth of the terms of an exponential polynomial.
//!
//! Classes (Re mu, j) in decreasing lexicographic order; only terms whose coefficient is exactly proved non-zero are
//! listed. Equality of real parts is proved as in [`crate::structure`]; the first class is the lead for large t.

use super::ExponentialPolynomial;
use crate::error::CoreError;
use crate::factor::Irreducibility;
use crate::root::{RootDisc, enclose_roots};
use crate::structure::{Eigenvalue, Evidence, PairSums, RateClass, SpectralFactor, rate_classes};

/// All terms with one real part and one power of t.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct DominanceClass {
    /// The exponents (imaginary part >= 0, conjugates implied) with non-zero coefficient.
    pub exponents: Vec<RootDisc>,
    /// The power of t.
    pub power: usize,
    /// The real part: enclosure, rational value if known, and whether all members' equality is proved.
    pub rate: RateClass,
}

impl ExponentialPolynomial {
    /// The classes of terms with non-zero coefficients, dominant class first.
    ///
    /// # Guarantee
    /// A class with [`Evidence::Proved`] in its rate has equal real parts; different classes have proved different
    /// (real part, power). No listed coefficient is 0, and no non-zero term is missing.
    ///
    /// # Errors
    /// [`CoreError::LimitExceeded`] if roots cannot be separated, or a coefficient's vanishing cannot be located at
    /// `bits_limit`.
    pub fn dominance(&self, bits: u32, bits_limit: u32) -> Result<Vec<DominanceClass>, CoreError> {
        let coefficients = self.coefficients();
        let factors: Vec<SpectralFactor> = self.factors.iter().map(spectral).collect();
        let mut bits = bits.max(8);
        let mut sums = PairSums::default();
        loop {
            let mut eigenvalues = Vec::new();
            for (factor, (q, _)) in self.factors.iter().enumerate() {
                let upper = enclose_roots(q, bits)?.into_iter().filter(|d| d.im.sign() != std::cmp::Ordering::Less);
                eigenvalues.extend(upper.map(|disc| Eigenvalue { disc, factor }));
            }
            let rates = rate_classes(&factors, &eigenvalues, &mut sums, bits);
            let mut classes = Vec::new();
            let mut decided = rates.iter().all(|r| r.equality == Evidence::Proved);
            for rate in &rates {
                let highest =
                    rate.eigenvalues.iter().map(|i| self.factors[eigenvalues[*i].factor].1).max().unwrap_or(0);
                for power in (0..highest).rev() {
                    let mut exponents = Vec::new();
                    for i in &rate.eigenvalues {
                        let Eigenvalue { disc, factor } = &eigenvalues[*i];
                        let q = &self.factors[*factor].0;
                        let Some(c) = coefficients.iter().find(|c| c.factor == *q && c.power == power) else {
                            continue;
                        };
                        match c.vanishes_at(disc, bits) {
                            Some(false) => exponents.push(disc.clone()),
                            Some(true) => {}
                            None => decided = false,
                        }
                    }
                    if !exponents.is_empty() {
                        classes.push(DominanceClass { exponents, power, rate: rate.clone() });
                    }
                }
            }
            if decided {
                return Ok(classes);
            }
            if bits >= bits_limit {
                return Err(CoreError::LimitExceeded { what: "bits of a dominance order", limit: bits_limit.into() });
            }
            bits = (2 * bits).min(bits_limit);
        }
    }
}

fn spectral((q, e): &(crate::IntegerPolynomial, usize)) -> SpectralFactor {
    SpectralFactor {
        polynomial: q.clone(),
        irreducibility: Irreducibility::NotFactoredFurther,
        algebraic_multiplicity: *e,
        index: Some(*e),
    }
}
