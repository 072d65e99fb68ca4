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
pub(crate) fn needed(problem: &Problem, mut signs: Vec<Option<Sign>>, truth: bool) -> Vec<(usize, Sign)> {
    for i in 0..signs.len() {
        let sign = signs[i].take();
        if problem.formula.truth(&signs) != Some(truth) {
            signs[i] = sign;
        }
    }
    signs.iter().enumerate().filter_map(|(i, s)| s.map(|s| (i, s))).collect()
}
