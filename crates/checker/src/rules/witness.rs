//! Rule `witness`: an admissible trajectory is in the zone at an instant.
//!
//! Needs: an admissible start, admissible values of the uncertain quantities, disturbances that are constant on stretches of time; signs of
//! the zone's polynomials at the instant from which the zone is true.
//! Why: the state is that of the central trajectory from this start plus, for each disturbance and each stretch [a, b] on which it differs from
//! the middle of its range by v, v int_a^b h exp(A (t - s)) b ds = v (F(t - a) - F(t - b)), F(t) = int_0^t h exp(A s) b ds.
//! At t = 0 all is exact.
//! Source: docs/theorems/witness.md.

use crate::admissible::chosen;
use crate::affine_form::expression;
use crate::certificate::Sign;
use crate::error::{Checked, Duty, Obligation, Rejection, Rule};
use crate::limits::Budget;
use crate::many::Witness;
use crate::model::Setting;
use crate::number::{Interval, Rational};
use crate::sequence::Flow;
use crate::signs::SignSet;
use crate::statement::{Expression, Statement, Variable};
use crate::support::{Ground, Inputs, Support};
use crate::trace::{ClosedForm, Stretch};
use num_traits::{One, Zero};
use std::collections::BTreeMap;

/// Checks that the trajectory of the witness is in the zone at its instant.
pub(crate) fn check(witness: &Witness, on: Setting, budget: &mut Budget) -> Checked {
    let Setting { certificate, model, limits } = on;
    let admissible = Duty::new(Rule::Witness, Obligation::WitnessIsAdmissible, 0);
    let plain = chosen(witness, &certificate.statement).ok_or_else(|| admissible.refuted())?;
    let mut signs = vec![SignSet::ANY; model.formula.polynomials.len()];
    let mut learn = |index: usize, sign: Option<Sign>| {
        if let (Some(slot), Some(sign)) = (signs.get_mut(index), sign) {
            *slot = SignSet::only(sign);
        }
    };
    if witness.at.is_zero() {
        let flow = Flow::new(&plain, limits);
        for (index, polynomial) in model.formula.polynomials.iter().enumerate() {
            learn(index, Some(flow.trace(polynomial, budget)?.1.sign_at_zero()));
        }
    } else {
        let inputs = Inputs::new(&plain, Vec::new()).ok_or_else(|| admissible.refuted())?;
        let bits = certificate.bits;
        let ground = Ground { plain: &plain, inputs: &inputs, table: &model.table, bits, limits, integrated: true };
        let mut values = BTreeMap::new();
        for (position, (functional, parts)) in witness.functionals.iter().zip(&witness.splits).enumerate() {
            let affine = Duty::new(Rule::Witness, Obligation::FunctionalIsAffine, position);
            let expression = expression(functional, &model.formula.polynomials).ok_or_else(|| affine.refuted())?;
            let support = Support::new(&expression, parts, position, &ground, budget)?;
            let value = value_at(&support, witness, &plain, bits, budget)?.ok_or_else(|| affine.inconclusive())?;
            match (functional.polynomials.as_slice(), functional.variables.as_slice()) {
                ([(index, weight)], []) if weight.is_one() => learn(*index, value.certain_sign()),
                ([], [(variable, weight)]) if weight.is_one() => drop(values.insert(*variable, value)),
                _ => return Err(affine.refuted()),
            }
        }
        values.insert(Variable::Time, Interval::rational(&witness.at, bits));
        for (index, polynomial) in model.formula.polynomials.iter().enumerate() {
            let value = evaluated(polynomial, &values, &plain, bits, budget)?;
            learn(index, value.and_then(|v| v.certain_sign()));
        }
    }
    Duty::new(Rule::Witness, Obligation::ZoneIsProvedAtInstant, 0).decide(model.formula.truth(&signs) == Some(true))
}

/// The value of a functional at the witness's instant.
fn value_at(
    support: &Support,
    witness: &Witness,
    plain: &Statement,
    bits: u32,
    budget: &mut Budget,
) -> Result<Option<Interval>, Rejection> {
    let Some(mut value) = at_instant(&support.central, &witness.at, bits, budget)? else { return Ok(None) };
    for ((form, signal), disturbance) in support.signals.iter().zip(&witness.signals).zip(&plain.disturbances) {
        let middle = disturbance.range.centre();
        let mut begin = Rational::zero();
        for (until, level) in signal {
            let first = at_instant(form, &(&witness.at - &begin), bits, budget)?;
            let second = at_instant(form, &(&witness.at - until), bits, budget)?;
            let (Some(first), Some(second)) = (first, second) else { return Ok(None) };
            let weight = Interval::rational(&(level - &middle), bits);
            value = value.add(&first.sub(&second, bits).mul(&weight, bits), bits);
            begin.clone_from(until);
        }
    }
    Ok(Some(value))
}

fn at_instant(form: &ClosedForm, at: &Rational, bits: u32, budget: &mut Budget) -> Result<Option<Interval>, Rejection> {
    // Enough terms for a stretch of length 0: one more than the greatest power of t.
    let order = form.terms.iter().map(|t| t.coefficients.len()).max().unwrap_or(1);
    let order = u32::try_from(order).unwrap_or(u32::MAX);
    form.enclose(Stretch { centre: at, half_width: &Rational::zero(), order, bits }, budget)
}

/// A polynomial at values of its variables, outputs replaced; `None`: a value is not known.
fn evaluated(
    polynomial: &Expression,
    values: &BTreeMap<Variable, Interval>,
    plain: &Statement,
    bits: u32,
    budget: &mut Budget,
) -> Result<Option<Interval>, Rejection> {
    let mut sum = Interval::integer(0);
    for term in &polynomial.terms {
        let mut product = Interval::rational(&term.coefficient, bits);
        for (variable, power) in &term.powers {
            budget.spend(usize::try_from(*power).unwrap_or(usize::MAX), bits)?;
            let value = match variable {
                // An output refers to no output.
                Variable::Output(i) => match plain.outputs.get(*i) {
                    Some(output) => evaluated(&output.value, values, plain, bits, budget)?,
                    None => None,
                },
                Variable::State(_)
                | Variable::Drive(_)
                | Variable::Time
                | Variable::Exponential(_)
                | Variable::Disturbance(_) => values.get(variable).cloned(),
            };
            let Some(value) = value else { return Ok(None) };
            product = product.mul(&value.power(*power, bits), bits);
        }
        sum = sum.add(&product, bits);
    }
    Ok(Some(sum))
}
