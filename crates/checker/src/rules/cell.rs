//! Signs of traces on a stretch of time: what the rules `cover` and `entry` share.
//!
//! A cell lists signs that hold on all of it, and may name a pivot w: a function such that the signs of some traces follow
//! from the sign of w. At each instant of the cell, w is negative, zero or positive: so a formula that is false in these three
//! cases is false on the whole cell, whatever w is.
//! - Pivot t, on a cell that starts at 0: at t = 0 all signs are exact. For t > 0, a trace with g^(j)(0) = 0 for j < k has the
//!   sign of g / t^k.
//! - An auxiliary function w: g = w^k h has the sign of w^k times that of h.

use crate::certificate::{Cell, Pivot, Sign};
use crate::error::{Checked, Duty, Obligation, Rejection, Rule};
use crate::limits::Budget;
use crate::model::Setting;
use crate::number::{Interval, Rational};
use crate::trace::{ClosedForm, Stretch};
use num_traits::Zero;
use std::cmp::Ordering;

/// The signs of all traces in one case; `None`: not known.
pub(crate) type Signs = Vec<Option<Sign>>;

/// An enclosure; `None`: an argument is out of range.
pub(crate) type Enclosed = Result<Option<Interval>, Rejection>;

/// The signs of traces on a cell, case by case.
pub(crate) struct Cases {
    /// The signs where the pivot is zero; `None`: the cell has no pivot.
    pub(crate) at_zero: Option<Signs>,
    /// The signs in the other cases, at least one.
    pub(crate) elsewhere: Vec<Signs>,
}

/// Proves the signs that a cell lists, on [from, cell.to].
///
/// # Errors
/// The first listed sign that is refuted, or not decided.
pub(crate) fn prove_signs(
    (rule, position): (Rule, usize),
    from: &Rational,
    cell: &Cell,
    on: Setting,
    budget: &mut Budget,
) -> Result<Cases, Rejection> {
    let Setting { certificate, model, .. } = on;
    let on_cell = Duty::new(rule, Obligation::SignOnCell, position);
    let half = Rational::new(1_i32.into(), 2_i32.into());
    let (centre, half_width) = ((from + &cell.to) * &half, (&cell.to - from) * &half);
    let stretch = Stretch { centre: &centre, half_width: &half_width, order: cell.order, bits: certificate.bits };
    let mut signs: Signs = vec![None; model.traces.len()];
    for (index, sign) in &cell.signs {
        let trace = model.traces.get(*index).ok_or_else(|| on_cell.refuted())?;
        if from.is_zero() && cell.to.is_zero() {
            on_cell.ensure(trace.sequence.sign_at_zero() == *sign)?;
        } else {
            prove_sign(on_cell, &trace.form, *sign, stretch, budget)?;
        }
        set(&mut signs, *index, *sign);
    }
    match &cell.pivot {
        Pivot::None => Ok(Cases { at_zero: None, elsewhere: vec![signs] }),
        Pivot::Start(listed) => {
            Duty::new(rule, Obligation::VanishesAtStart, position).ensure(from.is_zero())?;
            let exact = model.traces.iter().map(|t| Some(t.sequence.sign_at_zero())).collect();
            for (index, power, sign) in listed {
                let trace = model.traces.get(*index).ok_or_else(|| on_cell.refuted())?;
                let power = usize::try_from(*power).unwrap_or(usize::MAX);
                let vanishes =
                    trace.sequence.count() >= power && trace.sequence.values().iter().take(power).all(Zero::is_zero);
                Duty::new(rule, Obligation::VanishesAtStart, position).ensure(vanishes)?;
                let zero = Rational::zero();
                let stretch = Stretch { centre: &zero, half_width: &cell.to, ..stretch };
                let quotient = trace.form.quotient(power, stretch, budget)?.ok_or_else(|| on_cell.inconclusive())?;
                on_cell.sign(&quotient, *sign)?;
                set(&mut signs, *index, *sign);
            }
            Ok(Cases { at_zero: Some(exact), elsewhere: vec![signs] })
        }
        Pivot::Auxiliary(pivot, listed) => {
            let mut cases = [signs.clone(), signs.clone(), signs];
            for (index, sign) in listed {
                let product = certificate.products.get(*index).ok_or_else(|| on_cell.refuted())?;
                on_cell.ensure(product.pivot == *pivot)?;
                let cofactor = model.auxiliaries.get(product.cofactor).ok_or_else(|| on_cell.refuted())?;
                prove_sign(on_cell, cofactor, *sign, stretch, budget)?;
                let odd = product.power % 2 == 1;
                let negative = if odd { sign.reverse() } else { *sign };
                for (case, sign) in cases.iter_mut().zip([negative, Ordering::Equal, *sign]) {
                    set(case, product.trace, sign);
                }
            }
            let [negative, zero, positive] = cases;
            Ok(Cases { at_zero: Some(zero), elsewhere: vec![negative, positive] })
        }
    }
}

pub(crate) fn set(signs: &mut Signs, index: usize, sign: Sign) {
    if let Some(slot) = signs.get_mut(index) {
        *slot = Some(sign);
    }
}

/// Proves that a function has this sign on a stretch; `Equal` only for the zero function.
fn prove_sign(duty: Duty, form: &ClosedForm, sign: Sign, on: Stretch, budget: &mut Budget) -> Checked {
    if form.terms.is_empty() {
        return duty.ensure(sign == Ordering::Equal);
    }
    let value = form.enclose(on, budget)?.ok_or_else(|| duty.inconclusive())?;
    duty.sign(&value, sign)
}

/// The enclosure of an auxiliary function at an instant.
pub(crate) fn value_at(form: &ClosedForm, at: &Rational, on: Setting, budget: &mut Budget) -> Enclosed {
    // Enough terms for a stretch of length 0: one more than the greatest power of t.
    let longest = form.terms.iter().map(|t| t.coefficients.len()).max().unwrap_or(1);
    let order = u32::try_from(longest).unwrap_or(u32::MAX);
    form.enclose(Stretch { centre: at, half_width: &Rational::zero(), order, bits: on.certificate.bits }, budget)
}
