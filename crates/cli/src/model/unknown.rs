//! What is known only to lie in a range: disturbances and uncertain constants, and rates that use them.

use super::scope::{Kind, NameScope, Names, Place};
use super::section::Entry;
use super::table::{Item, Refusals};
use crate::diagnostic::Diagnostic;
use crate::expression::{Node, NodeKind, Polynomial, Scope, parse, polynomial};
use keepout_checker::statement::{Affine, Disturbance, Range, Uncertain, UncertainTerm, Variable};
use num_rational::BigRational;
use num_traits::{One, Signed, Zero};
use std::collections::BTreeMap;

/// The variable that stands for an uncertain constant within the polynomial of a rate, or for its reciprocal. It is one that
/// rates do not have: exponentials are for zones.
pub(super) fn factor(position: usize, is_reciprocal: bool) -> Variable {
    Variable::Exponential(2 * position + usize::from(is_reciprocal))
}

/// The uncertain constant that a variable within the polynomial of a rate stands for, and the sign of its exponent.
fn uncertain_factor(variable: Variable) -> Option<(usize, i32)> {
    match variable {
        Variable::Exponential(k) => Some((k / 2, if k % 2 == 0 { 1 } else { -1 })),
        Variable::State(_) | Variable::Drive(_) | Variable::Output(_) | Variable::Time | Variable::Disturbance(_) => {
            None
        }
    }
}

/// Reads the disturbances.
pub(super) fn disturbances(entries: &[Entry], names: &Names, refusals: &Refusals) -> Vec<Disturbance> {
    let read = |entry: &Entry| Disturbance {
        name: entry.name.clone(),
        unit: entry.unit(refusals),
        range: range(entry, names, refusals).unwrap_or_else(zero),
    };
    entries.iter().map(read).collect()
}

/// Reads the uncertain constants; their ranges are known by name afterwards.
pub(super) fn uncertain(entries: &[Entry], names: &mut Names, refusals: &Refusals) -> Vec<Uncertain> {
    let mut list = Vec::new();
    for (i, entry) in entries.iter().enumerate() {
        let range = range(entry, names, refusals);
        if matches!(names.get(&entry.name), Some((_, Kind::Uncertain(..), _))) {
            names.set(&entry.name, Kind::Uncertain(i, range.clone()));
        }
        list.push(Uncertain {
            name: entry.name.clone(),
            unit: entry.unit(refusals),
            range: range.unwrap_or_else(zero),
            varying: entry.get("varying").is_some_and(|item| refusals.flag(item)),
        });
    }
    list
}

fn range(entry: &Entry, names: &Names, refusals: &Refusals) -> Option<Range> {
    let (from, to) = refusals.range(entry.required("range", "[lo, hi]", refusals)?, names)?;
    Some(Range { from, to })
}

fn zero() -> Range {
    Range { from: BigRational::zero(), to: BigRational::zero() }
}

/// The reciprocal of a product of uncertain constants; else why there is none, and what to do.
pub(super) fn reciprocal(divisor: &Polynomial, names: &Names) -> Result<Polynomial, (String, String)> {
    if degree(divisor) > 0 {
        return Err((
            "a divisor is a product of constants and uncertain constants".into(),
            "a rate is affine in states, drives and disturbances: linearise about the operating point".into(),
        ));
    }
    let mut terms = divisor.terms();
    let (Some((powers, coefficient)), None) = (terms.next(), terms.next()) else {
        return Err((
            "a divisor with uncertain constants is a product of constants and powers of them, not a sum".into(),
            "declare the sum as an uncertain constant of its own, [uncertain.NAME] with its range, and divide by it"
                .into(),
        ));
    };
    let mut product = Polynomial::constant(coefficient.recip());
    for (position, sign, power) in powers.iter().filter_map(|(v, k)| uncertain_factor(*v).map(|(i, s)| (i, s, *k))) {
        if sign > 0
            && let Some((name, range)) = names.uncertain(position)
            && has_zero(range)
        {
            return Err((
                format!("`{name}` may be 0: its range is from {} to {}", range.from, range.to),
                "narrow the range, so that 0 is not in it".into(),
            ));
        }
        let inverse = Polynomial::variable(factor(position, sign > 0));
        (0..power).for_each(|_| product = product.mul(&inverse));
    }
    Ok(product)
}

fn has_zero(range: &Range) -> bool {
    !range.from.is_positive() && !range.to.is_negative()
}

/// Whether a polynomial of a rate has uncertain constants in it.
pub(super) fn is_uncertain(value: &Polynomial) -> bool {
    value.terms().flat_map(|(powers, _)| powers).any(|(variable, _)| uncertain_factor(*variable).is_some())
}

/// The degree in what varies: uncertain constants do not count.
fn degree(value: &Polynomial) -> u32 {
    value.weighted_degree(&|variable| u32::from(uncertain_factor(variable).is_none()))
}

/// A state's rate: affine in states, drives and disturbances.
pub(super) fn rate(node: &Node, state: usize, scope: &NameScope) -> Result<(Affine, Vec<UncertainTerm>), Diagnostic> {
    let value = polynomial(node, scope)?;
    if degree(&value) > 1 {
        let culprit = nonlinear(node, scope).unwrap_or(node);
        let message = "a rate is affine in states, drives and disturbances: this product is not";
        return Err(Diagnostic::new(culprit.span.clone(), message)
            .help("linearise about the operating point, or make one of the factors a constant"));
    }
    Ok(split(&value, state))
}

/// The smallest part of an expression that has a degree above 1.
fn nonlinear<'n>(node: &'n Node, scope: &dyn Scope) -> Option<&'n Node> {
    if !polynomial(node, scope).is_ok_and(|p| degree(&p) > 1) {
        return None;
    }
    let inner = match &node.kind {
        NodeKind::Power(..) => None,
        _ => node.children().into_iter().find_map(|child| nonlinear(child, scope)),
    };
    Some(inner.unwrap_or(node))
}

/// Powers of uncertain constants, and what they are factors of.
type Product = (Vec<(usize, i32)>, Option<Variable>);

/// The known and the uncertain terms of a polynomial of degree 1; powers of an uncertain constant and of its reciprocal are
/// one power.
fn split(value: &Polynomial, state: usize) -> (Affine, Vec<UncertainTerm>) {
    let mut products: BTreeMap<Product, BigRational> = BTreeMap::new();
    for (powers, coefficient) in value.terms() {
        let mut exponents: BTreeMap<usize, i32> = BTreeMap::new();
        let mut of = None;
        for (variable, power) in powers {
            match uncertain_factor(*variable) {
                // The degree of an expression is limited far below the greatest i32.
                Some((position, sign)) => *exponents.entry(position).or_insert(0) += sign * power.cast_signed(),
                None => of = Some(*variable),
            }
        }
        exponents.retain(|_, exponent| *exponent != 0);
        *products.entry((exponents.into_iter().collect(), of)).or_insert_with(BigRational::zero) += coefficient;
    }
    let (mut affine, mut uncertain) = (Affine::default(), Vec::new());
    for ((powers, of), factor) in products.into_iter().filter(|(_, factor)| !factor.is_zero()) {
        match (powers.is_empty(), of) {
            (false, of) => uncertain.push(UncertainTerm { state, factor, powers, of }),
            (true, Some(variable)) => affine.terms.push((factor, variable)),
            (true, None) => affine.offset = factor,
        }
    }
    (affine, uncertain)
}

/// An entry of a matrix: a number, or a text with uncertain constants in it.
pub(super) enum Entered {
    Exact(BigRational),
    Uncertain(Polynomial),
}

impl Entered {
    pub(super) fn read(item: Item, names: &Names, refusals: &Refusals) -> Option<Self> {
        let Some(text) = item.get_ref().as_str() else { return refusals.number(item, names).map(Self::Exact) };
        let scope = NameScope { names, place: Place::Entry };
        let value = parse(text).and_then(|node| polynomial(&node, &scope));
        let value = refusals.keep(value.map_err(|d| refusals.inside(item, d)))?;
        Some(value.as_constant().map_or_else(|| Self::Uncertain(value), Self::Exact))
    }

    /// Adds entry * variable (the number 1 for `None`) to a rate.
    pub(super) fn add(
        self,
        variable: Option<Variable>,
        state: usize,
        rate: &mut Affine,
        terms: &mut Vec<UncertainTerm>,
    ) {
        let value = match self {
            Self::Exact(value) => Polynomial::constant(value),
            Self::Uncertain(value) => value,
        };
        let one = Polynomial::constant(BigRational::one());
        let (affine, uncertain) = split(&value.mul(&variable.map_or(one, Polynomial::variable)), state);
        rate.terms.extend(affine.terms);
        rate.offset += affine.offset;
        terms.extend(uncertain);
    }
}
