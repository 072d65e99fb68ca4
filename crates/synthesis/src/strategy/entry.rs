//! Entries: instants in the zone.

use crate::enclosure::Enclosure;
use crate::problem::Problem;
use keepout_checker::certificate::{Cell, Pivot, Sign};
use keepout_checker::number::Rational;

/// The cell [at, at] if the zone is true there.
pub(crate) fn instant(at: &Rational, problem: &Problem, enclosure: &mut Enclosure) -> Option<Cell> {
    let judgement = enclosure.judge(problem, at, at, &[]);
    (judgement.truth == Some(true)).then(|| Cell {
        to: at.clone(),
        order: judgement.order,
        signs: needed(problem, judgement.signs, true),
        pivot: Pivot::None,
    })
}

/// The signs without those that the zone's truth does not need.
pub(crate) fn needed(problem: &Problem, signs: Vec<Option<Sign>>, truth: bool) -> Vec<(usize, Sign)> {
    reduced(signs, |signs| problem.truth(signs) == Some(truth))
}

/// The signs without those that the zone's falsehood in each case of a pivot does not need.
pub(crate) fn needed_in_cases(problem: &Problem, signs: Vec<Option<Sign>>, pivot: usize) -> Vec<(usize, Sign)> {
    reduced(signs, |signs| problem.truths(signs, pivot) == [Some(false); 3])
}

fn reduced(mut signs: Vec<Option<Sign>>, is_enough: impl Fn(&[Option<Sign>]) -> bool) -> Vec<(usize, Sign)> {
    for i in 0..signs.len() {
        let sign = signs[i].take();
        if sign.is_some() && !is_enough(&signs) {
            signs[i] = sign;
        }
    }
    signs.iter().enumerate().filter_map(|(i, s)| s.map(|s| (i, s))).collect()
}
