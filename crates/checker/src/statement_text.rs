//! Statements as JSON: reading with all its refusals, and writing.

use crate::error::Rejection;
use crate::field::Field;
use crate::json::{Value, object, text};
use crate::limits::{Limits, within};
use crate::region_text::{read_region, write_region};
use crate::set_text::{read_disturbance, read_start, read_starts, read_uncertain, read_uncertain_terms, write_set};
use crate::statement::{
    Affine, Atom, Claim, Drive, Exponential, Expression, Formula, Output, Phase, Rational, Relation, SignalTerm, State,
    Statement, Term, Uncertain, Variable, Wave, Zone,
};
use num_traits::{Signed, Zero};

/// The `format` of a statement.
pub(crate) const STATEMENT_FORMAT: &str = "keepout-statement/1";

const RELATIONS: [(&str, Relation); 6] = [
    ("<", Relation::Negative),
    ("<=", Relation::NonPositive),
    ("=", Relation::Zero),
    (">=", Relation::NonNegative),
    (">", Relation::Positive),
    ("!=", Relation::NonZero),
];

impl Statement {
    /// Reads a statement from its JSON text.
    ///
    /// # Errors
    /// [`Rejection::Malformed`] with the place, or [`Rejection::LimitExceeded`].
    pub fn from_json(text: &str, limits: &Limits) -> Result<Self, Rejection> {
        read_statement(&Field::root(&crate::json::read(text, limits)?, limits))
    }

    /// The statement as a JSON value.
    pub fn to_json(&self) -> Value {
        write_statement(self)
    }
}

pub(crate) fn entries<'a>(field: &Field<'a>) -> Result<Vec<Field<'a>>, Rejection> {
    let list = field.list()?;
    within("statement_entries", list.len(), field.limits().statement_entries)?;
    Ok(list)
}

/// Names and what they stand for, in the order of declaration.
pub(crate) type Names = Vec<(String, Variable)>;

pub(crate) fn read_statement(field: &Field) -> Result<Statement, Rejection> {
    field.only(
        &[
            "format",
            "title",
            "states",
            "starts",
            "drives",
            "disturbances",
            "uncertain",
            "outputs",
            "exponentials",
            "phases",
            "zone",
            "claim",
        ],
        "a statement: format, title, states, starts, drives, disturbances, uncertain, outputs, exponentials, phases, zone, claim",
    )?;
    let format = field.get("format")?;
    if format.text()? != STATEMENT_FORMAT {
        return Err(format.refuse("\"keepout-statement/1\""));
    }
    let mut names: Names = Vec::new();
    let states = declared(&field.get("states")?, &mut names, Variable::State, |f, name, unit| {
        f.only(&["name", "unit", "start"], "a state: name, unit, start")?;
        let (start, radius) = read_start(&f.get("start")?)?;
        Ok((State { name, unit, start }, radius))
    })?;
    let (states, radii): (Vec<State>, Vec<Rational>) = states.into_iter().unzip();
    if states.is_empty() {
        return Err(field.get("states")?.refuse("at least one state"));
    }
    let starts = read_starts(field, radii)?;
    let drives = declared(&field.get("drives")?, &mut names, Variable::Drive, |f, name, unit| {
        f.only(&["name", "unit", "signal"], "a drive: name, unit, signal")?;
        Ok(Drive { name, unit, signal: entries(&f.get("signal")?)?.iter().map(read_signal).collect::<Result<_, _>>()? })
    })?;
    let disturbances = field.optional("disturbances");
    let disturbances = disturbances.map(|f| declared(&f, &mut names, Variable::Disturbance, read_disturbance));
    let disturbances = disturbances.transpose()?.unwrap_or_default();
    let affine_names = names.clone();
    // The kind of variable does not matter here: these names are for the uncertain terms alone.
    let mut uncertain_names = Names::new();
    let uncertain = field.optional("uncertain");
    let uncertain = uncertain.map(|f| declared(&f, &mut uncertain_names, Variable::State, read_uncertain));
    let uncertain = uncertain.transpose()?.unwrap_or_default();
    names.push(("t".into(), Variable::Time));
    let value_names = without_disturbances(&names);
    let outputs = declared(&field.get("outputs")?, &mut names, Variable::Output, |f, name, unit| {
        f.only(&["name", "unit", "value"], "an output: name, unit, value")?;
        Ok(Output { name, unit, value: read_expression(&f.get("value")?, &value_names)? })
    })?;
    let exponentials = field.optional("exponentials").map(|list| {
        declared(&list, &mut names, Variable::Exponential, |f, name, _| {
            f.only(&["name", "terms", "offset"], "an exponential: name, terms, offset")?;
            Ok(Exponential { name, argument: read_affine(f, &value_names)? })
        })
    });
    let exponentials = exponentials.transpose()?.unwrap_or_default();
    let phases = entries(&field.get("phases")?)?;
    if phases.len() != 1 {
        return Err(field.get("phases")?.refuse("exactly one phase"));
    }
    if uncertain_names.iter().any(|(name, _)| names.iter().any(|(other, _)| other == name)) {
        return Err(field.get("uncertain")?.refuse("names that nothing else has"));
    }
    let phase = |f: &Field| read_phase(f, &states, &affine_names, &uncertain);
    let phases = phases.iter().map(phase).collect::<Result<_, _>>()?;
    let title = field.get("title")?.text()?.to_string();
    let zone = read_zone(&field.get("zone")?, &without_disturbances(&names))?;
    let claim = read_claim(&field.get("claim")?)?;
    Ok(Statement { title, states, starts, drives, disturbances, uncertain, outputs, exponentials, phases, zone, claim })
}

/// The names that outputs and zones may use.
fn without_disturbances(names: &Names) -> Names {
    names.iter().filter(|(_, v)| !matches!(v, Variable::Disturbance(_))).cloned().collect()
}

/// Names with a meaning of their own in formulas.
const RESERVED: [&str; 12] = ["t", "exp", "sin", "cos", "abs", "sqrt", "pi", "and", "or", "not", "true", "false"];

fn is_name(text: &str) -> bool {
    let mut bytes = text.bytes();
    !RESERVED.contains(&text)
        && bytes.next().is_some_and(|b| b.is_ascii_alphabetic() || b == b'_')
        && bytes.all(|b| b.is_ascii_alphanumeric() || b == b'_')
}

fn declared<'a, T>(
    field: &Field<'a>,
    names: &mut Names,
    variable: fn(usize) -> Variable,
    read: impl Fn(&Field<'a>, String, Option<String>) -> Result<T, Rejection>,
) -> Result<Vec<T>, Rejection> {
    let mut items = Vec::new();
    for (i, item) in entries(field)?.iter().enumerate() {
        let name = item.get("name")?;
        let text = name.text()?;
        if !is_name(text) || names.iter().any(|(known, _)| known == text) {
            return Err(name.refuse("a new name, not reserved: a letter or _, then letters, digits or _"));
        }
        let unit = item.optional("unit").map(|u| u.text().map(str::to_string)).transpose()?;
        items.push(read(item, text.to_string(), unit)?);
        names.push((text.to_string(), variable(i)));
    }
    Ok(items)
}

pub(crate) fn named(field: &Field, names: &Names) -> Result<Variable, Rejection> {
    let text = field.text()?;
    let found = names.iter().find(|(name, _)| name == text);
    found.map(|(_, variable)| *variable).ok_or_else(|| field.refuse("the name of a quantity allowed here"))
}

fn read_signal(field: &Field) -> Result<SignalTerm, Rejection> {
    field.only(&["times", "power", "rate", "cos", "sin"], "a signal term: times, power, rate, and cos or sin")?;
    let frequency = |f: Field| {
        let w = f.rational()?;
        if w.is_positive() { Ok(w) } else { Err(f.refuse("an angular frequency > 0")) }
    };
    let wave = match (field.optional("cos"), field.optional("sin")) {
        (None, None) => Wave::One,
        (Some(w), None) => Wave::Cosine(frequency(w)?),
        (None, Some(w)) => Wave::Sine(frequency(w)?),
        (Some(_), Some(_)) => return Err(field.refuse("cos or sin, not both")),
    };
    let power = field.get("power")?.count_within("degree", field.limits().degree)?;
    let (coefficient, rate) = (field.get("times")?.rational()?, field.get("rate")?.rational()?);
    Ok(SignalTerm { coefficient, power, rate, wave })
}

fn read_phase(field: &Field, states: &[State], names: &Names, uncertain: &[Uncertain]) -> Result<Phase, Rejection> {
    field.only(&["rates"], "a phase: rates")?;
    let list = entries(&field.get("rates")?)?;
    if list.len() != states.len() {
        return Err(field.get("rates")?.refuse("one rate for each state"));
    }
    let mut rates = Vec::new();
    let mut terms = Vec::new();
    for (position, (item, state)) in list.iter().zip(states).enumerate() {
        item.only(&["of", "terms", "offset", "uncertain"], "a rate: of, terms, offset, uncertain")?;
        if item.get("of")?.text()? != state.name {
            return Err(item.get("of")?.refuse("the states' names in order"));
        }
        rates.push(read_affine(item, names)?);
        if let Some(list) = item.optional("uncertain") {
            terms.extend(read_uncertain_terms(&list, position, names, uncertain)?);
        }
    }
    Ok(Phase { rates, uncertain: terms })
}

fn read_affine(field: &Field, names: &Names) -> Result<Affine, Rejection> {
    let mut terms: Vec<(Rational, Variable)> = Vec::new();
    let mut seen = std::collections::BTreeSet::new();
    for item in entries(&field.get("terms")?)? {
        item.only(&["times", "of"], "a term: times, of")?;
        let (factor, variable) = (item.get("times")?.rational()?, named(&item.get("of")?, names)?);
        if factor.is_zero() || !seen.insert(variable) {
            return Err(item.refuse("a factor other than 0, each name once"));
        }
        terms.push((factor, variable));
    }
    Ok(Affine { terms, offset: field.get("offset")?.rational()? })
}

fn read_expression(field: &Field, names: &Names) -> Result<Expression, Rejection> {
    let mut terms: Vec<Term> = Vec::new();
    let mut seen = std::collections::BTreeSet::new();
    for item in entries(field)? {
        item.only(&["times", "of"], "a term: times, of")?;
        let mut powers = Vec::new();
        for factor in entries(&item.get("of")?)? {
            let (variable, exponent) = match factor.value() {
                Value::Text(_) => (named(&factor, names)?, 1),
                Value::Bool(_) | Value::List(_) | Value::Object(_) => {
                    factor.only(&["name", "power"], "a name, or an object: name, power")?;
                    (named(&factor.get("name")?, names)?, factor.get("power")?.count()?)
                }
            };
            let increasing = powers.last().is_none_or(|(last, _)| *last < variable);
            if exponent == 0 || !increasing {
                return Err(factor
                    .refuse("powers >= 1 of states, drives, outputs, t, exponentials in the order of declaration"));
            }
            within("degree", usize::try_from(exponent).unwrap_or(usize::MAX), field.limits().degree)?;
            powers.push((variable, exponent));
        }
        let coefficient = item.get("times")?.rational()?;
        if coefficient.is_zero() || !seen.insert(powers.clone()) {
            return Err(item.refuse("a factor other than 0, each product once"));
        }
        terms.push(Term { coefficient, powers });
    }
    Ok(Expression { terms })
}

fn read_formula(field: &Field, names: &Names) -> Result<Formula, Rejection> {
    if let Some(parts) = field.optional("all") {
        field.only(&["all"], "one key")?;
        return Ok(Formula::And(entries(&parts)?.iter().map(|f| read_formula(f, names)).collect::<Result<_, _>>()?));
    }
    if let Some(parts) = field.optional("any") {
        field.only(&["any"], "one key")?;
        return Ok(Formula::Or(entries(&parts)?.iter().map(|f| read_formula(f, names)).collect::<Result<_, _>>()?));
    }
    field.only(&["polynomial", "is"], "all, any, or a comparison: polynomial, is")?;
    let is = field.get("is")?;
    let symbol = is.text()?.strip_suffix(" 0");
    let relation = RELATIONS.iter().find(|(name, _)| Some(*name) == symbol).map(|(_, r)| *r);
    let relation = relation.ok_or_else(|| is.refuse("\"< 0\", \"<= 0\", \"= 0\", \">= 0\", \"> 0\" or \"!= 0\""))?;
    Ok(Formula::Atom(Atom { polynomial: read_expression(&field.get("polynomial")?, names)?, relation }))
}

fn read_zone(field: &Field, names: &Names) -> Result<Zone, Rejection> {
    field.only(&["name", "ref", "inside", "from", "until"], "a zone: name, ref, inside, from, until")?;
    let from = field.get("from")?.rational()?;
    let until = field.optional("until").map(|u| u.rational()).transpose()?;
    if from.is_negative() || until.as_ref().is_some_and(|u| *u < from) {
        return Err(field.refuse("0 <= from <= until"));
    }
    let reference = field.optional("ref").map(|r| r.text().map(str::to_string)).transpose()?;
    let (name, inside) = (field.get("name")?.text()?.to_string(), read_formula(&field.get("inside")?, names)?);
    Ok(Zone { name, reference, inside, from, until })
}

fn read_claim(field: &Field) -> Result<Claim, Rejection> {
    if let Some(never) = field.optional("never") {
        field.only(&["never"], "one key")?;
        never.only(&["margin"], "never: margin")?;
        let margin = never.get("margin")?.rational()?;
        return if margin.is_negative() { Err(never.refuse("a margin >= 0")) } else { Ok(Claim::Never { margin }) };
    }
    if let Some(eventually) = field.optional("eventually") {
        field.only(&["eventually"], "one key")?;
        eventually.only(&["from"], "eventually: from")?;
        let from = eventually.get("from")?.rational()?;
        return if from.is_negative() { Err(eventually.refuse("from >= 0")) } else { Ok(Claim::Eventually { from }) };
    }
    if let Some(inseparable) = field.optional("inseparable") {
        field.only(&["inseparable"], "one key")?;
        inseparable.only(&[], "inseparable: no key")?;
        return Ok(Claim::Inseparable);
    }
    if let Some(region) = field.optional("region") {
        field.only(&["region"], "one key")?;
        return Ok(Claim::Region(Box::new(read_region(&region)?)));
    }
    field.only(&["enters"], "a claim: never, enters, eventually, inseparable or region")?;
    let enters = field.get("enters")?;
    enters.only(&["from", "to", "first"], "enters: from, to, first")?;
    let (from, to) = (enters.get("from")?.rational()?, enters.get("to")?.rational()?);
    if from.is_negative() || to < from {
        return Err(enters.refuse("0 <= from <= to"));
    }
    Ok(Claim::Enters { from, to, first: enters.get("first")?.flag()? })
}

pub(crate) fn declaration(name: &str, unit: Option<&String>, key: &'static str, value: Value) -> Value {
    let mut fields = vec![("name", text(name))];
    fields.extend(unit.map(|u| ("unit", text(u))));
    fields.push((key, value));
    object(fields)
}

impl Statement {
    /// The name that the statement gives to a variable; `?` for a position that it does not have.
    pub fn name(&self, variable: Variable) -> &str {
        match variable {
            Variable::State(i) => self.states.get(i).map_or("?", |s| &s.name),
            Variable::Drive(i) => self.drives.get(i).map_or("?", |d| &d.name),
            Variable::Output(i) => self.outputs.get(i).map_or("?", |o| &o.name),
            Variable::Time => "t",
            Variable::Exponential(i) => self.exponentials.get(i).map_or("?", |e| &e.name),
            Variable::Disturbance(i) => self.disturbances.get(i).map_or("?", |d| &d.name),
        }
    }

    fn write_expression(&self, expression: &Expression) -> Value {
        let factor = |(variable, power): &(Variable, u32)| match power {
            1 => text(self.name(*variable)),
            _ => object(vec![("name", text(self.name(*variable))), ("power", text(power))]),
        };
        let term = |t: &Term| {
            let of = Value::List(t.powers.iter().map(factor).collect());
            object(vec![("times", text(&t.coefficient)), ("of", of)])
        };
        Value::List(expression.terms.iter().map(term).collect())
    }

    fn write_formula(&self, formula: &Formula) -> Value {
        let list = |parts: &[Formula]| Value::List(parts.iter().map(|p| self.write_formula(p)).collect());
        match formula {
            Formula::And(parts) => object(vec![("all", list(parts))]),
            Formula::Or(parts) => object(vec![("any", list(parts))]),
            Formula::Atom(Atom { polynomial, relation }) => {
                let is = RELATIONS.iter().find(|(_, r)| r == relation).map_or("?", |(name, _)| name);
                object(vec![("polynomial", self.write_expression(polynomial)), ("is", text(format!("{is} 0")))])
            }
        }
    }

    fn write_affine(&self, key: &'static str, name: &str, affine: &Affine) -> Value {
        let term = |(factor, variable): &(Rational, Variable)| {
            object(vec![("times", text(factor)), ("of", text(self.name(*variable)))])
        };
        let terms = Value::List(affine.terms.iter().map(term).collect());
        object(vec![(key, text(name)), ("terms", terms), ("offset", text(&affine.offset))])
    }

    fn write_phase(&self, phase: &Phase) -> Value {
        let rate = |(position, (rate, state)): (usize, (&Affine, &State))| {
            let mut value = self.write_affine("of", &state.name, rate);
            let terms: Vec<_> = phase.uncertain.iter().filter(|t| t.state == position).collect();
            if let (Value::Object(fields), false) = (&mut value, terms.is_empty()) {
                let list = terms.iter().map(|t| self.write_uncertain_term(t)).collect();
                fields.push(("uncertain".into(), Value::List(list)));
            }
            value
        };
        let rates = phase.rates.iter().zip(&self.states).enumerate().map(rate);
        object(vec![("rates", Value::List(rates.collect()))])
    }
}

fn write_signal(term: &SignalTerm) -> Value {
    let mut fields = vec![("times", text(&term.coefficient)), ("power", text(term.power)), ("rate", text(&term.rate))];
    match &term.wave {
        Wave::One => {}
        Wave::Cosine(w) => fields.push(("cos", text(w))),
        Wave::Sine(w) => fields.push(("sin", text(w))),
    }
    object(fields)
}

fn write_statement(s: &Statement) -> Value {
    let state = |(i, x): (usize, &State)| declaration(&x.name, x.unit.as_ref(), "start", s.write_start(i, x));
    let states = s.states.iter().enumerate().map(state);
    let drives = s.drives.iter().map(|d| {
        let signal = Value::List(d.signal.iter().map(write_signal).collect());
        declaration(&d.name, d.unit.as_ref(), "signal", signal)
    });
    let outputs =
        s.outputs.iter().map(|o| declaration(&o.name, o.unit.as_ref(), "value", s.write_expression(&o.value)));
    let mut zone = vec![("name", text(&s.zone.name))];
    zone.extend(s.zone.reference.as_ref().map(|r| ("ref", text(r))));
    zone.push(("inside", s.write_formula(&s.zone.inside)));
    zone.push(("from", text(&s.zone.from)));
    zone.extend(s.zone.until.as_ref().map(|u| ("until", text(u))));
    let claim = match &s.claim {
        Claim::Never { margin } => object(vec![("never", object(vec![("margin", text(margin))]))]),
        Claim::Enters { from, to, first } => object(vec![(
            "enters",
            object(vec![("from", text(from)), ("to", text(to)), ("first", Value::Bool(*first))]),
        )]),
        Claim::Eventually { from } => object(vec![("eventually", object(vec![("from", text(from))]))]),
        Claim::Inseparable => object(vec![("inseparable", object(Vec::new()))]),
        Claim::Region(region) => object(vec![("region", write_region(region))]),
    };
    let mut fields = vec![
        ("format", text(STATEMENT_FORMAT)),
        ("title", text(&s.title)),
        ("states", Value::List(states.collect())),
        ("drives", Value::List(drives.collect())),
        ("outputs", Value::List(outputs.collect())),
        ("phases", Value::List(s.phases.iter().map(|p| s.write_phase(p)).collect())),
        ("zone", object(zone)),
        ("claim", claim),
    ];
    if !s.exponentials.is_empty() {
        let list = s.exponentials.iter().map(|e| s.write_affine("name", &e.name, &e.argument));
        fields.insert(5, ("exponentials", Value::List(list.collect())));
    }
    write_set(s, &mut fields);
    object(fields)
}
