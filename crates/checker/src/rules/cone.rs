//! Rule `cone`: from t0 on the trajectory is not in the zone.
//!
//! Needs: for each trace used, leading roots with exactly equal real parts, the others with smaller ones; for each leading root
//! that is not real, its angle as an integer combination of base angles; a bisection of the torus of base angles, complete, with
//! signs on each leaf from which the zone is false; each sign by dominance of the leading terms for all t >= t0.
//! Not needed: that the base angles are independent (a larger torus contains the orbit all the same), that a leading
//! coefficient is not zero (then no sign can be proved).
//! Why: at each t >= t0 the angles omega_j t, taken modulo 2 pi, lie in some leaf; there the signs hold.
//! The claim is about the trajectory; it says nothing of other starts.
//! Source: doi:10.4230/LIPIcs.ICALP.2020.107, docs/theorems/cone.md.

use super::cell::set;
use crate::certificate::{Cone, Lead, Node, RealPart, RootRef, Sign};
use crate::error::{Checked, Duty, Obligation, Rejection, Rule};
use crate::lead::{AngleBox, LeadForm, halves, whole_torus};
use crate::limits::{Budget, within};
use crate::model::Setting;
use crate::number::Dyadic;
use num_traits::Signed;
use std::cmp::Ordering;
use std::collections::BTreeMap;

/// The turns of each root whose angle is known.
type Turns = BTreeMap<usize, Vec<i64>>;

/// Checks that the zone is false for all t >= cone.from. The certificate's sums have been checked.
pub(crate) fn check(cone: &Cone, on: Setting, budget: &mut Budget) -> Checked {
    Duty::new(Rule::Cone, Obligation::CellsCoverWindow, 0).ensure(cone.from.is_positive())?;
    let forms = lead_forms(cone, on, budget)?;
    let mut open: Vec<(AngleBox, u64)> = vec![(whole_torus(cone.base.len()), 0)];
    for (position, node) in cone.nodes.iter().enumerate() {
        let covers = Duty::new(Rule::Cone, Obligation::LeavesCoverTorus, position);
        let (angles, depth) = open.pop().ok_or_else(|| covers.refuted())?;
        match node {
            Node::Split(axis) => {
                within("depth", usize::try_from(depth + 1).unwrap_or(usize::MAX), on.limits.depth)?;
                let (lower, upper) = halves(&angles, *axis).ok_or_else(|| covers.refuted())?;
                open.push((upper, depth + 1));
                open.push((lower, depth + 1));
            }
            Node::Leaf(listed) => check_leaf(position, &angles, listed, &forms, on, budget)?,
        }
    }
    Duty::new(Rule::Cone, Obligation::LeavesCoverTorus, cone.nodes.len()).ensure(open.is_empty())
}

fn check_leaf(
    position: usize,
    angles: &AngleBox,
    listed: &[(usize, Sign)],
    forms: &[Option<LeadForm>],
    on: Setting,
    budget: &mut Budget,
) -> Checked {
    let Setting { certificate, model, .. } = on;
    let on_leaf = Duty::new(Rule::Cone, Obligation::SignOnLeaf, position);
    let mut signs = vec![None; model.traces.len()];
    for (index, sign) in listed {
        let trace = model.traces.get(*index).ok_or_else(|| on_leaf.refuted())?;
        if trace.form.terms.is_empty() {
            on_leaf.ensure(*sign == Ordering::Equal)?;
        } else {
            let form = forms.get(*index).and_then(Option::as_ref).ok_or_else(|| on_leaf.refuted())?;
            budget.spend(200 * form.count(), certificate.bits)?;
            on_leaf.sign(&form.enclose(angles).ok_or_else(|| on_leaf.inconclusive())?, *sign)?;
        }
        set(&mut signs, *index, *sign);
    }
    Duty::new(Rule::Cone, Obligation::ZoneIsRefutedOnLeaf, position).ensure(model.formula.truth(&signs) == Some(false))
}

/// The leading part of each trace that has one in the certificate.
fn lead_forms(cone: &Cone, on: Setting, budget: &mut Budget) -> Result<Vec<Option<LeadForm>>, Rejection> {
    let Setting { certificate, model, .. } = on;
    let turns = check_angles(cone, on)?;
    let mut forms = Vec::new();
    for (position, (lead, trace)) in cone.leads.iter().zip(&model.traces).enumerate() {
        let Some(lead) = lead else {
            forms.push(None);
            continue;
        };
        // A line of symmetry is shown by a product of polynomials for each root.
        let size = model.table.roots().len();
        budget.spend((size * size).saturating_mul(64 * lead.roots.len()) + 100 * size, certificate.bits)?;
        let rho_lo = check_real_parts(position, lead, on)?;
        let mut leading = Vec::new();
        for root in &lead.roots {
            let known = Duty::new(Rule::Cone, Obligation::AngleIsCombination, *root);
            let is_real = model.table.roots().get(*root).is_some_and(|r| r.is_real);
            let angle = if is_real { Some(vec![0; cone.base.len()]) } else { turns.get(root).cloned() };
            leading.push((*root, angle.ok_or_else(|| known.refuted())?));
        }
        let form = LeadForm::new(&trace.form, &leading, &rho_lo, &cone.from, position, certificate.bits)?;
        forms.push(Some(form));
    }
    Ok(forms)
}

/// Checks that the leading roots have equal real parts; returns a lower bound of it.
fn check_real_parts(position: usize, lead: &Lead, on: Setting) -> Result<Dyadic, Rejection> {
    let Setting { certificate, model, .. } = on;
    let equal = Duty::new(Rule::Cone, Obligation::RealPartsAreEqual, position);
    match &lead.real_part {
        RealPart::Single => equal.ensure(lead.roots.len() == 1)?,
        RealPart::Line(line) => {
            for root in &lead.roots {
                let on_line = Duty::new(Rule::Equality, Obligation::RootIsOnLine, *root);
                let decided =
                    model.table.is_on_line(*root, line, certificate.bits).ok_or_else(|| on_line.inconclusive())?;
                on_line.ensure(decided)?;
            }
        }
        RealPart::Doubled(sums) => {
            equal.ensure(sums.len() == lead.roots.len())?;
            let mut doubles = Vec::new();
            for (index, root) in sums.iter().zip(&lead.roots) {
                let sum = certificate.sums.get(*index).ok_or_else(|| equal.refuted())?;
                let pair = [false, true].map(|conjugate| (1, RootRef { index: *root, conjugate }));
                equal.ensure(sum.parts == pair)?;
                doubles.push(sum.root.index);
            }
            // root + conj root is real, so the root that it is is real: the position alone names it.
            equal.ensure(doubles.windows(2).all(|pair| pair.first() == pair.last()))?;
        }
    }
    // SOUND(lo): rho is in the real enclosure of each leading root, so each lower end is a lower bound.
    let ends = lead.roots.iter().filter_map(|r| model.table.roots().get(*r)).map(|r| r.value.re.lo().clone());
    ends.max().ok_or_else(|| equal.refuted())
}

/// Checks the angles in order; returns the turns of each root that is not real.
///
/// Lemma: a sum n_1 a + n_2 b = r of roots holds for imaginary parts too; the imaginary part of conj a is minus that of a, and
/// that of a real root is 0.
fn check_angles(cone: &Cone, on: Setting) -> Result<Turns, Rejection> {
    let Setting { certificate, model, .. } = on;
    let mut turns = Turns::new();
    let is_real = |index: usize| model.table.roots().get(index).is_some_and(|r| r.is_real);
    for angle in &cone.angles {
        let duty = Duty::new(Rule::Cone, Obligation::AngleIsCombination, angle.root);
        let Some(position) = angle.sum else {
            let unit: Vec<i64> = cone.base.iter().map(|b| i64::from(*b == angle.root)).collect();
            duty.ensure(!is_real(angle.root) && unit.iter().sum::<i64>() == 1 && unit == angle.turns)?;
            turns.insert(angle.root, unit);
            continue;
        };
        let sum = certificate.sums.get(position).ok_or_else(|| duty.refuted())?;
        let mut total = vec![0_i64; cone.base.len()];
        for (times, part) in &sum.parts {
            if is_real(part.index) {
                continue;
            }
            let known = turns.get(&part.index).ok_or_else(|| duty.refuted())?;
            let sign = if part.conjugate { -1 } else { 1 };
            for (slot, n) in total.iter_mut().zip(known) {
                *slot = times
                    .checked_mul(*n)
                    .and_then(|x| x.checked_mul(sign))
                    .and_then(|x| slot.checked_add(x))
                    .ok_or_else(|| duty.refuted())?;
            }
        }
        let expected: Vec<i64> = if sum.root.conjugate { total.iter().map(|n| -n).collect() } else { total };
        duty.ensure(sum.root.index == angle.root && expected == angle.turns)?;
        turns.insert(angle.root, expected);
    }
    Ok(turns)
}
