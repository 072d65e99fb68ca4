//! Zones with signs not fully known: three-valued evaluation of a formula in negation normal form.

use crate::certificate::Sign;
use crate::region::coordinates;
use crate::signs::SignSet;
use crate::statement::{Atom, Claim, Expression, Formula, Rational, Relation, Statement, Term};
use num_traits::{Signed, Zero};
use std::cmp::Ordering;

/// A formula whose atoms refer to traces by position.
#[derive(Clone, Debug, PartialEq, Eq)]
enum Shape {
    Atom(usize, Relation),
    And(Vec<Shape>),
    Or(Vec<Shape>),
}

/// A formula, and the distinct polynomials of its atoms in order of first appearance.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct IndexedFormula {
    shape: Shape,
    /// The polynomials.
    pub polynomials: Vec<Expression>,
}

impl IndexedFormula {
    /// Numbers the distinct polynomials of a formula.
    pub fn new(formula: &Formula) -> Self {
        let mut polynomials = Vec::new();
        let shape = number(formula, &mut polynomials);
        Self { shape, polynomials }
    }

    /// The formula that a statement's claim is about; for a set of starts, the states follow as further polynomials. `None`: see
    /// [`claimed_formula`].
    pub fn claimed(statement: &Statement) -> Option<Self> {
        let mut formula = Self::new(&claimed_formula(statement)?);
        if let Claim::Region(_) = statement.claim {
            formula.polynomials.extend(coordinates(statement));
        }
        Some(formula)
    }

    /// The truth of the formula where it follows from the possible signs alone; `None`: it does not.
    ///
    /// Lemma: in a formula without negation, a part whose truth is known to be true (false) whatever the undecided atoms are
    /// decides as in Kleene's strong three-valued logic; the value is right for each assignment of the undecided atoms.
    pub fn truth(&self, signs: &[SignSet]) -> Option<bool> {
        truth(&self.shape, signs)
    }
}

/// That some polynomials do not all have the signs that the zone asks for.
pub struct Conflict {
    /// The polynomials, and whether their sum needs them positive (else negative).
    pub parts: Vec<(usize, bool)>,
    /// Whether this is known only where one of them is to be different from 0.
    pub needs_strict: bool,
}

impl Conflict {
    /// Whether these atoms cannot hold together.
    fn forbids(&self, atoms: &[(usize, Relation)]) -> bool {
        let matching = |(index, positive): &(usize, bool)| {
            let fits = move |(i, relation): &&(usize, Relation)| {
                let positive_side = matches!(relation, Relation::Positive | Relation::NonNegative);
                let negative_side = matches!(relation, Relation::Negative | Relation::NonPositive);
                i == index && (*relation == Relation::Zero || (if *positive { positive_side } else { negative_side }))
            };
            atoms.iter().filter(fits).collect::<Vec<_>>()
        };
        let strict = |(_, relation): &&(usize, Relation)| matches!(relation, Relation::Positive | Relation::Negative);
        let found: Vec<_> = self.parts.iter().map(matching).collect();
        let complete = !found.is_empty() && found.iter().all(|list| !list.is_empty());
        complete && (!self.needs_strict || found.iter().flatten().any(strict))
    }
}

impl IndexedFormula {
    /// Whether conflicts show that the formula is false.
    ///
    /// Lemma: a conjunction is false if some atoms of it and of the conjunctions around it cannot hold together, or if one of its
    /// parts is false where they hold; a disjunction is false if each part is.
    pub fn is_refuted(&self, conflicts: &[Conflict]) -> bool {
        is_refuted(&self.shape, &mut Vec::new(), conflicts)
    }
}

fn is_refuted(shape: &Shape, known: &mut Vec<(usize, Relation)>, conflicts: &[Conflict]) -> bool {
    let before = known.len();
    let refuted = match shape {
        Shape::Atom(index, relation) => {
            known.push((*index, *relation));
            conflicts.iter().any(|c| c.forbids(known))
        }
        Shape::And(parts) => {
            let atom = |p: &Shape| if let Shape::Atom(index, relation) = p { Some((*index, *relation)) } else { None };
            known.extend(parts.iter().filter_map(atom));
            conflicts.iter().any(|c| c.forbids(known)) || parts.iter().any(|p| is_refuted(p, known, conflicts))
        }
        Shape::Or(parts) => parts.iter().all(|p| is_refuted(p, known, conflicts)),
    };
    known.truncate(before);
    refuted
}

fn number(formula: &Formula, polynomials: &mut Vec<Expression>) -> Shape {
    match formula {
        Formula::Atom(Atom { polynomial, relation }) => {
            let known = polynomials.iter().position(|p| p == polynomial);
            let index = known.unwrap_or_else(|| {
                polynomials.push(polynomial.clone());
                polynomials.len() - 1
            });
            Shape::Atom(index, *relation)
        }
        Formula::And(parts) => Shape::And(parts.iter().map(|p| number(p, polynomials)).collect()),
        Formula::Or(parts) => Shape::Or(parts.iter().map(|p| number(p, polynomials)).collect()),
    }
}

fn truth(shape: &Shape, signs: &[SignSet]) -> Option<bool> {
    match shape {
        Shape::Atom(index, relation) => {
            let mut truths = signs.get(*index)?.members().map(|sign| holds(*relation, sign));
            let first = truths.next()?;
            truths.all(|other| other == first).then_some(first)
        }
        Shape::And(parts) => combine(parts, signs, false),
        Shape::Or(parts) => combine(parts, signs, true),
    }
}

/// `decisive` if one part has that truth, its opposite if all parts have the opposite.
fn combine(parts: &[Shape], signs: &[SignSet], decisive: bool) -> Option<bool> {
    let mut all_known = true;
    for part in parts {
        match truth(part, signs) {
            Some(value) if value == decisive => return Some(decisive),
            Some(_) => {}
            None => all_known = false,
        }
    }
    all_known.then_some(!decisive)
}

/// Whether a number of this sign is in the relation to 0.
pub fn holds(relation: Relation, sign: Sign) -> bool {
    match relation {
        Relation::Negative => sign == Ordering::Less,
        Relation::NonPositive => sign != Ordering::Greater,
        Relation::Zero => sign == Ordering::Equal,
        Relation::NonNegative => sign != Ordering::Less,
        Relation::Positive => sign == Ordering::Greater,
        Relation::NonZero => sign != Ordering::Equal,
    }
}

/// The formula that a claim is about: the zone, or the zone widened by the claim's margin.
///
/// `None`: a margin > 0 on a zone that is not a single comparison with one of < <= = >= >. A widened zone contains the zone
/// (p >= 0 implies p >= -m, and so on), so that `never` of the widened zone implies `never` of the zone.
pub fn claimed_formula(statement: &Statement) -> Option<Formula> {
    let zone = &statement.zone.inside;
    let margin = match &statement.claim {
        Claim::Never { margin } if margin.is_positive() => margin,
        Claim::Never { .. }
        | Claim::Enters { .. }
        | Claim::Eventually { .. }
        | Claim::Inseparable
        | Claim::Region(_) => return Some(zone.clone()),
    };
    let Formula::Atom(Atom { polynomial, relation }) = zone else { return None };
    let above = Formula::Atom(Atom { polynomial: shifted(polynomial, margin), relation: Relation::NonNegative });
    let below = Formula::Atom(Atom { polynomial: shifted(polynomial, &-margin), relation: Relation::NonPositive });
    match relation {
        Relation::Positive | Relation::NonNegative => Some(above),
        Relation::Negative | Relation::NonPositive => Some(below),
        Relation::Zero => Some(Formula::And(vec![above, below])),
        Relation::NonZero => None,
    }
}

/// p + constant.
fn shifted(p: &Expression, constant: &Rational) -> Expression {
    let mut terms = p.terms.clone();
    match terms.iter_mut().find(|t| t.powers.is_empty()) {
        Some(term) => term.coefficient += constant,
        None => terms.push(Term { coefficient: constant.clone(), powers: Vec::new() }),
    }
    terms.retain(|t| !t.coefficient.is_zero());
    Expression { terms }
}
