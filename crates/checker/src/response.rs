//! Responses h exp(A t) v of one row h to many vectors v.
//!
//! Lemma: if sum_j m_j h A^j = 0 for a monic m, then m annihilates h exp(A t) v for each v (the sum times A^k exp(A t) v is 0 for all k).
//! A polynomial q annihilates a function that has the annihilator m if the first deg m derivatives at 0 of q(d/dt) of it
//! vanish (it is a solution of m(d/dt) y = 0, and these are determined by deg m derivatives).

use crate::certificate::Factor;
use crate::error::{Duty, Rejection};
use crate::limits::{Budget, Limits, within};
use crate::number::Rational;
use crate::root::RootTable;
use crate::sequence::Sequence;
use crate::statement::{Statement, Variable};
use crate::trace::ClosedForm;
use num_bigint::BigInt;
use num_integer::Integer;
use num_traits::{One, Zero};
use std::collections::BTreeMap;

/// A vector or row by its entries that are not zero.
pub type Sparse = Vec<(usize, Rational)>;

/// The rows h A^k = values_k / (denominator rate^k).
pub struct Row {
    rate: BigInt,
    denominator: BigInt,
    values: Vec<BTreeMap<usize, BigInt>>,
    factors: Vec<Factor>,
    degree: usize,
}

impl Row {
    /// Proves that the product of the factors annihilates all responses of a row.
    ///
    /// # Errors
    /// The duty, refuted; or a limit.
    pub fn new(
        statement: &Statement,
        row: &Sparse,
        factors: &[Factor],
        table: &RootTable,
        duty: Duty,
        (limits, budget): (&Limits, &mut Budget),
    ) -> Result<Self, Rejection> {
        let rates = statement.phases.first().map_or(&[][..], |p| p.rates.as_slice());
        let mut rate = BigInt::one();
        let mut count = 0_usize;
        for (factor, variable) in rates.iter().flat_map(|r| &r.terms) {
            if matches!(variable, Variable::State(_)) {
                rate = rate.lcm(factor.denom());
                count += 1;
            }
        }
        let denominator = row.iter().fold(BigInt::one(), |d, (_, x)| d.lcm(x.denom()));
        let first = row.iter().map(|(i, x)| (*i, x.numer() * (&denominator / x.denom()))).collect();
        table.spend_product(factors, budget)?;
        let m = table.product(factors).ok_or_else(|| duty.refuted())?;
        within("roots", m.degree(), limits.roots)?;
        let words = usize::try_from(rate.bits()).unwrap_or(usize::MAX).saturating_mul(m.degree()) / 64 + 1;
        budget.spend(count.saturating_mul(m.degree() + 1).saturating_mul(words), 1)?;
        let mut values: Vec<BTreeMap<usize, BigInt>> = vec![first];
        for _ in 0..m.degree() {
            let mut next: BTreeMap<usize, BigInt> = BTreeMap::new();
            for (i, value) in values.last().into_iter().flatten() {
                for (factor, variable) in rates.get(*i).into_iter().flat_map(|r| &r.terms) {
                    if let Variable::State(j) = variable {
                        *next.entry(*j).or_insert_with(BigInt::zero) +=
                            value * factor.numer() * (&rate / factor.denom());
                    }
                }
            }
            next.retain(|_, value| !value.is_zero());
            values.push(next);
        }
        // sum_j m_j h A^j = 0 iff sum_j (L m_j rate^(d - j)) values_j = 0, L a common denominator of m.
        let scale = m.coefficients().iter().fold(BigInt::one(), |l, c| l.lcm(c.denom()));
        let mut power = scale;
        let mut sum: BTreeMap<usize, BigInt> = BTreeMap::new();
        for (c, row) in m.coefficients().iter().zip(&values).rev() {
            let weight = c.numer() * (&power / c.denom());
            for (i, value) in row {
                *sum.entry(*i).or_insert_with(BigInt::zero) += value * &weight;
            }
            power *= &rate;
        }
        duty.ensure(sum.values().all(Zero::is_zero) && values.len() == m.degree() + 1)?;
        Ok(Self { rate, denominator, values, factors: factors.to_vec(), degree: m.degree() })
    }

    /// The first derivatives at 0 of the response to a vector, as many as the annihilator's degree.
    fn derivatives(&self, vector: &Sparse) -> Vec<Rational> {
        let common = vector.iter().fold(BigInt::one(), |d, (_, x)| d.lcm(x.denom()));
        let mut denominator = &self.denominator * &common;
        let mut derivatives = Vec::new();
        for row in self.values.iter().take(self.degree) {
            let entry = |(i, x): &(usize, Rational)| row.get(i).map(|r| r * x.numer() * (&common / x.denom()));
            let value: BigInt = vector.iter().filter_map(entry).sum();
            derivatives.push(Rational::new(value, denominator.clone()));
            denominator *= &self.rate;
        }
        derivatives
    }

    /// The closed form of the response to a vector; with an annihilator of its own, if given. `integrated`: of its integral from 0 on.
    ///
    /// # Errors
    /// The duty, refuted where the annihilator is none; [`Rejection::Inconclusive`] at too low a precision.
    pub fn response(
        &self,
        vector: &Sparse,
        own: Option<&[Factor]>,
        integrated: bool,
        table: &RootTable,
        duty: Duty,
        (bits, budget): (u32, &mut Budget),
    ) -> Result<ClosedForm, Rejection> {
        let mut derivatives = self.derivatives(vector);
        if derivatives.iter().all(Zero::is_zero) {
            return Ok(ClosedForm { terms: Vec::new() });
        }
        let words = usize::try_from(self.rate.bits()).unwrap_or(usize::MAX).saturating_mul(self.degree) / 64 + 1;
        budget.spend(self.degree.saturating_mul(self.degree).saturating_mul(words), 1)?;
        let factors = own.unwrap_or(&self.factors);
        if let Some(own) = own {
            table.spend_product(own, budget)?;
            let q = table.product(own).ok_or_else(|| duty.refuted())?;
            duty.ensure(q.degree() <= self.degree)?;
            let m = table.product(&self.factors).ok_or_else(|| duty.refuted())?;
            while derivatives.len() < self.degree + q.degree() {
                let recent = derivatives.iter().skip(derivatives.len().saturating_sub(self.degree));
                let next = recent.zip(m.coefficients()).fold(Rational::zero(), |sum, (y, c)| sum - y * c);
                derivatives.push(next);
            }
            duty.ensure(Sequence::from_rationals(&derivatives).is_annihilated(&q, self.degree))?;
            derivatives.truncate(q.degree());
        }
        let mut factors = factors.to_vec();
        if integrated {
            // If m annihilates y, then z m annihilates the integral of y, whose derivatives at 0 are 0 and those of y.
            let family = table.zero_family().ok_or_else(|| duty.refuted())?;
            match factors.iter_mut().find(|f| f.family == family) {
                Some(factor) => factor.multiplicity += 1,
                None => factors.push(Factor { family, multiplicity: 1 }),
            }
            derivatives.insert(0, Rational::zero());
        }
        ClosedForm::new(&factors, &derivatives, table, bits, duty.position, budget)
    }
}
