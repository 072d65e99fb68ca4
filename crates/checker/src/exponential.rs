//! Polynomials with exponentials of affine expressions, as sums of products of a polynomial and one exponential.

use crate::statement::{Affine, Exponential, Expression, Term, Variable};
use num_traits::Zero;
use std::collections::BTreeMap;

/// Splits p(x, e), e_i = exp(a_i), into pairs (c, a) with p = sum of c exp(a); c has no exponential, a is affine. Empty if no
/// exponential occurs in p.
///
/// Why: e_1^j_1 e_2^j_2 ... = exp(j_1 a_1 + j_2 a_2 + ...).
pub fn products(polynomial: &Expression, exponentials: &[Exponential]) -> Vec<(Expression, Expression)> {
    let is_exponential = |variable: &Variable| matches!(variable, Variable::Exponential(_));
    if !polynomial.terms.iter().flat_map(|t| &t.powers).any(|(variable, _)| is_exponential(variable)) {
        return Vec::new();
    }
    let mut groups: BTreeMap<Vec<(Variable, u32)>, Vec<Term>> = BTreeMap::new();
    for term in &polynomial.terms {
        let (own, powers) = term.powers.iter().partition(|(variable, _)| is_exponential(variable));
        let term = Term { coefficient: term.coefficient.clone(), powers };
        groups.entry(own).or_default().push(term);
    }
    let argument = |own: Vec<(Variable, u32)>| {
        let mut sum: BTreeMap<Vec<(Variable, u32)>, crate::number::Rational> = BTreeMap::new();
        for (variable, power) in own {
            let Variable::Exponential(position) = variable else { continue };
            let Some(Affine { terms, offset }) = exponentials.get(position).map(|e| &e.argument) else { continue };
            let power = crate::number::Rational::from_integer(power.into());
            for (factor, of) in terms {
                *sum.entry(vec![(*of, 1)]).or_insert_with(Zero::zero) += factor * &power;
            }
            *sum.entry(Vec::new()).or_insert_with(Zero::zero) += offset * &power;
        }
        let terms = sum.into_iter().filter(|(_, c)| !c.is_zero());
        Expression { terms: terms.map(|(powers, coefficient)| Term { coefficient, powers }).collect() }
    };
    groups.into_iter().map(|(own, terms)| (Expression { terms }, argument(own))).collect()
}
