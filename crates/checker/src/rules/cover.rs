//! Rule `cover`: on a bounded stretch of time the trajectory is not in the zone.
//!
//! Needs: an increasing list of instants from the stretch's start to its end, and on each closed cell between neighbours
//! signs of functions from which the zone is false, in each case of the cell's pivot.
//! Not needed: that the cells are small, or that the listed signs are all that hold.
//! Why: the closed cells cover the stretch because each begins where the one before it ends.
//! Source: docs/theorems/cover.md.

use super::cell::prove_signs;
use crate::certificate::Cell;
use crate::error::{Checked, Duty, Obligation, Rule};
use crate::limits::Budget;
use crate::model::Setting;
use crate::number::Rational;

/// Checks that the cells cover [from, to] and that the zone is false on each of them.
pub(crate) fn check(from: &Rational, to: &Rational, cells: &[Cell], on: Setting, budget: &mut Budget) -> Checked {
    let mut reached = from;
    for (position, cell) in cells.iter().enumerate() {
        Duty::new(Rule::Cover, Obligation::CellsCoverWindow, position).ensure(*reached <= cell.to)?;
        let cases = prove_signs((Rule::Cover, position), reached, cell, on, budget)?;
        cases.refute(Duty::new(Rule::Cover, Obligation::ZoneIsRefutedOnCell, position), on)?;
        reached = &cell.to;
    }
    // A stretch of one instant still needs a cell.
    Duty::new(Rule::Cover, Obligation::CellsCoverWindow, cells.len()).ensure(reached == to && !cells.is_empty())
}
