//! Signs of functions on a stretch of time: what the rules `cover` and `entry` share.
//!
//! A cell lists signs that hold on all of it, and may name a pivot w. At each instant of the cell, w is negative, zero or
//! positive: so a formula that is false in these three cases is false on the whole cell, whatever w is.
//! - Pivot t, on a cell that starts at 0: at t = 0 all signs are exact (but those of functions with exponentials). For t > 0, a function with g^(j)(0) = 0 for j < k has the
//!   sign of g / t^k.
//! - Pivot a function: what follows from its sign follows by the certificate's identities.

use crate::certificate::{Cell, Pivot, Sign};
use crate::error::{Checked, Duty, Obligation, Rejection, Rule};
use crate::exponential;
use crate::limits::Budget;
use crate::model::{Function, Setting};
use crate::number::{Interval, Rational};
use crate::signs::SignSet;
use crate::trace::Stretch;
use num_traits::Zero;
use std::cmp::Ordering;

/// The possible signs of all functions in one case.
pub(crate) type Signs = Vec<SignSet>;

/// An enclosure; `None`: an argument is out of range.
pub(crate) type Enclosed = Result<Option<Interval>, Rejection>;

/// The signs of functions, case by case.
pub(crate) struct Cases {
    /// The signs where the pivot is zero; `None`: there is no pivot.
    pub(crate) at_zero: Option<Signs>,
    /// The signs in the other cases, at least one.
    pub(crate) elsewhere: Vec<Signs>,
}

impl Cases {
    /// The cases of a pivot that is a function.
    pub(crate) fn of(signs: Signs, pivot: Option<usize>) -> Self {
        let Some(pivot) = pivot else { return Self { at_zero: None, elsewhere: vec![signs] } };
        let [negative, zero, positive] = [Ordering::Less, Ordering::Equal, Ordering::Greater].map(|sign| {
            let mut case = signs.clone();
            set(&mut case, pivot, sign);
            case
        });
        Self { at_zero: Some(zero), elsewhere: vec![negative, positive] }
    }

    /// Requires that the zone is false in each case.
    pub(crate) fn refute(self, duty: Duty, on: Setting) -> Checked {
        let mut all = self.at_zero.into_iter().chain(self.elsewhere);
        duty.ensure(all.all(|signs| on.truth(signs) == Some(false)))
    }
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
    let function = |index: &usize| model.functions.get(*index).ok_or_else(|| on_cell.refuted());
    let half = Rational::new(1_i32.into(), 2_i32.into());
    let (centre, half_width) = ((from + &cell.to) * &half, (&cell.to - from) * &half);
    let stretch = Stretch { centre: &centre, half_width: &half_width, order: cell.order, bits: certificate.bits };
    let mut signs = on.no_signs();
    for (index, sign) in &cell.signs {
        if from.is_zero() && cell.to.is_zero() && function(index)?.products.is_empty() {
            on_cell.ensure(function(index)?.sequence.sign_at_zero() == *sign)?;
        } else {
            prove_sign(on_cell, function(index)?, *sign, stretch, on, budget)?;
        }
        set(&mut signs, *index, *sign);
    }
    match &cell.pivot {
        Pivot::None => Ok(Cases::of(signs, None)),
        Pivot::Function(pivot) => Ok(Cases::of(signs, Some(*pivot))),
        Pivot::Start(listed) => {
            let vanishes = Duty::new(rule, Obligation::VanishesAtStart, position);
            vanishes.ensure(from.is_zero())?;
            let mut exact = signs.clone();
            for (index, plain) in model.functions.iter().enumerate().filter(|(_, f)| f.products.is_empty()) {
                set(&mut exact, index, plain.sequence.sign_at_zero());
            }
            for (index, power, sign) in listed {
                let Function { sequence, form, products, .. } = function(index)?;
                on_cell.ensure(products.is_empty())?;
                let power = usize::try_from(*power).unwrap_or(usize::MAX);
                vanishes
                    .ensure(sequence.count() >= power && sequence.values().iter().take(power).all(Zero::is_zero))?;
                let zero = Rational::zero();
                let stretch = Stretch { centre: &zero, half_width: &cell.to, ..stretch };
                let quotient = form.quotient(power, stretch, budget)?.ok_or_else(|| on_cell.inconclusive())?;
                on_cell.sign(&quotient, *sign)?;
                set(&mut signs, *index, *sign);
            }
            Ok(Cases { at_zero: Some(exact), elsewhere: vec![signs] })
        }
    }
}

pub(crate) fn set(signs: &mut Signs, index: usize, sign: Sign) {
    if let Some(slot) = signs.get_mut(index) {
        *slot = SignSet::only(sign);
    }
}

/// Proves that a function has this sign on a stretch; `Equal` only for the zero function.
fn prove_sign(
    duty: Duty,
    function: &Function,
    sign: Sign,
    stretch: Stretch,
    on: Setting,
    budget: &mut Budget,
) -> Checked {
    if function.is_zero() {
        return duty.ensure(sign == Ordering::Equal);
    }
    duty.sign(&enclose(function, stretch, on, budget)?.ok_or_else(|| duty.inconclusive())?, sign)
}

/// Encloses a function on a stretch.
fn enclose(function: &Function, stretch: Stretch, on: Setting, budget: &mut Budget) -> Enclosed {
    if function.products.is_empty() {
        return function.form.enclose(stretch, budget);
    }
    let form = |position: &usize| on.model.functions.get(*position).map(|part| &part.form);
    let pairs = function.products.iter().map(|(c, a)| Some((form(c)?, form(a)?)));
    match pairs.collect::<Option<Vec<_>>>() {
        Some(pairs) => exponential::enclose(&pairs, stretch, budget),
        None => Ok(None),
    }
}

/// The enclosure of a function at an instant.
pub(crate) fn value_at(function: &Function, at: &Rational, on: Setting, budget: &mut Budget) -> Enclosed {
    // Enough terms for a stretch of length 0: one more than the greatest power of t.
    let longest =
        on.model.functions.iter().flat_map(|f| &f.form.terms).map(|t| t.coefficients.len()).max().unwrap_or(1);
    let order = u32::try_from(longest).unwrap_or(u32::MAX);
    let stretch = Stretch { centre: at, half_width: &Rational::zero(), order, bits: on.certificate.bits };
    enclose(function, stretch, on, budget)
}
