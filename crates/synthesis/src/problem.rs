//! A statement's traces with the exact factors of their annihilators.

use keepout_checker::Limits;
use keepout_checker::certificate::Factor;
use keepout_checker::error::Rejection;
use keepout_checker::formula::{IndexedFormula, claimed_formula};
use keepout_checker::limits::Budget;
use keepout_checker::sequence::{Flow, Sequence};
use keepout_checker::statement::{Claim, Statement};
use keepout_core::{IntegerPolynomial, factorize, minimal_annihilator};

/// Traces and the polynomials whose roots are their exponents.
#[derive(Clone, Debug)]
pub(crate) struct Problem {
    pub(crate) statement: Statement,
    pub(crate) formula: IndexedFormula,
    pub(crate) sequences: Vec<Sequence>,
    /// The factors of each trace; the families are positions in `families`.
    pub(crate) factors: Vec<Vec<Factor>>,
    /// Pairwise coprime, square-free, primitive.
    pub(crate) families: Vec<IntegerPolynomial>,
}

impl Problem {
    /// Analyses a statement with a given claim. The claim's margin is one that fits the zone.
    pub(crate) fn new(statement: &Statement, claim: Claim, limits: &Limits) -> Result<Self, Rejection> {
        let statement = Statement { claim, ..statement.clone() };
        let zone = claimed_formula(&statement).unwrap_or_else(|| statement.zone.inside.clone());
        let formula = IndexedFormula::new(&zone);
        let flow = Flow::new(&statement, limits);
        let mut budget = Budget::new(limits);
        let mut sequences = Vec::new();
        let mut annihilators = Vec::new();
        for polynomial in &formula.polynomials {
            let (order, sequence) = flow.trace(polynomial, &mut budget)?;
            let exceeded =
                Rejection::LimitExceeded { limit: "derivatives", max: limits.derivatives, found: order as u64 };
            annihilators.push(unscaled(&sequence).ok_or(exceeded)?);
            sequences.push(sequence);
        }
        drop(flow);
        let mut problem = Self { statement, formula, sequences, factors: Vec::new(), families: Vec::new() };
        let parts: Vec<IntegerPolynomial> =
            annihilators.iter().flat_map(|m| factorize(m).factors).map(|f| f.polynomial).collect();
        problem.families = IntegerPolynomial::coprime_base(&parts);
        problem.families.retain(|f| f.degree() > 0);
        problem.factors = annihilators.iter().map(|m| multiplicities(m, &problem.families)).collect();
        Ok(problem)
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

/// The primitive annihilator in unscaled time: the sequence's integers have their own minimal recurrence.
fn unscaled(sequence: &Sequence) -> Option<IntegerPolynomial> {
    let m = minimal_annihilator(sequence.values())?;
    Some(m.dilate_up(sequence.rate()).primitive_part())
}

fn multiplicities(m: &IntegerPolynomial, families: &[IntegerPolynomial]) -> Vec<Factor> {
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
