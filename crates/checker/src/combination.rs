//! Real and imaginary parts of roots as combinations of base rates and base frequencies.

use crate::error::{Duty, Obligation, Rejection, Rule};
use crate::limits::Budget;
use crate::model::Setting;
use crate::number::Rational;
use crate::region::{Reason, Step};
use num_traits::Zero;
use std::collections::BTreeMap;

/// Rows by the position of their root.
pub(crate) type Rows = BTreeMap<usize, Vec<Rational>>;

/// Which part of a root.
#[derive(Clone, Copy, PartialEq, Eq)]
pub(crate) enum Part {
    Real,
    Imaginary,
}

/// Real (imaginary) parts of roots as combinations of the scale and the base rates (of the base frequencies), step by step.
///
/// Lemma: a sum n_1 a + n_2 b = r of roots holds for real and imaginary parts, that of a conjugate being the same (the opposite). If
/// the parts of all but one of a, b, r are known combinations, and this one's total weight is not 0, its part is a combination.
pub(crate) fn rows(
    steps: &[Step],
    part: Part,
    base: &[usize],
    scale: &Rational,
    on: Setting,
    budget: &mut Budget,
) -> Result<Rows, Rejection> {
    let obligation = match part {
        Part::Real => Obligation::RateIsCombination,
        Part::Imaginary => Obligation::AngleIsCombination,
    };
    let shift = usize::from(part == Part::Real);
    let width = base.len() + shift;
    let mut known = Rows::new();
    for step in steps {
        let duty = Duty::new(Rule::Region, obligation, step.root);
        let mut unit = vec![Rational::zero(); width];
        match &step.reason {
            Reason::Base => {
                let axis = base.iter().position(|b| *b == step.root).ok_or_else(|| duty.refuted())?;
                unit.iter_mut()
                    .skip(axis + shift)
                    .take(1)
                    .for_each(|slot| *slot = Rational::from_integer(1_i32.into()));
                duty.ensure(unit == step.row)?;
            }
            Reason::Line(line) => {
                let on_line = Duty::new(Rule::Equality, Obligation::RootIsOnLine, step.root);
                on.model.table.spend_reflection(step.root, budget)?;
                let decided = on.model.table.is_on_line(step.root, line, on.certificate.bits);
                on_line.ensure(decided.ok_or_else(|| on_line.inconclusive())?)?;
                unit.iter_mut().take(1).for_each(|slot| *slot = line / scale);
                duty.ensure(part == Part::Real && unit == step.row)?;
            }
            Reason::Sum(position) => duty.ensure(follows(step, *position, part, &known, width, on) == Some(true))?,
        }
        known.insert(step.root, step.row.clone());
    }
    Ok(known)
}

/// Whether a step's row follows from the sum at a position; `None`: a root's row is not known.
fn follows(step: &Step, position: usize, part: Part, known: &Rows, width: usize, on: Setting) -> Option<bool> {
    let sum = on.certificate.sums.get(position)?;
    let mut weights: BTreeMap<usize, i64> = BTreeMap::new();
    for (times, root) in sum.parts.iter().copied().chain([(-1, sum.root)]) {
        let sign = if part == Part::Imaginary && root.conjugate { -1 } else { 1 };
        let slot = weights.entry(root.index).or_insert(0);
        *slot = slot.checked_add(times.checked_mul(sign)?)?;
    }
    let mut total = vec![Rational::zero(); width];
    for (index, weight) in &weights {
        if part == Part::Imaginary && on.model.table.roots().get(*index)?.is_real {
            continue;
        }
        let row = if *index == step.root { &step.row } else { known.get(index)? };
        for (slot, x) in total.iter_mut().zip(row) {
            *slot += x * Rational::from_integer((*weight).into());
        }
    }
    let determined = weights.get(&step.root).is_some_and(|w| *w != 0) && step.row.len() == width;
    Some(determined && total.iter().all(Zero::is_zero))
}
