//! Rule `equality`: a sum of integer multiples of one or two roots is a named root, exactly.
//!
//! Needs: the multiset of all sums n_1 a + n_2 b, a and b roots of the two polynomials, is the multiset of roots of the product
//! of the listed families; and the enclosure of the sum in question meets the enclosure of one root of these alone.
//! Not needed: that the listed families are irreducible, or that the sums are distinct.
//! Why: the sum is a root of the product, each root of the product lies in its own enclosure, and only one is left.
//! The multisets are compared by power sums: two multisets of N complex numbers with equal power sums 1 .. N are equal
//! (Newton's identities); the k-th power sum of n_1 a + n_2 b is sum_j binom(k, j) n_1^j s_j n_2^(k-j) s'_(k-j).
//! Source: docs/theorems/equality.md.

use crate::certificate::{RootRef, Sum};
use crate::error::{Checked, Duty, Obligation, Rule};
use crate::limits::{Budget, within};
use crate::model::{Model, Setting, binomials};
use crate::number::{Complex, Interval, Rational};
use num_traits::{One, Zero};

/// Checks one sum.
pub(crate) fn check(position: usize, sum: &Sum, on: Setting, budget: &mut Budget) -> Checked {
    let Setting { certificate, model, limits } = on;
    let are_roots = Duty::new(Rule::Equality, Obligation::SumsAreRoots, position);
    let missing = || are_roots.refuted();
    let mut left = vec![Rational::one()];
    let (mut size, mut length) = (1_usize, 8_u64);
    let mut polynomials = Vec::new();
    for (times, part) in &sum.parts {
        let root = model.table.get(*part).ok_or_else(missing)?;
        let polynomial = model.table.polynomial(root.family).ok_or_else(missing)?;
        size = size.saturating_mul(polynomial.degree());
        length += polynomial.coefficients().iter().map(|c| c.numer().bits() + c.denom().bits()).sum::<u64>();
        polynomials.push((Rational::from_integer((*times).into()), polynomial.clone()));
    }
    within("derivatives", size, limits.derivatives)?;
    // The k-th power sums are at most about k times as long as all coefficients together.
    let bits = u32::try_from(length.saturating_mul(u64::try_from(size).unwrap_or(u64::MAX)) / 4).unwrap_or(u32::MAX);
    budget.spend(size.saturating_mul(size), bits)?;
    left.resize(size + 1, Rational::zero());
    for (times, polynomial) in &polynomials {
        left = combined(&left, &scaled(&polynomial.power_sums(size), times));
    }
    let mut right = vec![Rational::zero(); size + 1];
    for factor in &sum.factors {
        let polynomial = model.table.polynomial(factor.family).ok_or_else(missing)?;
        let weight = Rational::from_integer(factor.multiplicity.into());
        for (slot, s) in right.iter_mut().zip(polynomial.power_sums(size)) {
            *slot += s * &weight;
        }
    }
    are_roots.ensure(left == right)?;
    let bits = certificate.bits;
    let mut value = Complex::zero();
    for (times, part) in &sum.parts {
        let root = model.table.get(*part).ok_or_else(missing)?;
        value = value.add(&root.value.mul_real(&Interval::integer(*times), bits), bits);
    }
    let candidates: Vec<RootRef> = model.table.candidates(&value, &sum.factors);
    let identified = Duty::new(Rule::Equality, Obligation::SumIsIdentified, position);
    identified.ensure(candidates.contains(&normal(sum.root, model)))?;
    identified.decide(candidates.len() == 1)
}

/// A real root is its own conjugate.
fn normal(root: RootRef, model: &Model) -> RootRef {
    let is_real = model.table.roots().get(root.index).is_some_and(|r| r.is_real);
    RootRef { conjugate: root.conjugate && !is_real, ..root }
}

/// Power sums of the multiples.
fn scaled(sums: &[Rational], times: &Rational) -> Vec<Rational> {
    let powers = std::iter::successors(Some(Rational::one()), |power| Some(power * times));
    powers.zip(sums).map(|(power, s)| s * power).collect()
}

/// Power sums of all sums of two numbers.
fn combined(a: &[Rational], b: &[Rational]) -> Vec<Rational> {
    let entry = |k: usize| {
        let pairs = a.iter().take(k + 1).zip(b.iter().take(k + 1).rev());
        pairs.zip(binomials(k)).fold(Rational::zero(), |sum, ((x, y), c)| sum + x * y * Rational::from_integer(c))
    };
    (0..a.len().min(b.len())).map(entry).collect()
}
