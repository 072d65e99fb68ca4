//! Rule `entry`: at some instant of a stretch of time the trajectory is in the zone.
//!
//! Needs: signs of traces on the closed stretch from which the zone is true; or a pivot with opposite signs at the two ends, and
//! signs from which the zone is true where the pivot is zero (at t = 0 for the pivot t).
//! Not needed: that the pivot vanishes once only.
//! Why: the pivot is continuous, so it vanishes somewhere between the ends.
//! Source: docs/theorems/entry.md.

use super::cell::{Signs, prove_signs, value_at};
use crate::certificate::{Cell, Pivot};
use crate::error::{Checked, Duty, Obligation, Rule};
use crate::limits::Budget;
use crate::model::Setting;
use crate::number::Rational;
use std::cmp::Ordering;

/// Checks that the zone is entered in [from, cell.to].
pub(crate) fn check(from: &Rational, cell: &Cell, on: Setting, budget: &mut Budget) -> Checked {
    Duty::new(Rule::Entry, Obligation::InstantIsInWindow, 0).ensure(*from <= cell.to)?;
    let cases = prove_signs((Rule::Entry, 0), from, cell, on, budget)?;
    let proved = Duty::new(Rule::Entry, Obligation::ZoneIsProvedAtInstant, 0);
    let inside = |signs: Signs| on.truth(signs) == Some(true);
    match (&cell.pivot, cases.at_zero) {
        // At t = 0, or at every instant after it up to the cell's end (if there is one).
        (Pivot::Start(_), Some(at_zero)) => {
            let after = *from < cell.to && cases.elsewhere.into_iter().all(inside);
            proved.ensure(inside(at_zero) || after)
        }
        (Pivot::Function(pivot), Some(at_zero)) => {
            let changes = Duty::new(Rule::Entry, Obligation::PivotChangesSign, *pivot);
            let function = on.model.functions.get(*pivot).ok_or_else(|| changes.refuted())?;
            let mut ends = Vec::new();
            for at in [from, &cell.to] {
                let value = value_at(function, at, on, budget)?;
                let sign = value.and_then(|v| v.certain_sign()).ok_or_else(|| changes.inconclusive())?;
                ends.push(sign);
            }
            let opposite = ends == [Ordering::Less, Ordering::Greater] || ends == [Ordering::Greater, Ordering::Less];
            changes.ensure(opposite)?;
            proved.ensure(inside(at_zero))
        }
        (Pivot::None | Pivot::Start(_) | Pivot::Function(_), _) => {
            proved.ensure(cases.elsewhere.into_iter().all(inside))
        }
    }
}
