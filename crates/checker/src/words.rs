//! A statement in plain words, for the person who reads what has been proved.
//!
//! Every number is printed exactly, with a decimal beside it where it is not an integer.

use crate::decimal::fraction_and_decimal;
use crate::number::Rational;
use crate::statement::{Affine, Claim, Drive, Expression, Formula, Relation, SignalTerm, Statement, Variable, Wave};
use num_traits::{One, Signed, Zero};
use std::fmt::Write;

impl Statement {
    /// The statement in words: system, start, inputs, zone, window, claim.
    pub fn words(&self) -> String {
        let mut out = format!("System: {}\n", self.title);
        for (state, rate) in self.states.iter().zip(self.phases.iter().flat_map(|p| &p.rates)) {
            let _ = writeln!(out, "  {}' = {}{}", state.name, self.affine(rate), unit(state.unit.as_ref()));
        }
        out.push_str("Start, at t = 0 exactly:\n");
        for state in &self.states {
            let _ = writeln!(out, "  {} = {}", state.name, fraction_and_decimal(&state.start));
        }
        if !self.drives.is_empty() {
            out.push_str("Known inputs, exactly:\n");
        }
        for drive in &self.drives {
            let _ = writeln!(out, "  {} = {}{}", drive.name, signal(drive), unit(drive.unit.as_ref()));
        }
        if !self.outputs.is_empty() {
            out.push_str("Named expressions:\n");
        }
        for output in &self.outputs {
            let _ =
                writeln!(out, "  {} = {}{}", output.name, self.expression(&output.value), unit(output.unit.as_ref()));
        }
        let zone = &self.zone;
        let reference = zone.reference.as_ref().map_or(String::new(), |r| format!(" (requirement {r})"));
        let _ = writeln!(out, "Keep-out zone \"{}\"{reference}:\n  {}", zone.name, self.formula(&zone.inside));
        let _ = writeln!(out, "Window: {}", window(&zone.from, zone.until.as_ref()));
        let _ = writeln!(out, "Claim: {}", self.claim());
        out
    }

    fn claim(&self) -> String {
        match &self.claim {
            Claim::Never { margin } => {
                let never = "the trajectory from exactly this start is in the zone at no instant of the window.";
                if margin.is_zero() {
                    return never.into();
                }
                format!(
                    "{never} Nor does it come within the margin {}: {}.",
                    fraction_and_decimal(margin),
                    self.widened(margin)
                )
            }
            Claim::Enters { from, to, first } => {
                let when = if from == to {
                    format!("at t = {}", fraction_and_decimal(from))
                } else {
                    format!(
                        "at some instant t with {} <= t <= {}",
                        fraction_and_decimal(from),
                        fraction_and_decimal(to)
                    )
                };
                let first = if *first {
                    format!(", and at no instant of the window before {}", fraction_and_decimal(from))
                } else {
                    String::new()
                };
                format!("the trajectory from exactly this start is in the zone {when}{first}.")
            }
        }
    }

    fn widened(&self, margin: &Rational) -> String {
        let Formula::Atom(atom) = &self.zone.inside else { return "the zone is not a single comparison".into() };
        let p = self.expression(&atom.polynomial);
        let m = fraction_and_decimal(margin);
        match atom.relation {
            Relation::Positive | Relation::NonNegative => format!("{p} >= -{m} holds at no instant of the window"),
            Relation::Negative | Relation::NonPositive => format!("{p} <= {m} holds at no instant of the window"),
            Relation::Zero | Relation::NonZero => format!("-{m} <= {p} <= {m} holds at no instant of the window"),
        }
    }

    fn affine(&self, affine: &Affine) -> String {
        let mut terms: Vec<(Rational, String)> =
            affine.terms.iter().map(|(factor, variable)| (factor.clone(), self.name(*variable).to_string())).collect();
        if !affine.offset.is_zero() || terms.is_empty() {
            terms.push((affine.offset.clone(), String::new()));
        }
        sum(&terms)
    }

    fn expression(&self, expression: &Expression) -> String {
        let power = |(variable, k): &(Variable, u32)| match k {
            1 => self.name(*variable).to_string(),
            _ => format!("{}^{k}", self.name(*variable)),
        };
        let product = |powers: &[(Variable, u32)]| powers.iter().map(power).collect::<Vec<_>>().join("*");
        let terms: Vec<(Rational, String)> =
            expression.terms.iter().map(|t| (t.coefficient.clone(), product(&t.powers))).collect();
        if terms.is_empty() { "0".into() } else { sum(&terms) }
    }

    fn formula(&self, formula: &Formula) -> String {
        let joined = |parts: &[Formula], word: &str, empty: &str| match parts {
            [] => empty.to_string(),
            [one] => self.formula(one),
            _ => parts.iter().map(|p| self.grouped(p)).collect::<Vec<_>>().join(word),
        };
        match formula {
            Formula::And(parts) => joined(parts, " and ", "always"),
            Formula::Or(parts) => joined(parts, " or ", "nowhere"),
            Formula::Atom(atom) => {
                let sign = match atom.relation {
                    Relation::Negative => "<",
                    Relation::NonPositive => "<=",
                    Relation::Zero => "=",
                    Relation::NonNegative => ">=",
                    Relation::Positive => ">",
                    Relation::NonZero => "is not",
                };
                format!("{} {sign} 0", self.expression(&atom.polynomial))
            }
        }
    }

    /// A part of a conjunction or disjunction: in parentheses unless it is a single comparison.
    fn grouped(&self, part: &Formula) -> String {
        match part {
            Formula::Atom(_) => self.formula(part),
            Formula::And(_) | Formula::Or(_) => format!("({})", self.formula(part)),
        }
    }
}

fn window(from: &Rational, until: Option<&Rational>) -> String {
    match until {
        None if from.is_zero() => "all t >= 0".into(),
        None => format!("all t >= {}", fraction_and_decimal(from)),
        Some(until) => format!("{} <= t <= {}", fraction_and_decimal(from), fraction_and_decimal(until)),
    }
}

fn unit(unit: Option<&String>) -> String {
    unit.map_or(String::new(), |u| format!("   [{u}]"))
}

/// A sum of products with signs between them.
fn sum(terms: &[(Rational, String)]) -> String {
    let mut out = String::new();
    for (coefficient, product) in terms {
        out.push_str(match (out.is_empty(), coefficient.is_negative()) {
            (true, false) => "",
            (true, true) => "-",
            (false, false) => " + ",
            (false, true) => " - ",
        });
        let size = coefficient.abs();
        match (size.is_one(), product.is_empty()) {
            (_, true) => out.push_str(&fraction_and_decimal(&size)),
            (true, false) => out.push_str(product),
            (false, false) => {
                let _ = write!(out, "{}*{product}", fraction_and_decimal(&size));
            }
        }
    }
    out
}

fn signal(drive: &Drive) -> String {
    let factors = |term: &SignalTerm| {
        let mut list = Vec::new();
        match term.power {
            0 => {}
            1 => list.push("t".to_string()),
            k => list.push(format!("t^{k}")),
        }
        if !term.rate.is_zero() {
            list.push(format!("exp({}*t)", fraction_and_decimal(&term.rate)));
        }
        match &term.wave {
            Wave::One => {}
            Wave::Cosine(w) => list.push(format!("cos({}*t)", fraction_and_decimal(w))),
            Wave::Sine(w) => list.push(format!("sin({}*t)", fraction_and_decimal(w))),
        }
        list.join("*")
    };
    let terms: Vec<(Rational, String)> = drive.signal.iter().map(|t| (t.coefficient.clone(), factors(t))).collect();
    if terms.is_empty() { "0".into() } else { sum(&terms) }
}
