//! The parts of a statement that make it one about many trajectories, as JSON.

use crate::error::Rejection;
use crate::field::Field;
use crate::json::{Value, object, text};
use crate::statement::{Disturbance, Range, Rational, Starts, State, Statement, Uncertain, UncertainTerm};
use crate::statement_text::{Names, declaration, entries, named};
use num_traits::{Signed, Zero};

/// The greatest power of an uncertain quantity, either way.
const MAX_POWER: i32 = 24;

fn read_range(field: &Field) -> Result<Range, Rejection> {
    let (from, to) = (field.get("from")?.rational()?, field.get("to")?.rational()?);
    if from <= to { Ok(Range { from, to }) } else { Err(field.refuse("from <= to")) }
}

/// A state's start as centre and radius.
pub(crate) fn read_start(field: &Field) -> Result<(Rational, Rational), Rejection> {
    if let Value::Object(_) = field.value() {
        field.only(&["from", "to"], "a range: from, to")?;
        let range = read_range(field)?;
        return Ok((range.centre(), range.radius()));
    }
    Ok((field.rational()?, Rational::zero()))
}

/// The admissible starts of states with these radii.
pub(crate) fn read_starts(statement: &Field, radii: Vec<Rational>) -> Result<Starts, Rejection> {
    let count = radii.len();
    let is_exact = radii.iter().all(Zero::is_zero);
    let Some(field) = statement.optional("starts") else {
        return Ok(if is_exact { Starts::One } else { Starts::Box(radii) });
    };
    if !is_exact {
        return Err(field.refuse("exact starts of all states, or no such key"));
    }
    let vectors = |key: &'static str| {
        let Some(list) = field.optional(key) else { return Ok(None) };
        field.only(&[key], "one key")?;
        let vector = |item: &Field| {
            let numbers = entries(item)?.iter().map(Field::rational).collect::<Result<Vec<_>, _>>()?;
            if numbers.len() == count { Ok(numbers) } else { Err(item.refuse("one number for each state")) }
        };
        let vectors = entries(&list)?.iter().map(vector).collect::<Result<Vec<_>, Rejection>>()?;
        if vectors.is_empty() { Err(list.refuse("at least one vector")) } else { Ok(Some(vectors)) }
    };
    if let Some(generators) = vectors("zonotope")? {
        return Ok(Starts::Zonotope(generators));
    }
    if let Some(points) = vectors("hull")? {
        return Ok(Starts::Hull(points));
    }
    let shape = vectors("ellipsoid")?.ok_or_else(|| field.refuse("starts: zonotope, ellipsoid or hull"))?;
    let entry = |i: usize, j: usize| shape.get(i).and_then(|row| row.get(j));
    let is_symmetric = (0..count).all(|i| (0..i).all(|j| entry(i, j) == entry(j, i)));
    if shape.len() != count || !is_symmetric {
        return Err(field.refuse("a symmetric matrix with a row for each state"));
    }
    Ok(Starts::Ellipsoid(shape))
}

pub(crate) fn read_disturbance(f: &Field, name: String, unit: Option<String>) -> Result<Disturbance, Rejection> {
    f.only(&["name", "unit", "from", "to"], "a disturbance: name, unit, from, to")?;
    Ok(Disturbance { name, unit, range: read_range(f)? })
}

pub(crate) fn read_uncertain(f: &Field, name: String, unit: Option<String>) -> Result<Uncertain, Rejection> {
    f.only(&["name", "unit", "from", "to", "varying"], "an uncertain quantity: name, unit, from, to, varying")?;
    Ok(Uncertain { name, unit, range: read_range(f)?, varying: f.get("varying")?.flag()? })
}

/// The uncertain terms of one state's rate.
pub(crate) fn read_uncertain_terms(
    list: &Field,
    state: usize,
    names: &Names,
    uncertain: &[Uncertain],
) -> Result<Vec<UncertainTerm>, Rejection> {
    let mut terms: Vec<UncertainTerm> = Vec::new();
    for item in entries(list)? {
        item.only(&["times", "powers", "of"], "an uncertain term: times, powers, of")?;
        let mut powers: Vec<(usize, i32)> = Vec::new();
        for factor in entries(&item.get("powers")?)? {
            factor.only(&["name", "power"], "a factor: name, power")?;
            let name = factor.get("name")?;
            let text = name.text()?;
            let position = uncertain.iter().position(|u| u.name == text);
            let position = position.ok_or_else(|| name.refuse("the name of an uncertain quantity"))?;
            let power = factor.get("power")?.integer_within(MAX_POWER)?;
            let has_zero =
                uncertain.get(position).is_none_or(|u| !u.range.from.is_positive() && !u.range.to.is_negative());
            let increasing = powers.last().is_none_or(|(last, _)| *last < position);
            if power == 0_i32 || (power < 0_i32 && has_zero) || !increasing {
                return Err(factor.refuse(
                    "powers other than 0 in the order of declaration, negative ones of ranges without 0 alone",
                ));
            }
            powers.push((position, power));
        }
        let of = item.optional("of").map(|f| named(&f, names)).transpose()?;
        let factor = item.get("times")?.rational()?;
        if factor.is_zero() || powers.is_empty() || terms.iter().any(|t| t.powers == powers && t.of == of) {
            return Err(item.refuse("a factor other than 0, an uncertain quantity, each product once"));
        }
        terms.push(UncertainTerm { state, factor, powers, of });
    }
    Ok(terms)
}

fn write_range(range: &Range) -> Vec<(&'static str, Value)> {
    vec![("from", text(&range.from)), ("to", text(&range.to))]
}

impl Statement {
    /// A state's start: a number or a range.
    pub(crate) fn write_start(&self, position: usize, state: &State) -> Value {
        let radius = match &self.starts {
            Starts::Box(radii) => radii.get(position).filter(|r| !r.is_zero()),
            Starts::One | Starts::Zonotope(_) | Starts::Ellipsoid(_) | Starts::Hull(_) => None,
        };
        radius.map_or_else(
            || text(&state.start),
            |r| object(write_range(&Range { from: &state.start - r, to: &state.start + r })),
        )
    }

    pub(crate) fn write_uncertain_term(&self, term: &UncertainTerm) -> Value {
        let power = |(position, power): &(usize, i32)| {
            let name = self.uncertain.get(*position).map_or("?", |u| &u.name);
            object(vec![("name", text(name)), ("power", text(power))])
        };
        let powers = Value::List(term.powers.iter().map(power).collect());
        let mut fields = vec![("times", text(&term.factor)), ("powers", powers)];
        fields.extend(term.of.map(|variable| ("of", text(self.name(variable)))));
        object(fields)
    }
}

/// Adds the parts that a statement about one trajectory does not have.
pub(crate) fn write_set(s: &Statement, fields: &mut Vec<(&'static str, Value)>) {
    let vectors = |rows: &[Vec<Rational>]| {
        Value::List(rows.iter().map(|row| Value::List(row.iter().map(text).collect())).collect())
    };
    match &s.starts {
        Starts::One | Starts::Box(_) => {}
        Starts::Zonotope(generators) => fields.push(("starts", object(vec![("zonotope", vectors(generators))]))),
        Starts::Ellipsoid(shape) => fields.push(("starts", object(vec![("ellipsoid", vectors(shape))]))),
        Starts::Hull(points) => fields.push(("starts", object(vec![("hull", vectors(points))]))),
    }
    let with_range = |name: &str, unit: Option<&String>, range: &Range, flag: Option<bool>| {
        let mut value = declaration(name, unit, "from", text(&range.from));
        if let Value::Object(fields) = &mut value {
            fields.push(("to".into(), text(&range.to)));
            fields.extend(flag.map(|flag| ("varying".into(), Value::Bool(flag))));
        }
        value
    };
    if !s.disturbances.is_empty() {
        let list = s.disturbances.iter().map(|d| with_range(&d.name, d.unit.as_ref(), &d.range, None));
        fields.push(("disturbances", Value::List(list.collect())));
    }
    if !s.uncertain.is_empty() {
        let list = s.uncertain.iter().map(|u| with_range(&u.name, u.unit.as_ref(), &u.range, Some(u.varying)));
        fields.push(("uncertain", Value::List(list.collect())));
    }
}
