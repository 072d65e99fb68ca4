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
use crate::bisection::{Leaf, check_leaves};
use crate::certificate::Cone;
use crate::error::{Checked, Duty, Obligation, Rule};
use crate::far_field::Leads;
use crate::lead::AngleBox;
use crate::limits::Budget;
use crate::model::Setting;

/// Checks that the zone is false for all t >= cone.far.from. The certificate's sums have been checked.
pub(crate) fn check(cone: &Cone, on: Setting, budget: &mut Budget) -> Checked {
    let leads = Leads::new(&cone.far, Rule::Cone, on, budget)?;
    let torus = (cone.far.base.len(), cone.nodes.as_slice());
    check_leaves(torus, Rule::Cone, on.limits, |position, angles, leaf| {
        check_leaf(position, angles, leaf, &leads, on, budget)
    })
}

fn check_leaf(
    position: usize,
    angles: &AngleBox,
    (listed, pivot): Leaf,
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
