//! Sets of starts and the evidence for them as JSON, and sets of starts in plain words.

use crate::certificate_text::{Counts, bounded, list, read_integer, read_nodes, write_node};
use crate::decimal::fraction_and_decimal;
use crate::error::Rejection;
use crate::field::Field;
use crate::json::{Value, object, text};
use crate::number::Rational;
use crate::region::{Exponent, NamedRoot, Rate, Reason, Region, RegionLead, RegionProof, Step};
use crate::statement::{Statement, Variable};
use num_traits::{One, Zero};

/// At most so many entries as there may be roots.
fn few<'a, T>(
    field: &Field<'a>,
    key: &'static str,
    read: impl Fn(&Field<'a>) -> Result<T, Rejection>,
) -> Result<Vec<T>, Rejection> {
    bounded(&field.get(key)?, "roots", field.limits().roots + 1)?.each(read)
}

/// At most so many entries as there may be base angles.
fn dimensional<'a, T>(
    field: &Field<'a>,
    key: &'static str,
    read: impl Fn(&Field<'a>) -> Result<T, Rejection>,
) -> Result<Vec<T>, Rejection> {
    bounded(&field.get(key)?, "dimension", field.limits().dimension)?.each(read)
}

pub(crate) fn read_region(field: &Field) -> Result<Region, Rejection> {
    field.only(
        &["from", "scale", "start", "power", "roots", "rates", "base", "exponents"],
        "a set of starts: from, scale, start, power, roots, rates, base, exponents",
    )?;
    let roots = few(field, "roots", |f| {
        f.only(&["polynomial", "re", "im"], "a root: polynomial, re, im")?;
        let pair = |f: Field| match f.each(Field::rational)?.as_slice() {
            [lo, hi] => Ok((lo.clone(), hi.clone())),
            _ => Err(f.refuse("two numbers")),
        };
        Ok(NamedRoot {
            polynomial: few(f, "polynomial", Field::rational)?,
            re: pair(f.get("re")?)?,
            im: pair(f.get("im")?)?,
        })
    })?;
    let root = |f: &Field| f.position(roots.len());
    let rates = few(field, "rates", |f| {
        f.only(&["root", "lo", "hi"], "a rate: root, lo, hi")?;
        Ok(Rate { root: root(&f.get("root")?)?, lo: f.get("lo")?.rational()?, hi: f.get("hi")?.rational()? })
    })?;
    let base = dimensional(field, "base", root)?;
    let exponents = few(field, "exponents", |f| {
        f.only(&["root", "growth", "turns"], "an exponent: root, growth, turns")?;
        let (growth, turns) = (few(f, "growth", Field::rational)?, dimensional(f, "turns", read_integer)?);
        if growth.len() != rates.len() + 1 || turns.len() != base.len() {
            return Err(f.refuse("one power for y and for each rate, one multiple for each base angle"));
        }
        Ok(Exponent { root: root(&f.get("root")?)?, growth, turns })
    })?;
    let number = |key| field.get(key)?.rational();
    let power = field.optional("power").map(|f| f.rational()).transpose()?;
    let (from, scale, start) = (number("from")?, number("scale")?, number("start")?);
    Ok(Region { from, scale, start, power, rates, base, exponents, roots })
}

pub(crate) fn write_region(region: &Region) -> Value {
    let pair = |(lo, hi): &(Rational, Rational)| Value::List(vec![text(lo), text(hi)]);
    let root = |r: &NamedRoot| {
        object(vec![("polynomial", list(&r.polynomial, |x| text(x))), ("re", pair(&r.re)), ("im", pair(&r.im))])
    };
    let rate = |r: &Rate| object(vec![("root", text(r.root)), ("lo", text(&r.lo)), ("hi", text(&r.hi))]);
    let exponent = |e: &Exponent| {
        object(vec![
            ("root", text(e.root)),
            ("growth", list(&e.growth, |x| text(x))),
            ("turns", list(&e.turns, |n| text(n))),
        ])
    };
    let mut fields = vec![("from", text(&region.from)), ("scale", text(&region.scale)), ("start", text(&region.start))];
    fields.extend(region.power.as_ref().map(|power| ("power", text(power))));
    fields.extend([
        ("roots", list(&region.roots, root)),
        ("rates", list(&region.rates, rate)),
        ("base", list(&region.base, |b| text(b))),
        ("exponents", list(&region.exponents, exponent)),
    ]);
    object(fields)
}

pub(crate) fn read_proof(field: &Field, counts: &Counts) -> Result<RegionProof, Rejection> {
    field.only(
        &["roots", "log_start", "growths", "angles", "leads", "nodes"],
        "evidence for a set of starts: roots, log_start, growths, angles, leads, nodes",
    )?;
    let steps = |key| few(field, key, |f| read_step(f, counts));
    let leads = bounded(&field.get("leads")?, "statement_entries", field.limits().statement_entries)?.each(|f| {
        f.only(&["function", "growth", "power"], "a lead: function, growth, power")?;
        let power = f.get("power")?.count_within("roots", f.limits().roots)?;
        let function = f.get("function")?.position(counts.functions)?;
        Ok(RegionLead { function, growth: few(f, "growth", Field::rational)?, power })
    })?;
    let dimension = usize::try_from(field.limits().dimension).unwrap_or(usize::MAX);
    let nodes = read_nodes(&field.get("nodes")?, dimension, counts)?;
    Ok(RegionProof {
        roots: few(field, "roots", |f| f.position(counts.roots))?,
        log_start: field.get("log_start")?.rational()?,
        growths: steps("growths")?,
        angles: steps("angles")?,
        leads,
        nodes,
    })
}

fn read_step(field: &Field, counts: &Counts) -> Result<Step, Rejection> {
    field.only(&["root", "row", "line", "sum"], "a step: root, row; line or sum")?;
    let reason = match (field.optional("line"), field.optional("sum")) {
        (None, None) => Reason::Base,
        (Some(line), None) => Reason::Line(line.rational()?),
        (None, Some(sum)) => Reason::Sum(sum.position(counts.sums)?),
        (Some(_), Some(_)) => return Err(field.refuse("line or sum, not both")),
    };
    Ok(Step { root: field.get("root")?.position(counts.roots)?, row: few(field, "row", Field::rational)?, reason })
}

pub(crate) fn write_proof(proof: &RegionProof) -> Value {
    let step = |step: &Step| {
        let mut fields = vec![("root", text(step.root)), ("row", list(&step.row, |x| text(x)))];
        match &step.reason {
            Reason::Base => {}
            Reason::Line(line) => fields.push(("line", text(line))),
            Reason::Sum(sum) => fields.push(("sum", text(sum))),
        }
        object(fields)
    };
    let lead = |lead: &RegionLead| {
        let growth = list(&lead.growth, |x| text(x));
        object(vec![("function", text(lead.function)), ("growth", growth), ("power", text(lead.power))])
    };
    object(vec![
        ("roots", list(&proof.roots, |r| text(r))),
        ("log_start", text(&proof.log_start)),
        ("growths", list(&proof.growths, step)),
        ("angles", list(&proof.angles, step)),
        ("leads", list(&proof.leads, lead)),
        ("nodes", list(&proof.nodes, write_node)),
    ])
}

const MEANING: &str = "  Every start in the set S below is safe for ever: whatever point of S the states are at, the solution that starts there is
  never in the zone. For no point of S is in the zone, and a solution that is in S stays in S.";

const FORM: &str = "  Definition of S. Write the trajectory as the sum of P_1(t) exp(mu_1 t), P_2(t) exp(mu_2 t), ... and the conjugates of those that
  are not real, for the exponents mu_k below and polynomials P_k whose coefficients are vectors of complex numbers; there is
  one way to do that. S is the set of all points
    x = sum over k of P_k(T) e_k (mu_k real), of 2 Re(P_k(T) e_k) (mu_k not real)
  with e_k as below, where i is the imaginary unit. (The names in this definition are its own, whatever the model calls its states.)";

impl Statement {
    pub(crate) fn region_lines(&self, region: &Region, lines: &mut Vec<String>) {
        lines.extend(MEANING.lines().map(str::to_string));
        let from = fraction_and_decimal(&region.from);
        lines.push(format!("  S contains the trajectory from t = {from} on."));
        lines.extend(FORM.lines().map(str::to_string));
        for (position, root) in region.roots.iter().enumerate() {
            lines.push(format!("    r_{} is the only root of {}", position + 1, polynomial_words(&root.polynomial)));
            let side = |(lo, hi): &(Rational, Rational)| {
                format!("between {} and {}", fraction_and_decimal(lo), fraction_and_decimal(hi))
            };
            lines.push(format!("        with real part {}", side(&root.re)));
            lines.push(format!("        and imaginary part {};", side(&root.im)));
        }
        for (position, exponent) in region.exponents.iter().enumerate() {
            let (k, root) = (position + 1, exponent.root + 1);
            lines.push(format!("    mu_{k} = r_{root}, e_{k} = {};", monomial_words(exponent)));
        }
        let states: Vec<&str> = (0..self.states.len()).map(|i| self.name(Variable::State(i))).collect();
        lines.push(format!("    x = ({});", states.join(", ")));
        for (j, root) in region.base.iter().enumerate() {
            lines.push(format!("    phi_{} is any real number (it stands for Im(r_{}) t);", j + 1, root + 1));
        }
        let (scale, start) = (fraction_and_decimal(&region.scale), fraction_and_decimal(&region.start));
        lines.push(format!("    y is any number with y >= {start} (it stands for exp(scale t), scale = {scale});"));
        for (j, rate) in region.rates.iter().enumerate() {
            let (lo, hi, j) = (fraction_and_decimal(&rate.lo), fraction_and_decimal(&rate.hi), j + 1);
            let stands = format!("it stands for exp(Re(r_{}) t)", rate.root + 1);
            lines.push(format!("    u_{j} is any number with y^({lo}) <= u_{j} <= y^({hi}) ({stands});"));
        }
        let bound =
            region.power.as_ref().map_or(String::new(), |p| format!(" and T <= y^({})", fraction_and_decimal(p)));
        lines.push(format!("    T is any number with T >= {from}{bound} (it stands for t)."));
    }
}

/// z^2 + 3 z + 1, constant term last.
fn polynomial_words(coefficients: &[Rational]) -> String {
    let term = |(power, c): (usize, &Rational)| format!("({}) z^{power}", fraction_and_decimal(c));
    let terms: Vec<String> = coefficients.iter().enumerate().filter(|(_, c)| !c.is_zero()).map(term).collect();
    if terms.is_empty() { "0".into() } else { terms.join(" + ") }
}

/// y^(-1) u_1^(2) exp(i (3 phi_1)); of nothing: 1.
fn monomial_words(exponent: &Exponent) -> String {
    let base = |j: usize| if j == 0 { "y".to_string() } else { format!("u_{j}") };
    let power = |(j, g): (usize, &Rational)| {
        if g.is_one() { base(j) } else { format!("{}^({})", base(j), fraction_and_decimal(g)) }
    };
    let mut factors: Vec<String> =
        exponent.growth.iter().enumerate().filter(|(_, g)| !g.is_zero()).map(power).collect();
    let turns: Vec<String> = exponent
        .turns
        .iter()
        .enumerate()
        .filter(|(_, n)| **n != 0)
        .map(|(j, n)| format!("({n}) phi_{}", j + 1))
        .collect();
    if !turns.is_empty() {
        factors.push(format!("exp(i ({}))", turns.join(" + ")));
    }
    if factors.is_empty() { "1".into() } else { factors.join(" ") }
}
