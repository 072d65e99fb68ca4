//! The traces of a certificate, each proved to be what it is said to be: what the proof rules speak about.
//!
//! Theorem page: docs/theorems/trace.md.

use crate::certificate::{Certificate, Factor, Product};
use crate::error::{Checked, Duty, Obligation, Rejection, Rule};
use crate::formula::{IndexedFormula, claimed_formula};
use crate::limits::{Budget, Limits, within};
use crate::root::RootTable;
use crate::sequence::{Flow, Sequence};
use crate::trace::ClosedForm;
use num_bigint::BigInt;
use num_traits::{One, Zero};

/// One trace: the polynomial of an atom along the trajectory.
#[derive(Clone, Debug)]
pub struct Trace {
    /// Its derivatives at 0, exactly.
    pub sequence: Sequence,
    /// Its closed form; no terms if it is zero for all time.
    pub form: ClosedForm,
    /// The multiplicity of each family in its annihilator.
    pub factors: Vec<Factor>,
}

/// The claimed formula with the proved closed form of each of its traces.
#[derive(Debug)]
pub struct Model {
    /// The (widened) zone.
    pub formula: IndexedFormula,
    /// The certified roots.
    pub table: RootTable,
    /// One trace for each polynomial of the formula.
    pub traces: Vec<Trace>,
    /// The auxiliary functions.
    pub auxiliaries: Vec<ClosedForm>,
}

/// What every proof rule works on.
#[derive(Clone, Copy)]
pub(crate) struct Setting<'a> {
    pub(crate) certificate: &'a Certificate,
    pub(crate) model: &'a Model,
    pub(crate) limits: &'a Limits,
}

impl Model {
    /// Proves all traces, auxiliary functions and products of a certificate.
    ///
    /// # Errors
    /// The first obligation that is not met.
    pub fn new(certificate: &Certificate, limits: &Limits, budget: &mut Budget) -> Result<Self, Rejection> {
        let fits = Duty::new(Rule::Trace, Obligation::EvidenceFitsClaim, 0);
        let formula = claimed_formula(&certificate.statement).ok_or_else(|| fits.refuted())?;
        let formula = IndexedFormula::new(&formula);
        fits.ensure(formula.polynomials.len() == certificate.traces.len())?;
        let table = RootTable::new(&certificate.families, certificate.bits, budget)?;
        let flow = Flow::new(&certificate.statement, limits);
        let mut traces = Vec::new();
        for (position, (polynomial, factors)) in formula.polynomials.iter().zip(&certificate.traces).enumerate() {
            check_degree(factors, &table, limits)?;
            let (order, sequence) = flow.trace(polynomial, budget)?;
            let m = table.product(factors).ok_or_else(|| fits.refuted())?;
            // The order bound N holds for m(d/dt) g: N vanishing derivatives at 0 make it zero (see `Flow::order_bound`).
            let annihilates = sequence.is_annihilated(&m, order);
            Duty::new(Rule::Trace, Obligation::FactorsAnnihilateTrace, position).ensure(annihilates)?;
            let derivatives = sequence.derivatives(m.degree());
            let form = ClosedForm::new(factors, &derivatives, &table, certificate.bits, position, budget)?;
            traces.push(Trace { sequence, form, factors: factors.clone() });
        }
        let mut auxiliaries = Vec::new();
        for (position, auxiliary) in certificate.auxiliaries.iter().enumerate() {
            let degree = check_degree(&auxiliary.factors, &table, limits)?;
            let duty = Duty::new(Rule::Trace, Obligation::ClosedFormIsEnclosed, position);
            duty.ensure(auxiliary.derivatives.len() == degree && !auxiliary.factors.is_empty())?;
            let form = ClosedForm::new(
                &auxiliary.factors,
                &auxiliary.derivatives,
                &table,
                certificate.bits,
                position,
                budget,
            )?;
            auxiliaries.push(form);
        }
        let model = Self { formula, table, traces, auxiliaries };
        let on = Setting { certificate, model: &model, limits };
        for (position, product) in certificate.products.iter().enumerate() {
            check_product(position, product, on, budget)?;
        }
        Ok(model)
    }

    fn degree(&self, factors: &[Factor]) -> usize {
        let degree = |f: &Factor| self.table.polynomial(f.family).map_or(0, |p| p.degree());
        factors.iter().map(|f| degree(f).saturating_mul(usize::try_from(f.multiplicity).unwrap_or(usize::MAX))).sum()
    }

    /// The first `count` derivatives at 0 of the function with this annihilator and these first derivatives.
    fn extended(&self, factors: &[Factor], derivatives: &[crate::number::Rational], count: usize) -> Option<Sequence> {
        let m = self.table.product(factors)?;
        let mut values = derivatives.to_vec();
        while values.len() < count {
            let recent = values.iter().skip(values.len().checked_sub(m.degree())?);
            let next = recent.zip(m.coefficients()).fold(crate::number::Rational::zero(), |sum, (y, c)| sum - y * c);
            values.push(next);
        }
        Some(Sequence::from_rationals(&values))
    }
}

/// Checks `trace = pivot^power * cofactor`.
///
/// Lemma: the solutions of m(d/dt) g = 0 form a space of dimension deg m closed under d/dt. Products of k elements
/// of one of dimension p and one element of one of dimension c span a space of dimension at most
/// binom(p + k - 1, k) c, closed under d/dt. So the difference of the two sides lies in a closed space of dimension
/// <= B = deg(trace) + binom(p + k - 1, k) c, and is zero if its first B derivatives at 0 are.
fn check_product(position: usize, product: &Product, on: Setting, budget: &mut Budget) -> Checked {
    let Setting { certificate: Certificate { auxiliaries, .. }, model, limits } = on;
    let duty = Duty::new(Rule::Trace, Obligation::ProductEqualsTrace, position);
    let missing = || duty.refuted();
    let trace = model.traces.get(product.trace).ok_or_else(missing)?;
    let pivot = auxiliaries.get(product.pivot).ok_or_else(missing)?;
    let cofactor = auxiliaries.get(product.cofactor).ok_or_else(missing)?;
    let trace_degree = model.degree(&trace.factors);
    let pivot_degree = model.degree(&pivot.factors);
    let mut ways = 1_usize;
    for i in 1..=usize::try_from(product.power).unwrap_or(usize::MAX) {
        ways = ways.saturating_mul((pivot_degree + i).saturating_sub(1)) / i;
        within("derivatives", ways, limits.derivatives)?;
    }
    let bound = trace_degree.saturating_add(ways.saturating_mul(model.degree(&cofactor.factors)));
    within("derivatives", bound, limits.derivatives)?;
    budget.spend(bound.saturating_mul(bound), 64)?;
    let left = model.extended(&trace.factors, &trace.sequence.derivatives(trace_degree), bound);
    let pivot = model.extended(&pivot.factors, &pivot.derivatives, bound).ok_or_else(missing)?;
    let mut right = model.extended(&cofactor.factors, &cofactor.derivatives, bound).ok_or_else(missing)?;
    for _ in 0..product.power {
        right = right.mul(&pivot);
    }
    let equal = left.is_some_and(|left| left.derivatives(bound) == right.derivatives(bound));
    duty.ensure(equal)
}

/// The degree of a product of families, within the limit, with each family at most once.
fn check_degree(factors: &[Factor], table: &RootTable, limits: &Limits) -> Result<usize, Rejection> {
    let mut degree = 0_usize;
    for (i, factor) in factors.iter().enumerate() {
        let once = factors.iter().take(i).all(|other| other.family != factor.family);
        Duty::new(Rule::Trace, Obligation::FactorsAnnihilateTrace, i).ensure(once)?;
        let size = table.polynomial(factor.family).map_or(0, |p| p.degree());
        degree = degree.saturating_add(size.saturating_mul(usize::try_from(factor.multiplicity).unwrap_or(usize::MAX)));
        within("roots", degree, limits.roots)?;
    }
    Ok(degree)
}

/// The binomial coefficients binom(n, 0), ..., binom(n, n).
pub(crate) fn binomials(n: usize) -> Vec<BigInt> {
    let mut row = vec![BigInt::one()];
    for k in 1..=n {
        let next = row.last().map_or_else(BigInt::zero, |last| last * BigInt::from(n + 1 - k) / BigInt::from(k));
        row.push(next);
    }
    row
}
