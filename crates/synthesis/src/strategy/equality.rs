//! Relations among roots: sums of two multiples of roots that are roots again.

use crate::enclosure::Enclosure;
use crate::problem::Problem;
use keepout_checker::certificate::{Factor, RootRef, Sum};
use keepout_checker::number::{Complex, Interval, Rational};
use keepout_checker::polynomial::Polynomial;
use keepout_core::IntegerPolynomial;
use num_bigint::BigInt;
use num_traits::{One, Zero};

/// Sums of more pairs of roots than this are not tried.
const MAX_SUMS: usize = 150;

/// A sum whose families are known, but not yet which of their roots it is.
#[derive(Clone, Debug)]
pub(crate) struct OpenSum {
    parts: Vec<(i64, RootRef)>,
    factors: Vec<Factor>,
}

impl OpenSum {
    /// Prepares a sum; its families are added to the problem. `None`: too many sums, or families that overlap.
    pub(crate) fn new(parts: &[(i64, RootRef)], problem: &mut Problem, enclosure: &Enclosure) -> Option<Self> {
        let mut polynomials = Vec::new();
        for (times, part) in parts {
            let family = enclosure.table.get(*part)?.family;
            polynomials.push((Rational::from_integer((*times).into()), problem.families[family].to_monic()));
        }
        let size: usize = polynomials.iter().map(|(_, p)| p.degree()).product();
        if size > MAX_SUMS {
            return None;
        }
        let product = sum_polynomial(&polynomials, size);
        let factors = problem.factor_list(&IntegerPolynomial::from_rationals(product.coefficients()))?;
        Some(Self { parts: parts.to_vec(), factors })
    }

    /// Identifies the root at a precision. `None`: more than one is possible.
    pub(crate) fn close(&self, enclosure: &Enclosure) -> Option<Sum> {
        let value = value(&self.parts, enclosure)?;
        let candidates = enclosure.table.candidates(&value, &self.factors);
        let [root] = candidates.as_slice() else { return None };
        Some(Sum { root: *root, parts: self.parts.clone(), factors: self.factors.clone() })
    }
}

/// Encloses a sum of multiples of roots.
pub(crate) fn value(parts: &[(i64, RootRef)], enclosure: &Enclosure) -> Option<Complex> {
    let bits = enclosure.bits;
    parts.iter().try_fold(Complex::zero(), |sum, (times, part)| {
        let root = enclosure.table.get(*part)?.value;
        Some(sum.add(&root.mul_real(&Interval::integer(*times), bits), bits))
    })
}

/// The monic polynomial whose roots are all sums of multiples of one root of each polynomial.
fn sum_polynomial(parts: &[(Rational, Polynomial)], size: usize) -> Polynomial {
    let mut sums = vec![Rational::zero(); size + 1];
    sums[0] = Rational::one();
    for (times, polynomial) in parts {
        let mut power = Rational::one();
        let mut own = Vec::new();
        for s in polynomial.power_sums(size) {
            own.push(s * &power);
            power *= times;
        }
        sums = (0..=size)
            .map(|k| {
                let mut binomial = BigInt::one();
                let mut total = Rational::zero();
                for j in 0..=k {
                    total += &sums[j] * &own[k - j] * Rational::from_integer(binomial.clone());
                    binomial = binomial * BigInt::from(k - j) / BigInt::from(j + 1);
                }
                total
            })
            .collect();
    }
    // Newton's identities: k c_k = -(s_k + c_1 s_(k-1) + ... + c_(k-1) s_1).
    let mut descending = vec![Rational::one()];
    for k in 1..=size {
        let sum: Rational = (0..k).map(|i| &descending[i] * &sums[k - i]).sum();
        descending.push(-sum / Rational::from_integer(k.into()));
    }
    descending.reverse();
    Polynomial::new(descending)
}
