//! Rule `cover`: on a bounded stretch of time the trajectory is not in the zone.
//!
//! Needs: an increasing list of instants from the stretch's start to its end, and on each closed cell between neighbours
//! signs of traces from which the zone is false, in each case of the cell's pivot.
//! Not needed: that the cells are small, or that the listed signs are all that hold.
//! A window without an end needs a last cell that is timeless: what it shows does not depend on the stretch.
//! Why: the closed cells cover the stretch because each begins where the one before it ends.
//! Source: docs/theorems/cover.md.

use super::cell::prove_signs;
use crate::certificate::{Cell, Pivot, Sign};
use crate::error::{Checked, Duty, Obligation, Rule};
use crate::limits::Budget;
use crate::model::Setting;
use crate::number::Rational;
use crate::polynomial::Polynomial;
use num_traits::{One, Zero};

/// Whether what a cell shows holds at every instant: it lists no sign of a trace, and products whose cofactors are constants.
///
/// Lemma: an auxiliary function with the annihilator z is constant, so a sign proved for it on the cell holds for all time; the
/// cases of the pivot then refute the zone wherever the pivot is negative, zero or positive, that is at each t.
pub(crate) fn is_timeless(cell: &Cell, on: Setting) -> bool {
    let certificate = on.certificate;
    let z = Polynomial::new(vec![Rational::zero(), Rational::one()]);
    let is_constant = |(product, _): &(usize, Sign)| {
        let cofactor = certificate.products.get(*product).and_then(|p| certificate.auxiliaries.get(p.cofactor));
        let factors = cofactor.map(|auxiliary| auxiliary.factors.as_slice());
        matches!(factors, Some([f]) if f.multiplicity == 1 && on.model.table.polynomial(f.family) == Some(&z))
    };
    match &cell.pivot {
        Pivot::Auxiliary(_, listed) => cell.signs.is_empty() && listed.iter().all(is_constant),
        Pivot::None | Pivot::Start(_) => false,
    }
}

/// Checks that the cells cover [from, to] and that the zone is false on each of them.
pub(crate) fn check(from: &Rational, to: &Rational, cells: &[Cell], on: Setting, budget: &mut Budget) -> Checked {
    let mut reached = from;
    for (position, cell) in cells.iter().enumerate() {
        Duty::new(Rule::Cover, Obligation::CellsCoverWindow, position).ensure(*reached <= cell.to)?;
        let cases = prove_signs((Rule::Cover, position), reached, cell, on, budget)?;
        let refuted = Duty::new(Rule::Cover, Obligation::ZoneIsRefutedOnCell, position);
        for signs in cases.at_zero.iter().chain(&cases.elsewhere) {
            refuted.ensure(on.model.formula.truth(signs) == Some(false))?;
        }
        reached = &cell.to;
    }
    // A stretch of one instant still needs a cell.
    Duty::new(Rule::Cover, Obligation::CellsCoverWindow, cells.len()).ensure(reached == to && !cells.is_empty())
}
