//! The boxes of a bisection of the torus, read from its nodes in preorder: what the rules `cone` and `region` share.

use crate::certificate::{Node, Sign};
use crate::error::{Checked, Duty, Obligation, Rule};
use crate::lead::{AngleBox, halves, whole_torus};
use crate::limits::{Limits, within};

/// What a leaf lists: signs, and a pivot.
pub(crate) type Leaf<'a> = (&'a [(usize, Sign)], Option<usize>);

/// Checks each leaf, and that the leaves cover the torus of this dimension.
///
/// Why they do: a split replaces a box by two whose union it is, and in the end no box is open.
pub(crate) fn check_leaves<'a>(
    (dimension, nodes): (usize, &'a [Node]),
    rule: Rule,
    limits: &Limits,
    mut check: impl FnMut(usize, &AngleBox, Leaf<'a>) -> Checked,
) -> Checked {
    let mut open: Vec<(AngleBox, u64)> = vec![(whole_torus(dimension), 0)];
    for (position, node) in nodes.iter().enumerate() {
        let covers = Duty::new(rule, Obligation::LeavesCoverTorus, position);
        let (angles, depth) = open.pop().ok_or_else(|| covers.refuted())?;
        match node {
            Node::Split(axis) => {
                within("depth", usize::try_from(depth + 1).unwrap_or(usize::MAX), limits.depth)?;
                let (lower, upper) = halves(&angles, *axis).ok_or_else(|| covers.refuted())?;
                open.push((upper, depth + 1));
                open.push((lower, depth + 1));
            }
            Node::Leaf(signs, pivot) => check(position, &angles, (signs, *pivot))?,
        }
    }
    Duty::new(rule, Obligation::LeavesCoverTorus, nodes.len()).ensure(open.is_empty())
}
