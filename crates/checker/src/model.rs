//! The functions of a certificate, each proved to be what it is said to be: what the proof rules speak about.
//!
//! Theorem page: docs/theorems/trace.md.

use crate::certificate::{Certificate, Factor, Identity};
use crate::error::{Checked, Duty, Obligation, Rejection, Rule};
use crate::exponential::products;
use crate::formula::IndexedFormula;
use crate::limits::{Budget, Limits, within};
use crate::number::Rational;
use crate::polynomial::{Polynomial, length};
use crate::root::RootTable;
use crate::sequence::{Flow, Sequence};
use crate::signs::{SignSet, narrow};
use crate::trace::ClosedForm;
use num_bigint::BigInt;
use num_traits::{One, Zero};

/// One function of time: a trace, that is the polynomial of an atom along the trajectory, or an auxiliary function.
#[derive(Clone, Debug)]
pub struct Function {
    /// Its derivatives at 0, exactly; of an auxiliary function as many as its annihilator's degree.
    pub sequence: Sequence,
    /// Its closed form; no terms if it is zero for all time.
    pub form: ClosedForm,
    /// The multiplicity of each family in its annihilator.
    pub factors: Vec<Factor>,
    /// Where it is no exponential polynomial: the positions of c and a in sum of c exp(a). Then all of the above is empty.
    pub products: Vec<(usize, usize)>,
}

impl Function {
    /// Whether it is zero for all time.
    pub(crate) fn is_zero(&self) -> bool {
        self.form.terms.is_empty() && self.products.is_empty()
    }
}

/// The claimed formula with the proved closed form of each of its traces.
#[derive(Debug)]
pub struct Model {
    /// The (widened) zone.
    pub formula: IndexedFormula,
    /// The certified roots.
    pub table: RootTable,
    /// One trace for each polynomial of the formula; the coefficients and arguments of exponentials in them; then the auxiliary
    /// functions.
    pub functions: Vec<Function>,
}

/// What every proof rule works on.
#[derive(Clone, Copy)]
pub(crate) struct Setting<'a> {
    pub(crate) certificate: &'a Certificate,
    pub(crate) model: &'a Model,
    pub(crate) limits: &'a Limits,
}

impl Setting<'_> {
    /// The truth of the zone where it follows from the signs of functions and the certificate's identities.
    pub(crate) fn truth(&self, mut signs: Vec<SignSet>) -> Option<bool> {
        narrow(&mut signs, &self.certificate.identities);
        self.model.formula.truth(&signs)
    }

    /// No sign is known of any function.
    pub(crate) fn no_signs(&self) -> Vec<SignSet> {
        vec![SignSet::ANY; self.model.functions.len()]
    }
}

impl Model {
    /// Proves all functions and identities of a certificate.
    ///
    /// # Errors
    /// The first obligation that is not met.
    pub fn new(certificate: &Certificate, limits: &Limits, budget: &mut Budget) -> Result<Self, Rejection> {
        let fits = Duty::new(Rule::Trace, Obligation::EvidenceFitsClaim, 0);
        let formula = IndexedFormula::claimed(&certificate.statement).ok_or_else(|| fits.refuted())?;
        let exponentials = &certificate.statement.exponentials;
        let split: Vec<_> = formula.polynomials.iter().map(|p| products(p, exponentials)).collect();
        let atoms = formula.polynomials.len();
        let parts: Vec<_> = split.iter().flatten().flat_map(|(c, a)| [c, a]).collect();
        fits.ensure(atoms.saturating_add(parts.len()) == certificate.traces.len())?;
        let bits = certificate.bits;
        let table = RootTable::new(&certificate.families, bits, budget)?;
        let flow = Flow::new(&certificate.statement, limits);
        let mut functions = Vec::new();
        let mut next = atoms;
        let polynomials = formula.polynomials.iter().chain(parts);
        for (position, (polynomial, factors)) in polynomials.zip(&certificate.traces).enumerate() {
            let own = split.get(position).map_or(0, Vec::len);
            if own > 0 {
                fits.ensure(factors.is_empty())?;
                let products = (0..own).map(|i| (next + 2 * i, next + 2 * i + 1)).collect();
                next += 2 * own;
                let (sequence, form) = (Sequence::from_rationals(&[]), ClosedForm { terms: Vec::new() });
                functions.push(Function { sequence, form, factors: Vec::new(), products });
                continue;
            }
            check_degree(factors, &table, limits, budget)?;
            let (order, sequence) = flow.trace(polynomial, budget)?;
            let m = table.product(factors).ok_or_else(|| fits.refuted())?;
            // The order bound N holds for m(d/dt) g: N vanishing derivatives at 0 make it zero (see `Flow::order_bound`).
            let annihilates = sequence.is_annihilated(&m, order);
            Duty::new(Rule::Trace, Obligation::FactorsAnnihilateTrace, position).ensure(annihilates)?;
            let derivatives = sequence.derivatives(m.degree());
            let form = ClosedForm::new(factors, &derivatives, &table, bits, position, budget)?;
            functions.push(Function { sequence, form, factors: factors.clone(), products: Vec::new() });
        }
        for auxiliary in &certificate.auxiliaries {
            let (position, factors) = (functions.len(), &auxiliary.factors);
            let degree = check_degree(factors, &table, limits, budget)?;
            let duty = Duty::new(Rule::Trace, Obligation::ClosedFormIsEnclosed, position);
            duty.ensure(auxiliary.derivatives.len() == degree && !factors.is_empty())?;
            let form = ClosedForm::new(factors, &auxiliary.derivatives, &table, bits, position, budget)?;
            let sequence = Sequence::from_rationals(&auxiliary.derivatives);
            functions.push(Function { sequence, form, factors: factors.clone(), products: Vec::new() });
        }
        let model = Self { formula, table, functions };
        for (position, identity) in certificate.identities.iter().enumerate() {
            model.check_identity(position, identity, limits, budget)?;
        }
        Ok(model)
    }

    /// The formula and the roots of a certificate that has no functions.
    ///
    /// # Errors
    /// The first obligation that is not met.
    pub fn without_functions(certificate: &Certificate, budget: &mut Budget) -> Result<Self, Rejection> {
        let fits = Duty::new(Rule::Trace, Obligation::EvidenceFitsClaim, 0);
        let none =
            certificate.traces.is_empty() && certificate.auxiliaries.is_empty() && certificate.identities.is_empty();
        fits.ensure(none && certificate.statement.exponentials.is_empty())?;
        let formula = IndexedFormula::claimed(&certificate.statement).ok_or_else(|| fits.refuted())?;
        let table = RootTable::new(&certificate.families, certificate.bits, budget)?;
        Ok(Self { formula, table, functions: Vec::new() })
    }

    fn degree(&self, function: &Function) -> usize {
        let degree = |f: &Factor| self.table.polynomial(f.family).map_or(0, |p| p.degree());
        let times = |f: &Factor| usize::try_from(f.multiplicity).unwrap_or(usize::MAX);
        function.factors.iter().map(|f| degree(f).saturating_mul(times(f))).sum()
    }

    /// About the bits of the first `count` derivatives at 0 of a function: each step multiplies by the coefficients of the families.
    fn length(&self, function: &Function, count: usize) -> usize {
        let step = function.factors.iter().filter_map(|f| self.table.polynomial(f.family)).map(Polynomial::length);
        let start = function.sequence.derivatives(self.degree(function)).iter().map(length).max().unwrap_or(0);
        step.fold(0, usize::saturating_add).saturating_mul(count).saturating_add(start)
    }

    /// The first `count` derivatives at 0 of a function, from as many as its annihilator's degree.
    fn extended(&self, function: &Function, count: usize) -> Option<Sequence> {
        if !function.products.is_empty() {
            return None;
        }
        let m = self.table.product(&function.factors)?;
        let mut values = function.sequence.derivatives(m.degree());
        while values.len() < count {
            let recent = values.iter().skip(values.len().checked_sub(m.degree())?);
            let next = recent.zip(m.coefficients()).fold(Rational::zero(), |sum, (y, c)| sum - y * c);
            values.push(next);
        }
        Some(Sequence::from_rationals(&values))
    }

    /// Checks `target = sum of the summands`.
    ///
    /// Lemma: the solutions of m(d/dt) g = 0 form a space of dimension deg m closed under d/dt. The products of k elements of one
    /// of dimension d span a space of dimension at most binom(d + k - 1, k), closed under d/dt; products of elements of several
    /// spaces and sums are in closed spaces of dimension at most the product and the sum of theirs. So the difference of
    /// the two sides is in a closed space of dimension at most the bound B below, and is zero if its first B derivatives at 0 are.
    fn check_identity(&self, position: usize, identity: &Identity, limits: &Limits, budget: &mut Budget) -> Checked {
        let duty = Duty::new(Rule::Trace, Obligation::IdentityHolds, position);
        let function = |index: &usize| self.functions.get(*index).ok_or_else(|| duty.refuted());
        let mut bound = self.degree(function(&identity.target)?);
        self.table.spend_product(&function(&identity.target)?.factors, budget)?;
        for summand in &identity.summands {
            let mut ways = 1_usize;
            for (index, power) in summand {
                self.table.spend_product(&function(index)?.factors, budget)?;
                let degree = self.degree(function(index)?);
                for i in 1..=usize::try_from(*power).unwrap_or(usize::MAX) {
                    ways = ways.saturating_mul((degree + i).saturating_sub(1)) / i;
                    within("derivatives", ways, limits.derivatives)?;
                }
            }
            bound = bound.saturating_add(ways);
            within("derivatives", bound, limits.derivatives)?;
        }
        // Products of numbers of v and w words: about 64 products of words cost as much as a step.
        let words = |bits: usize| bits / 64 + 1;
        let mut steps = 1_usize;
        for summand in &identity.summands {
            let mut factors = Vec::new();
            for (index, power) in summand {
                let times = usize::try_from(*power).unwrap_or(usize::MAX);
                factors.push((times, self.length(function(index)?, bound)));
            }
            let all = factors.iter().fold(0_usize, |sum, (n, bits)| sum.saturating_add(bits.saturating_mul(*n)));
            let cost = |bits: usize| words(all).saturating_mul(words(bits)) / 64 + 1;
            steps = factors.iter().fold(steps, |sum, (n, bits)| sum.saturating_add(cost(*bits).saturating_mul(*n)));
        }
        let target = words(self.length(function(&identity.target)?, bound));
        steps = steps.saturating_add(target.saturating_mul(target) / 64);
        budget.spend(bound.saturating_mul(bound).saturating_mul(steps), 1)?;
        let mut sum = Sequence::from_rationals(&vec![Rational::zero(); bound]);
        for summand in &identity.summands {
            let mut product = Sequence::constant(&Rational::one(), &BigInt::one(), bound);
            for (index, power) in summand {
                let factor = self.extended(function(index)?, bound).ok_or_else(|| duty.refuted())?;
                for _ in 0..*power {
                    product = product.mul(&factor);
                }
            }
            sum = sum.add(&product);
        }
        let target = self.extended(function(&identity.target)?, bound);
        duty.ensure(target.is_some_and(|target| target.derivatives(bound) == sum.derivatives(bound)))
    }
}

/// The degree of a product of families, within the limit, with each family at most once.
fn check_degree(
    factors: &[Factor],
    table: &RootTable,
    limits: &Limits,
    budget: &mut Budget,
) -> Result<usize, Rejection> {
    let mut degree = 0_usize;
    for (i, factor) in factors.iter().enumerate() {
        let once = factors.iter().take(i).all(|other| other.family != factor.family);
        Duty::new(Rule::Trace, Obligation::FactorsAnnihilateTrace, i).ensure(once)?;
        let size = table.polynomial(factor.family).map_or(0, |p| p.degree());
        degree = degree.saturating_add(size.saturating_mul(usize::try_from(factor.multiplicity).unwrap_or(usize::MAX)));
        within("roots", degree, limits.roots)?;
    }
    table.spend_product(factors, budget)?;
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
