//! Conditions in negation normal form.

use super::evaluate::{Case, Scope, difference};
use super::polynomial::Polynomial;
use super::syntax::{Comparator, Node, NodeKind};
use crate::diagnostic::Diagnostic;
use keepout_checker::statement::{Atom, Formula, Relation};

/// The most levels of alternating `and` and `or`: printing a statement takes four times as long with each level.
pub const MAX_NESTING: usize = 8;

/// The most comparisons of a condition, the cases of `abs` counted.
pub const MAX_COMPARISONS: usize = 10_000;

/// The meaning of a condition: comparisons `left - right` with 0, as typed, `not` pushed inwards.
///
/// # Errors
/// One diagnostic, with a place in the condition's text.
pub fn formula(node: &Node, scope: &dyn Scope) -> Result<Formula, Diagnostic> {
    let mut room = MAX_COMPARISONS;
    let formula = signed(node, scope, true, &mut room)?;
    if nesting(&formula) > MAX_NESTING {
        let message = format!("a condition alternates between `and` and `or` at most {MAX_NESTING} levels deep");
        return Err(Diagnostic::new(node.span.clone(), message).help("split it into several zones"));
    }
    Ok(formula)
}

fn nesting(formula: &Formula) -> usize {
    match formula {
        Formula::Atom(_) => 0,
        Formula::And(list) | Formula::Or(list) => 1 + list.iter().map(nesting).max().unwrap_or(0),
    }
}

fn signed(node: &Node, scope: &dyn Scope, positive: bool, room: &mut usize) -> Result<Formula, Diagnostic> {
    match &node.kind {
        NodeKind::Not(a) => signed(a, scope, !positive, room),
        NodeKind::And(list) => joined(list, scope, positive, positive, room),
        NodeKind::Or(list) => joined(list, scope, positive, !positive, room),
        NodeKind::Comparison(operands, comparators) => {
            let mut parts = Vec::new();
            for (pair, comparator) in operands.windows(2).zip(comparators) {
                parts.push(comparison(&pair[0], *comparator, &pair[1], scope, positive, room)?);
            }
            Ok(group(positive, parts))
        }
        NodeKind::Number(_)
        | NodeKind::Name(_)
        | NodeKind::Negative(_)
        | NodeKind::Sum(..)
        | NodeKind::Product(..)
        | NodeKind::Power(..)
        | NodeKind::Call(..) => {
            Err(Diagnostic::new(node.span.clone(), "expected a condition, found a number-valued expression")
                .help("compare it with something, as in x > 2"))
        }
    }
}

fn joined(
    list: &[Node],
    scope: &dyn Scope,
    positive: bool,
    conjunction: bool,
    room: &mut usize,
) -> Result<Formula, Diagnostic> {
    let mut parts = Vec::new();
    for node in list {
        parts.push(signed(node, scope, positive, room)?);
    }
    Ok(group(conjunction, parts))
}

/// The parts together; a part of the same kind is dissolved, a single one stands alone.
fn group(conjunction: bool, parts: Vec<Formula>) -> Formula {
    let mut flat = Vec::new();
    for part in parts {
        match (conjunction, part) {
            (true, Formula::And(inner)) | (false, Formula::Or(inner)) => flat.extend(inner),
            (_, part) => flat.push(part),
        }
    }
    match (flat.len(), conjunction) {
        (1, _) => flat.remove(0),
        (_, true) => Formula::And(flat),
        (_, false) => Formula::Or(flat),
    }
}

/// What `left comparator right`, or its negation, says about left - right.
fn relation(comparator: Comparator, positive: bool) -> Relation {
    match (comparator, positive) {
        (Comparator::Less, true) | (Comparator::AtLeast, false) => Relation::Negative,
        (Comparator::AtMost, true) | (Comparator::Greater, false) => Relation::NonPositive,
        (Comparator::Equal, true) => Relation::Zero,
        (Comparator::Equal, false) => Relation::NonZero,
        (Comparator::AtLeast, true) | (Comparator::Less, false) => Relation::NonNegative,
        (Comparator::Greater, true) | (Comparator::AtMost, false) => Relation::Positive,
    }
}

fn comparison(
    left: &Node,
    comparator: Comparator,
    right: &Node,
    scope: &dyn Scope,
    positive: bool,
    room: &mut usize,
) -> Result<Formula, Diagnostic> {
    let relation = relation(comparator, positive);
    let mut alternatives = Vec::new();
    // The cases cover everything and agree where they overlap: the comparison holds iff it holds in some case that applies.
    for Case { conditions, value } in difference(left, right, scope)? {
        *room = room.checked_sub(1 + conditions.len()).ok_or_else(|| {
            let message = format!("a condition has at most {MAX_COMPARISONS} comparisons, the cases of abs counted");
            Diagnostic::new(left.span.start..right.span.end, message).help("split it into several zones")
        })?;
        let mut parts: Vec<Formula> = conditions.iter().map(|c| atom(c, Relation::NonNegative)).collect();
        parts.push(atom(&value, relation));
        alternatives.push(group(true, parts));
    }
    Ok(group(false, alternatives))
}

fn atom(polynomial: &Polynomial, relation: Relation) -> Formula {
    Formula::Atom(Atom { polynomial: polynomial.expression(), relation })
}
