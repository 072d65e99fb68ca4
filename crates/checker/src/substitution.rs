//! One piece of what is admissible: a plain statement with exact coefficients, and what the uncertain terms may add to it.
//!
//! Lemma: let v = prod p^k be the value of a group's product of powers and v0 its value in the centre. The true rate is the rate of
//! the plain statement plus the sum over the groups of (v - v0) g, g the group's affine form along the true trajectory.

use crate::many::Ranges;
use crate::statement::{Expression, Range, Rational, Starts, Statement, Term, UncertainTerm, Variable};
use num_traits::{One, Signed, Zero};

/// Uncertain terms of one state's rate with the same product of powers.
#[derive(Clone, Debug)]
pub struct Group {
    /// The state.
    pub state: usize,
    /// The greatest distance of the product from its value in the centre.
    pub deviation: Rational,
    /// The affine form that the product multiplies.
    pub form: Expression,
}

impl Group {
    /// The form's value where it is a constant.
    pub fn constant(&self) -> Option<Rational> {
        let plain = self.form.terms.iter().all(|t| t.powers.is_empty());
        plain.then(|| self.form.terms.iter().map(|t| t.coefficient.clone()).sum())
    }
}

/// The whole of what is admissible, axis by axis: see [`Ranges`].
pub fn whole(statement: &Statement) -> Ranges {
    let mut ranges: Ranges = statement.uncertain.iter().map(|u| u.range.clone()).collect();
    if let Starts::Box(radii) = &statement.starts {
        let axes = statement.states.iter().zip(radii);
        ranges.extend(axes.map(|(s, r)| Range { from: &s.start - r, to: &s.start + r }));
    }
    ranges
}

/// The plain statement of a piece, and its groups, those without deviation left out.
pub fn substituted(statement: &Statement, ranges: &[Range]) -> Option<(Statement, Vec<Group>)> {
    let mut plain = statement.clone();
    let count = statement.uncertain.len();
    plain.uncertain.clear();
    if let Starts::Box(_) = statement.starts {
        let axes = ranges.get(count..)?;
        plain.states.iter_mut().zip(axes).for_each(|(state, range)| state.start = range.centre());
        plain.starts = Starts::Box(axes.iter().map(Range::radius).collect());
    }
    let phase = plain.phases.first_mut()?;
    let terms = std::mem::take(&mut phase.uncertain);
    let mut groups: Vec<(UncertainTerm, Group)> = Vec::new();
    for term in terms {
        let (centre, deviation) = product(&term.powers, ranges)?;
        let rate = phase.rates.get_mut(term.state)?;
        let known = &term.factor * &centre;
        match term.of {
            None => rate.offset += known,
            Some(of) => match rate.terms.iter_mut().find(|(_, v)| *v == of) {
                Some((factor, _)) => *factor += known,
                None => rate.terms.push((known, of)),
            },
        }
        rate.terms.retain(|(factor, _)| !factor.is_zero());
        let powers = term.of.map(|v| (v, 1)).into_iter().collect();
        let part = Term { coefficient: term.factor.clone(), powers };
        match groups.iter_mut().find(|(first, _)| first.state == term.state && first.powers == term.powers) {
            Some((_, group)) => group.form.terms.push(part),
            None => {
                let group = Group { state: term.state, deviation, form: Expression { terms: vec![part] } };
                groups.push((term, group));
            }
        }
    }
    let groups = groups.into_iter().map(|(_, group)| group).filter(|g| !g.deviation.is_zero()).collect();
    Some((plain, groups))
}

/// The product of powers in the centres of the ranges, and how far from that it can be.
fn product(powers: &[(usize, i32)], ranges: &[Range]) -> Option<(Rational, Rational)> {
    let mut centre = Rational::one();
    let mut all = Range { from: Rational::one(), to: Rational::one() };
    for (position, power) in powers {
        let range = ranges.get(*position)?;
        centre *= raised(&range.centre(), *power)?;
        all = times(&all, &power_of(range, *power)?);
    }
    let deviation = (&all.to - &centre).abs().max((&centre - &all.from).abs());
    Some((centre, deviation))
}

fn raised(x: &Rational, power: i32) -> Option<Rational> {
    if power < 0_i32 && x.is_zero() {
        return None;
    }
    let exponent = power.unsigned_abs();
    let value = (0..exponent).fold(Rational::one(), |y, _| y * x);
    Some(if power < 0_i32 { value.recip() } else { value })
}

/// The hull of the powers of the members: they are monotone on each side of 0.
fn power_of(range: &Range, power: i32) -> Option<Range> {
    if power < 0_i32 && !range.from.is_positive() && !range.to.is_negative() {
        return None;
    }
    let (a, b) = (raised(&range.from, power)?, raised(&range.to, power)?);
    let mut hull = Range { from: a.clone().min(b.clone()), to: a.max(b) };
    if range.from.is_negative() && range.to.is_positive() {
        hull.from = hull.from.min(Rational::zero());
        hull.to = hull.to.max(Rational::zero());
    }
    Some(hull)
}

fn times(a: &Range, b: &Range) -> Range {
    let ends = [&a.from * &b.from, &a.from * &b.to, &a.to * &b.from, &a.to * &b.to];
    let [first, rest @ ..] = ends;
    let start = Range { from: first.clone(), to: first };
    rest.into_iter().fold(start, |hull, x| Range { from: hull.from.min(x.clone()), to: hull.to.max(x) })
}

/// The column of a variable in the rates of the (first) phase.
pub fn column(statement: &Statement, variable: Variable) -> Vec<(usize, Rational)> {
    let rates = statement.phases.first().map_or(&[][..], |p| p.rates.as_slice());
    let entry = |(i, rate): (usize, &crate::statement::Affine)| {
        rate.terms.iter().find(|(_, v)| *v == variable).map(|(factor, _)| (i, factor.clone()))
    };
    rates.iter().enumerate().filter_map(entry).collect()
}
