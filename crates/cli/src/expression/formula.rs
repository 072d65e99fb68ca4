//! Conditions in negation normal form.

use super::parser::{Node, NodeKind};
use super::polynomial::{Case, Polynomial, Scope, evaluate};
use crate::diagnostic::Diagnostic;
use keepout_checker::statement::{Atom, Formula, Relation};

/// The meaning of a condition: comparisons `left - right` with 0, as typed, `not` pushed inwards.
///
/// # Errors
/// One diagnostic, with a place in the condition's text.
pub fn formula(node: &Node, scope: &dyn Scope) -> Result<Formula, Diagnostic> {
    signed(node, scope, true)
}

fn signed(node: &Node, scope: &dyn Scope, positive: bool) -> Result<Formula, Diagnostic> {
    match &node.kind {
        NodeKind::Not(a) => signed(a, scope, !positive),
        NodeKind::And(a, b) => joined(a, b, scope, positive, positive),
        NodeKind::Or(a, b) => joined(a, b, scope, positive, !positive),
        NodeKind::Comparison(operands, operators) => {
            let mut parts = Vec::new();
            for (pair, operator) in operands.windows(2).zip(operators) {
                parts.push(comparison(&pair[0], operator, &pair[1], scope, positive)?);
            }
            Ok(if parts.len() == 1 { parts.remove(0) } else { group(positive, parts) })
        }
        NodeKind::Number(_)
        | NodeKind::Name(_)
        | NodeKind::Negative(_)
        | NodeKind::Sum(..)
        | NodeKind::Difference(..)
        | NodeKind::Product(..)
        | NodeKind::Quotient(..)
        | NodeKind::Power(..)
        | NodeKind::Call(..) => {
            Err(Diagnostic::new(node.span.clone(), "expected a condition, found a number-valued expression")
                .help("compare it with something, as in x > 2"))
        }
    }
}

fn joined(a: &Node, b: &Node, scope: &dyn Scope, positive: bool, conjunction: bool) -> Result<Formula, Diagnostic> {
    let mut parts = Vec::new();
    for part in [signed(a, scope, positive)?, signed(b, scope, positive)?] {
        match (conjunction, part) {
            (true, Formula::And(inner)) | (false, Formula::Or(inner)) => parts.extend(inner),
            (_, part) => parts.push(part),
        }
    }
    Ok(group(conjunction, parts))
}

fn group(conjunction: bool, parts: Vec<Formula>) -> Formula {
    if conjunction { Formula::And(parts) } else { Formula::Or(parts) }
}

fn comparison(a: &Node, operator: &str, b: &Node, scope: &dyn Scope, positive: bool) -> Result<Formula, Diagnostic> {
    let difference =
        Node { span: a.span.start..b.span.end, kind: NodeKind::Difference(Box::new(a.clone()), Box::new(b.clone())) };
    let relation = match (operator, positive) {
        ("<", true) | (">=", false) => Relation::Negative,
        ("<=", true) | (">", false) => Relation::NonPositive,
        (">=", true) | ("<", false) => Relation::NonNegative,
        (">", true) | ("<=", false) => Relation::Positive,
        ("=", false) => Relation::NonZero,
        _ => Relation::Zero,
    };
    let mut alternatives = Vec::new();
    // The cases cover everything and agree where they overlap: the comparison holds iff it holds in some case that applies.
    for Case { conditions, value } in evaluate(&difference, scope)? {
        let mut parts: Vec<Formula> = conditions.iter().map(|c| atom(c, Relation::NonNegative)).collect();
        parts.push(atom(&value, relation));
        alternatives.push(if parts.len() == 1 { parts.remove(0) } else { Formula::And(parts) });
    }
    Ok(if alternatives.len() == 1 { alternatives.remove(0) } else { Formula::Or(alternatives) })
}

fn atom(polynomial: &Polynomial, relation: Relation) -> Formula {
    Formula::Atom(Atom { polynomial: polynomial.expression(), relation })
}
