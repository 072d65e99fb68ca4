//! A statement's traces with the exact factors of their annihilators; further functions and identities between them.

use crate::strategy::identity;
use keepout_checker::Limits;
use keepout_checker::certificate::{Auxiliary, Factor, Identity, Sign};
use keepout_checker::error::Rejection;
use keepout_checker::exponential::products;
use keepout_checker::formula::IndexedFormula;
use keepout_checker::limits::Budget;
use keepout_checker::number::Rational;
use keepout_checker::sequence::{Flow, Sequence};
use keepout_checker::signs::{SignSet, narrow};
use keepout_checker::statement::{Claim, Expression, Statement};
use keepout_core::{ExponentialPolynomial, IntegerPolynomial, factorize, minimal_annihilator};
use std::cmp::Ordering;

/// Functions, that is traces and then auxiliary ones, and the polynomials whose roots are their exponents.
#[derive(Clone, Debug)]
pub(crate) struct Problem {
    pub(crate) statement: Statement,
    pub(crate) formula: IndexedFormula,
    pub(crate) sequences: Vec<Sequence>,
    /// The factors of each function; the families are positions in `families`.
    pub(crate) factors: Vec<Vec<Factor>>,
    /// Pairwise coprime, square-free, primitive.
    pub(crate) families: Vec<IntegerPolynomial>,
    /// For each polynomial of the formula with exponentials the positions of c and a in sum of c exp(a).
    pub(crate) products: Vec<Vec<(usize, usize)>>,
    /// In an order in which each narrows signs that later ones use.
    pub(crate) identities: Vec<Identity>,
    limits: Limits,
    is_enriched: bool,
}

impl Problem {
    /// Analyses a statement with a given claim. The claim's margin is one that fits the zone.
    pub(crate) fn new(statement: &Statement, claim: Claim, limits: &Limits) -> Result<Self, Rejection> {
        let statement = Statement { claim, ..statement.clone() };
        let formula =
            IndexedFormula::claimed(&statement).unwrap_or_else(|| IndexedFormula::new(&statement.zone.inside));
        let flow = Flow::new(&statement, limits);
        let mut budget = Budget::new(limits);
        let (products, parts) = split(&formula, &statement);
        let mut sequences = Vec::new();
        let mut annihilators = Vec::new();
        for (position, polynomial) in formula.polynomials.iter().chain(&parts).enumerate() {
            if products.get(position).is_some_and(|p: &Vec<_>| !p.is_empty()) {
                sequences.push(Sequence::from_rationals(&[]));
                annihilators.push(IntegerPolynomial::one());
                continue;
            }
            let (order, sequence) = flow.trace(polynomial, &mut budget)?;
            let exceeded =
                Rejection::LimitExceeded { limit: "derivatives", max: limits.derivatives, found: order as u64 };
            annihilators.push(unscaled(&sequence).ok_or(exceeded)?);
            sequences.push(sequence);
        }
        drop(flow);
        let mut problem = Self {
            statement,
            formula,
            sequences,
            factors: Vec::new(),
            families: Vec::new(),
            products,
            identities: Vec::new(),
            limits: limits.clone(),
            is_enriched: false,
        };
        let parts: Vec<IntegerPolynomial> =
            annihilators.iter().flat_map(|m| factorize(m).factors).map(|f| f.polynomial).collect();
        problem.families = IntegerPolynomial::coprime_base(&parts);
        problem.families.retain(|f| f.degree() > 0);
        problem.factors = annihilators.iter().map(|m| multiplicities(m, &problem.families)).collect();
        Ok(problem)
    }

    /// The number of polynomials of the formula: the first functions.
    pub(crate) fn atoms(&self) -> usize {
        self.formula.polynomials.len()
    }

    /// The number of traces: the functions before the auxiliary ones.
    pub(crate) fn traces(&self) -> usize {
        self.atoms() + 2 * self.products.iter().map(Vec::len).sum::<usize>()
    }

    /// The coefficients and arguments of a function with exponentials; none for others.
    pub(crate) fn products_of(&self, function: usize) -> &[(usize, usize)] {
        self.products.get(function).map_or(&[], Vec::as_slice)
    }

    /// Whether a function is a coefficient or an argument in a function with exponentials.
    pub(crate) fn is_part(&self, function: usize) -> bool {
        (self.atoms()..self.traces()).contains(&function)
    }

    /// Whether a function is zero for all time.
    pub(crate) fn is_zero(&self, function: usize) -> bool {
        self.factors[function].is_empty() && self.products_of(function).is_empty()
    }

    /// The auxiliary functions.
    pub(crate) fn auxiliaries(&self) -> Vec<Auxiliary> {
        let auxiliary = |i: usize| Auxiliary { factors: self.factors[i].clone(), derivatives: self.own_derivatives(i) };
        (self.traces()..self.factors.len()).map(auxiliary).collect()
    }

    /// As many derivatives of a function as the degree of its annihilator.
    pub(crate) fn own_derivatives(&self, function: usize) -> Vec<Rational> {
        self.sequences[function].derivatives(self.degree(&self.factors[function]))
    }

    /// A function as an element of the ring of exponential polynomials.
    pub(crate) fn function(&self, index: usize) -> Option<ExponentialPolynomial> {
        let annihilator = self.factors[index]
            .iter()
            .fold(IntegerPolynomial::one(), |m, f| &m * &self.families[f.family].power(f.multiplicity as usize));
        ExponentialPolynomial::new(&annihilator, &self.own_derivatives(index)).ok()
    }

    /// The position of a function that is not zero, added if it is new.
    pub(crate) fn add(&mut self, function: &ExponentialPolynomial) -> Option<usize> {
        let factors = self.factor_list(&function.annihilator())?;
        let derivatives = function.derivatives(function.order());
        self.add_auxiliary(Auxiliary { factors, derivatives })
    }

    /// The position of an auxiliary function, added if it is new.
    pub(crate) fn add_auxiliary(&mut self, auxiliary: Auxiliary) -> Option<usize> {
        if auxiliary.factors.is_empty() {
            return None;
        }
        let known = (self.traces()..self.factors.len())
            .find(|i| self.factors[*i] == auxiliary.factors && self.own_derivatives(*i) == auxiliary.derivatives);
        Some(known.unwrap_or_else(|| {
            self.factors.push(auxiliary.factors);
            self.sequences.push(Sequence::from_rationals(&auxiliary.derivatives));
            self.factors.len() - 1
        }))
    }

    /// Adds identities from which signs of traces follow where these touch zero. Once; whether there are new ones.
    pub(crate) fn enrich(&mut self) -> bool {
        if std::mem::replace(&mut self.is_enriched, true) {
            return false;
        }
        let known = self.identities.len();
        for trace in 0..self.atoms() {
            identity::decompose_trace(trace, self);
        }
        self.identities.len() > known
    }

    /// The trace of a further polynomial, as a function.
    pub(crate) fn trace_of(&self, polynomial: &Expression) -> Option<ExponentialPolynomial> {
        let flow = Flow::new(&self.statement, &self.limits);
        let (_, sequence) = flow.trace(polynomial, &mut Budget::new(&self.limits)).ok()?;
        let annihilator = unscaled(&sequence)?;
        ExponentialPolynomial::new(&annihilator, &sequence.derivatives(annihilator.degree())).ok()
    }

    /// The zone's truth where it follows from signs of functions.
    pub(crate) fn truth(&self, signs: &[Option<Sign>]) -> Option<bool> {
        let mut sets: Vec<SignSet> = signs.iter().map(|s| s.map_or(SignSet::ANY, SignSet::only)).collect();
        narrow(&mut sets, &self.identities);
        self.formula.truth(&sets)
    }

    /// The zone's truth where a function is negative, zero and positive.
    pub(crate) fn truths(&self, signs: &[Option<Sign>], pivot: usize) -> [Option<bool>; 3] {
        [Ordering::Less, Ordering::Equal, Ordering::Greater].map(|sign| {
            let mut case = signs.to_vec();
            case[pivot] = Some(sign);
            self.truth(&case)
        })
    }

    /// The position of a family, added if it is new. `None`: it has roots in common with another family.
    pub(crate) fn family(&mut self, polynomial: &IntegerPolynomial) -> Option<usize> {
        if let Some(position) = self.families.iter().position(|f| f == polynomial) {
            return Some(position);
        }
        if self.families.iter().any(|f| f.gcd(polynomial).degree() > 0) {
            return None;
        }
        self.families.push(polynomial.clone());
        Some(self.families.len() - 1)
    }

    /// The families of a product, with multiplicity; new ones are added.
    pub(crate) fn factor_list(&mut self, product: &IntegerPolynomial) -> Option<Vec<Factor>> {
        let mut list: Vec<Factor> = Vec::new();
        for factor in factorize(product).factors {
            let family = self.family(&factor.polynomial)?;
            let multiplicity = u32::try_from(factor.multiplicity).ok()?;
            list.push(Factor { family, multiplicity });
        }
        Some(list)
    }
}

/// The products in each polynomial of a formula, and the polynomials that their positions refer to.
fn split(formula: &IndexedFormula, statement: &Statement) -> (Vec<Vec<(usize, usize)>>, Vec<Expression>) {
    let mut parts = Vec::new();
    let mut lists = Vec::new();
    for polynomial in &formula.polynomials {
        let mut list = Vec::new();
        for (coefficient, argument) in products(polynomial, &statement.exponentials) {
            let next = formula.polynomials.len() + parts.len();
            list.push((next, next + 1));
            parts.extend([coefficient, argument]);
        }
        lists.push(list);
    }
    (lists, parts)
}

/// The primitive annihilator in unscaled time: the sequence's integers have their own minimal recurrence.
fn unscaled(sequence: &Sequence) -> Option<IntegerPolynomial> {
    let m = minimal_annihilator(sequence.values())?;
    Some(m.dilate_up(sequence.rate()).primitive_part())
}

pub(crate) fn multiplicities(m: &IntegerPolynomial, families: &[IntegerPolynomial]) -> Vec<Factor> {
    let mut list = Vec::new();
    for (family, polynomial) in families.iter().enumerate() {
        let mut rest = m.clone();
        let mut multiplicity = 0;
        while let Some(quotient) = rest.divide_exact(polynomial) {
            rest = quotient;
            multiplicity += 1;
        }
        if multiplicity > 0 {
            list.push(Factor { family, multiplicity });
        }
    }
    list
}
