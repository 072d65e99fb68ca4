//! Rule `worst_case`: no admissible trajectory is in the zone.
//!
//! Needs: a division of what is admissible into pieces; for each piece a plain statement and inputs (see `substitution`, `support`); bounds of
//! functionals on cells of time and for all times after the last cell, from which the zone is false at each instant of the window.
//! Not needed: that the bounds are sharp.
//! Why: on a piece, S(t) < 0 for a sum of polynomials of the zone with the signs that its atoms ask for shows that these atoms do not
//! hold together along any trajectory of the piece.
//! Uncertain terms: a group adds delta(t) g(t) to a rate, |delta| <= d. Lemma: if S_g < B and S_(-g) < B on each cell and later,
//! computed with the group as an input of size d B, then |g| < B along each trajectory. For let the part of g that depends on the
//! state, which is continuous, stay within B less what the disturbances in g add, up to a greatest time; up to it the group is an
//! admissible input, so it stays within strictly, and still does a little later: there is no greatest time. (All groups at once.)
//! Source: docs/theorems/worst_case.md.

use crate::affine_form::expression;
use crate::division::check_pieces;
use crate::error::{Checked, Duty, Obligation, Rule};
use crate::far_field::{Turns, check_angles};
use crate::formula::Conflict;
use crate::limits::Budget;
use crate::many::{Division, Functional, Piece, Ranges, Tail};
use crate::model::{Model, Setting};
use crate::number::{Dyadic, Interval, Rational};
use crate::root::RootTable;
use crate::substitution::{Group, substituted};
use crate::support::{Ground, Inputs, Support};
use crate::trace::Stretch;
use num_traits::{One, Signed, Zero};
use std::cmp::Ordering;

/// Checks that the pieces are all that is admissible, and each of them.
pub(crate) fn check(divisions: &[Division], on: Setting, budget: &mut Budget) -> Checked {
    check_pieces(divisions, &on.certificate.statement, |piece, ranges| check_piece(piece, ranges, on, budget))
}

/// A functional to bound: its support function, a bound that it stays below, and what follows where it is negative.
struct Bounded {
    support: Support,
    bound: Option<Rational>,
    conflict: Vec<(usize, bool)>,
}

fn check_piece(piece: &Piece, ranges: &Ranges, on: Setting, budget: &mut Budget) -> Checked {
    let Setting { certificate, limits, .. } = on;
    let fits = Duty::new(Rule::WorstCase, Obligation::EvidenceFitsClaim, 0);
    // Each piece has its own roots; no sum of roots speaks of them.
    fits.ensure(certificate.sums.is_empty() && certificate.families.is_empty())?;
    let table = RootTable::new(&piece.families, certificate.bits, budget)?;
    let model = &Model { formula: on.model.formula.clone(), table, functions: Vec::new() };
    let on = Setting { model, ..on };
    let (plain, groups) = substituted(&certificate.statement, ranges).ok_or_else(|| fits.refuted())?;
    let forms: Vec<&Group> = groups.iter().filter(|g| g.constant().is_none()).collect();
    fits.ensure(forms.len() == piece.bounds.len() && piece.bounds.iter().all(|b| !b.is_negative()))?;
    fits.ensure(piece.splits.len() == forms.len() + piece.functionals.len())?;
    let mut bounds = piece.bounds.iter();
    let mut signals = Vec::new();
    for group in &groups {
        let bound = group.constant().map(|c| c.abs()).or_else(|| bounds.next().cloned()).unwrap_or_else(Rational::zero);
        signals.push((vec![(group.state, Rational::one())], &group.deviation * bound));
    }
    let inputs = Inputs::new(&plain, signals).ok_or_else(|| fits.refuted())?;
    let bits = certificate.bits;
    let ground = Ground { plain: &plain, inputs: &inputs, table: &model.table, bits, limits, integrated: false };
    let mut all = Vec::new();
    for (position, ((group, bound), parts)) in forms.iter().zip(&piece.bounds).zip(&piece.splits).enumerate() {
        let support = Support::new(&group.form, parts, position, &ground, budget)?;
        let negated = support.negated();
        let bounded = |support| Bounded { support, bound: Some(bound.clone()), conflict: Vec::new() };
        all.extend([support, negated].map(bounded));
    }
    for (functional, parts) in piece.functionals.iter().zip(piece.splits.iter().skip(forms.len())) {
        let position = all.len();
        let affine = Duty::new(Rule::WorstCase, Obligation::FunctionalIsAffine, position);
        let expression = expression(functional, &model.formula.polynomials).ok_or_else(|| affine.refuted())?;
        let support = Support::new(&expression, parts, position, &ground, budget)?;
        all.push(Bounded { support, bound: None, conflict: conflict(functional) });
    }
    check_times(piece, &all, &inputs, on, budget)
}

/// The polynomials that do not all have the wanted signs where the functional is negative; none if it says nothing of them.
fn conflict(functional: &Functional) -> Vec<(usize, bool)> {
    if !functional.variables.is_empty() {
        return Vec::new();
    }
    let weighted = functional.polynomials.iter().filter(|(_, w)| !w.is_zero());
    weighted.map(|(position, weight)| (*position, weight.is_positive())).collect()
}

fn check_times(piece: &Piece, all: &[Bounded], inputs: &Inputs, on: Setting, budget: &mut Budget) -> Checked {
    let zone = &on.certificate.statement.zone;
    let mut integrals = vec![vec![Dyadic::zero(); inputs.signals.len()]; all.len()];
    let mut reached = Rational::zero();
    let half = Rational::new(1_i32.into(), 2_i32.into());
    for (position, cell) in piece.cells.iter().enumerate() {
        Duty::new(Rule::WorstCase, Obligation::CellsCoverWindow, position).ensure(reached <= cell.to)?;
        let on_cell = Duty::new(Rule::WorstCase, Obligation::SignOnCell, position);
        let (centre, half_width) = ((&reached + &cell.to) * &half, (&cell.to - &reached) * &half);
        let stretch = Stretch { centre: &centre, half_width: &half_width, order: cell.order, bits: cell.bits };
        let mut conflicts = Vec::new();
        for (index, (one, integrals)) in all.iter().zip(&mut integrals).enumerate() {
            let bounded = one.support.on_cell(inputs, integrals, stretch, budget)?;
            let bounded = bounded.ok_or_else(|| on_cell.inconclusive())?;
            *integrals = bounded.integrals;
            stays_below(&bounded.upper, one, index, on)?;
            let needs_strict = bounded.upper.sign() != Ordering::Less;
            if !needs_strict || bounded.leaves_zero {
                conflicts.push(Conflict { parts: one.conflict.clone(), needs_strict });
            }
        }
        // The instant `from` itself belongs to the next cell, or to the tail.
        let is_last = position + 1 == piece.cells.len() && piece.tail.is_none();
        if cell.to > zone.from || is_last {
            let refuted = Duty::new(Rule::WorstCase, Obligation::ZoneIsRefutedOnCell, position);
            refuted.decide(on.model.formula.is_refuted(&conflicts))?;
        }
        reached.clone_from(&cell.to);
    }
    let covered = Duty::new(Rule::WorstCase, Obligation::CellsCoverWindow, piece.cells.len());
    match (&piece.tail, &zone.until) {
        (None, Some(until)) => covered.ensure(reached == *until && !piece.cells.is_empty()),
        (Some(tail), None) => {
            covered.ensure(tail.from == reached && reached.is_positive() && zone.from <= reached)?;
            check_tail(tail, all, inputs, &integrals, on, budget)
        }
        (None, None) | (Some(_), Some(_)) => Err(covered.refuted()),
    }
}

/// Requires that a form stays below its bound.
fn stays_below(upper: &Dyadic, one: &Bounded, index: usize, on: Setting) -> Checked {
    let Some(bound) = &one.bound else { return Ok(()) };
    let duty = Duty::new(Rule::WorstCase, Obligation::FormIsBounded, index / 2);
    duty.decide(upper < Interval::rational(bound, on.certificate.bits).lo())
}

fn check_tail(
    tail: &Tail,
    all: &[Bounded],
    inputs: &Inputs,
    integrals: &[Vec<Dyadic>],
    on: Setting,
    budget: &mut Budget,
) -> Checked {
    let bits = on.certificate.bits;
    Duty::new(Rule::WorstCase, Obligation::EvidenceFitsClaim, 0).ensure(tail.leads.len() == all.len())?;
    let turns: Turns = check_angles((&tail.base, &tail.angles), on)?;
    let mut conflicts = Vec::new();
    for (index, ((one, lead), integrals)) in all.iter().zip(&tail.leads).zip(integrals).enumerate() {
        let mut leading = Vec::new();
        for root in &lead.roots {
            let on_line = Duty::new(Rule::WorstCase, Obligation::RootIsOnLine, *root);
            on.model.table.spend_reflection(*root, budget)?;
            let decided = on.model.table.is_on_line(*root, &Rational::zero(), bits);
            on_line.ensure(decided.ok_or_else(|| on_line.inconclusive())?)?;
            let is_real = on.model.table.roots().get(*root).is_some_and(|r| r.is_real);
            let angle = if is_real { Some(vec![0; tail.base.len()]) } else { turns.get(root).cloned() };
            leading.push((*root, angle.ok_or_else(|| on_line.refuted())?));
        }
        let upper = one.support.on_tail(inputs, integrals, (tail, lead, &leading), index, (on.limits, bits, budget))?;
        if one.bound.is_some() {
            Duty::new(Rule::WorstCase, Obligation::FormIsBounded, index / 2).ensure(lead.power == 0)?;
            stays_below(&upper, one, index, on)?;
        }
        if upper.sign() == Ordering::Less {
            conflicts.push(Conflict { parts: one.conflict.clone(), needs_strict: false });
        }
    }
    let refuted = Duty::new(Rule::WorstCase, Obligation::ZoneIsRefutedOnLeaf, 0);
    refuted.decide(on.model.formula.is_refuted(&conflicts))
}
