//! Rule `cone`: from t0 on the trajectory is not in the zone.
//!
//! Needs: leading terms of functions on the torus of their angles (see `far_field`); a bisection of the torus, complete, with
//! signs on each leaf from which the zone is false, in each case of the leaf's pivot.
//! Not needed: that the base angles are independent (a larger torus contains the orbit all the same).
//! Why: at each t >= t0 the angles omega_j t, taken modulo 2 pi, lie in some leaf; there the signs hold.
//! The claim `never` is about the trajectory; it says nothing of other starts. The same evidence shows that the trajectory cone
//! from t0 on avoids the zone: each point of it is, at its t, the limit of points on the base torus (docs/theorems/cone.md).
//! Source: doi:10.4230/LIPIcs.ICALP.2020.107, docs/theorems/cone.md.

use super::cell::{Cases, set};
use crate::certificate::{Cone, Node, Sign};
use crate::error::{Checked, Duty, Obligation, Rule};
use crate::far_field::Leads;
use crate::lead::{AngleBox, halves, whole_torus};
use crate::limits::{Budget, within};
use crate::model::Setting;

/// Checks that the zone is false for all t >= cone.far.from. The certificate's sums have been checked.
pub(crate) fn check(cone: &Cone, on: Setting, budget: &mut Budget) -> Checked {
    let leads = Leads::new(&cone.far, Rule::Cone, on, budget)?;
    let mut open: Vec<(AngleBox, u64)> = vec![(whole_torus(cone.far.base.len()), 0)];
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
            Node::Leaf(signs, pivot) => check_leaf(position, &angles, (signs, *pivot), &leads, on, budget)?,
        }
    }
    Duty::new(Rule::Cone, Obligation::LeavesCoverTorus, cone.nodes.len()).ensure(open.is_empty())
}

fn check_leaf(
    position: usize,
    angles: &AngleBox,
    (listed, pivot): (&[(usize, Sign)], Option<usize>),
    leads: &Leads,
    on: Setting,
    budget: &mut Budget,
) -> Checked {
    let on_leaf = Duty::new(Rule::Cone, Obligation::SignOnLeaf, position);
    let mut signs = on.no_signs();
    for (index, sign) in listed {
        leads.prove_sign(*index, *sign, angles, on_leaf, on, budget)?;
        set(&mut signs, *index, *sign);
    }
    Cases::of(signs, pivot).refute(Duty::new(Rule::Cone, Obligation::ZoneIsRefutedOnLeaf, position), on)
}
