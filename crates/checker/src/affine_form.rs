//! Functions that are affine in the states: a row, and terms of time alone.

use crate::many::Functional;
use crate::response::Sparse;
use crate::statement::{Expression, Rational, Statement, Term, Variable};
use num_traits::Zero;
use std::collections::BTreeMap;

/// h x + rest, with a constant row h; the rest does not depend on the states.
#[derive(Clone, Debug)]
pub struct AffineForm {
    /// The row, by state, without zeros.
    pub row: Sparse,
    /// The other terms: numbers, drives, time, disturbances.
    pub rest: Vec<Term>,
    /// The disturbances in the rest and their coefficients.
    pub disturbances: Vec<(usize, Rational)>,
}

impl AffineForm {
    /// An expression as an affine form, outputs replaced; `None`: it is not affine in the states with constant coefficients.
    pub fn new(expression: &Expression, statement: &Statement) -> Option<Self> {
        let mut row = BTreeMap::new();
        let mut form = Self { row: Vec::new(), rest: Vec::new(), disturbances: Vec::new() };
        for term in &expression.terms {
            form.add(term, &Rational::from_integer(1_i32.into()), statement, &mut row)?;
        }
        form.row = row.into_iter().filter(|(_, h)| !h.is_zero()).collect();
        Some(form)
    }

    fn add(
        &mut self,
        term: &Term,
        factor: &Rational,
        statement: &Statement,
        row: &mut BTreeMap<usize, Rational>,
    ) -> Option<()> {
        let coefficient = &term.coefficient * factor;
        match term.powers.as_slice() {
            [(Variable::State(i), 1)] => *row.entry(*i).or_insert_with(Rational::zero) += coefficient,
            [(Variable::Output(i), 1)] => {
                // An output refers to no output: the recursion is one level deep.
                let value = &statement.outputs.get(*i)?.value;
                let plain = |t: &Term| t.powers.iter().all(|(v, _)| !matches!(v, Variable::Output(_)));
                for part in value.terms.iter().filter(|t| plain(t)) {
                    self.add(part, &coefficient, statement, row)?;
                }
                return value.terms.iter().all(plain).then_some(());
            }
            powers => {
                let of_time = powers.iter().all(|(v, _)| matches!(v, Variable::Drive(_) | Variable::Time));
                match powers {
                    [(Variable::Disturbance(k), 1)] => self.disturbances.push((*k, coefficient.clone())),
                    _ if of_time => {}
                    _ => return None,
                }
                self.rest.push(Term { coefficient, powers: term.powers.clone() });
            }
        }
        Some(())
    }
}

/// The expression of a functional over the polynomials of a zone; `None`: a position without polynomial.
pub fn expression(functional: &Functional, polynomials: &[Expression]) -> Option<Expression> {
    let mut terms = Vec::new();
    for (position, weight) in &functional.polynomials {
        let scaled = |t: &Term| Term { coefficient: &t.coefficient * weight, powers: t.powers.clone() };
        terms.extend(polynomials.get(*position)?.terms.iter().map(scaled));
    }
    for (variable, weight) in &functional.variables {
        terms.push(Term { coefficient: weight.clone(), powers: vec![(*variable, 1)] });
    }
    Some(Expression { terms })
}
