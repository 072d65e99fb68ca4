//! `keepout spectrum`: the exact structure of a model's dynamics, which engineers look at first.

use super::{CLEAR, WRONG, complain, loaded, print};
use crate::model::{Model, Need};
use crate::number::{for_people, nearest_decimal};
use keepout_checker::number::{Interval, Rational};
use keepout_checker::statement::{Uncertain, UncertainTerm, Variable};
use keepout_core::ToRational;
use keepout_core::blocks::SparseMatrix;
use keepout_core::structure::{Boundedness, Evidence, StructureOptions, spectral_structure_with};
use keepout_core::{CoreError, IntegerPolynomial, Irreducibility, SpectralStructure};
use num_traits::{One, Signed, Zero};
use std::fmt::Write as _;
use std::path::PathBuf;

/// The arguments of the command.
#[derive(Debug, clap::Args)]
pub struct Arguments {
    /// The model, a TOML file; it needs no zone
    pub model: PathBuf,
}

/// Runs the command; returns the exit status.
pub fn run(arguments: &Arguments) -> u8 {
    let Some(model) = loaded(&arguments.model, Need::Nothing) else { return WRONG };
    match structure(&model) {
        Ok(structure) => print(&report(&model, &structure), CLEAR),
        Err(error) => {
            complain(&format!("{error}\n"));
            WRONG
        }
    }
}

/// The structure of the states' matrix A, inputs and offset left out; uncertain constants are at the centres of their ranges.
fn structure(model: &Model) -> Result<SpectralStructure, CoreError> {
    let rows = model.phase.rates.iter().enumerate();
    let entries = rows.flat_map(|(i, rate)| {
        rate.terms.iter().filter_map(move |(factor, variable)| match variable {
            Variable::State(j) => Some((i, *j, factor.clone())),
            Variable::Drive(_)
            | Variable::Output(_)
            | Variable::Time
            | Variable::Exponential(_)
            | Variable::Disturbance(_) => None,
        })
    });
    let uncertain = model.phase.uncertain.iter().filter_map(|term| match term.of {
        Some(Variable::State(j)) => Some((term.state, j, at_centre(term, model))),
        _ => None,
    });
    let a = SparseMatrix::new(model.states.len(), entries.chain(uncertain))?;
    spectral_structure_with(&a, &StructureOptions::default())
}

/// The factor of an uncertain term where each uncertain constant is in the middle of its range.
fn at_centre(term: &UncertainTerm, model: &Model) -> Rational {
    let power = |(position, exponent): &(usize, i32)| model.uncertain[*position].range.centre().pow(*exponent);
    term.powers.iter().map(power).fold(term.factor.clone(), |product, power| product * power)
}

fn report(model: &Model, s: &SpectralStructure) -> String {
    let mut text = format!("{}\n{} states, {} blocks\n", model.title, s.order, s.blocks.len());
    if !model.uncertain.is_empty() {
        let centre = |u: &Uncertain| format!("{} = {}", u.name, exact_or_decimal(&u.range.centre()));
        let list: Vec<String> = model.uncertain.iter().map(centre).collect();
        let _ = writeln!(text, "uncertain constants at the centres of their ranges: {}", list.join(", "));
    }
    blocks(&mut text, model, s);
    let _ = writeln!(text, "\nfactors of the characteristic polynomial");
    for (i, factor) in s.factors.iter().enumerate() {
        let state =
            if factor.irreducibility == Irreducibility::Proved { "irreducible" } else { "not factored further" };
        let index = factor.index.map_or("not computed".to_string(), |k| k.to_string());
        let _ = writeln!(
            text,
            "  [{}] degree {}, multiplicity {}, largest Jordan block {index}, {state}: {}",
            i + 1,
            factor.polynomial.degree(),
            factor.algebraic_multiplicity,
            polynomial_text(&factor.polynomial)
        );
    }
    eigenvalues(&mut text, s);
    relations(&mut text, s);
    let _ = writeln!(text, "\ngrowth of the free motion: {}", growth(s));
    text
}

fn blocks(text: &mut String, model: &Model, s: &SpectralStructure) {
    for (i, block) in s.blocks.iter().enumerate().take(40) {
        let names: Vec<&str> = block.indices.iter().take(8).map(|j| model.states[*j].name.as_str()).collect();
        let more = block.indices.len().saturating_sub(8);
        let more = if more > 0 { format!(" and {more} more") } else { String::new() };
        let _ = writeln!(text, "  block {}: {}{more}", i + 1, names.join(", "));
    }
    if s.blocks.len() > 40 {
        let _ = writeln!(text, "  ... {} more blocks", s.blocks.len() - 40);
    }
}

fn eigenvalues(text: &mut String, s: &SpectralStructure) {
    let _ = writeln!(text, "\neigenvalues, largest real part first");
    let _ = writeln!(
        text,
        "  {:>24}  {:>24}  {:>6} {:>12} {:>13}  factor",
        "real part", "frequency", "mult.", "Jordan block", "damping ratio"
    );
    for class in &s.rates {
        for index in &class.eigenvalues {
            let eigenvalue = &s.eigenvalues[*index];
            let re = match &class.rational {
                Some(value) => exact_or_decimal(value),
                None => interval_text(&eigenvalue.disc.enclose_re()),
            };
            let im = if eigenvalue.disc.is_real() {
                "0".to_string()
            } else {
                format!("+-{}", interval_text(&eigenvalue.disc.enclose_im()))
            };
            let jordan = s.index(*index).map_or("?".to_string(), |k| k.to_string());
            let damping = damping(
                class.rational.as_ref(),
                &eigenvalue.disc.enclose_re(),
                &eigenvalue.disc.enclose_im(),
                eigenvalue.disc.is_real(),
            );
            let mult = s.algebraic_multiplicity(*index);
            let _ = writeln!(
                text,
                "  {re:>24}  {im:>24}  {mult:>6} {jordan:>12} {damping:>13}  [{}]",
                eigenvalue.factor + 1
            );
        }
        if class.eigenvalues.len() > 1 {
            let count = class.eigenvalues.len();
            let _ = match class.equality {
                Evidence::Proved => writeln!(text, "    these {count} have exactly equal real parts"),
                Evidence::Open => writeln!(text, "    whether these {count} have equal real parts is not decided"),
            };
        }
    }
}

/// -Re / |lambda| for an oscillating mode.
fn damping(rational: Option<&Rational>, re: &Interval, im: &Interval, is_real: bool) -> String {
    if is_real {
        return String::new();
    }
    if rational.is_some_and(Zero::is_zero) {
        return "0".into();
    }
    let middle = |x: &Interval| x.lo().to_rational().and_then(|q| num_traits::ToPrimitive::to_f64(&q));
    match (middle(re), middle(im)) {
        (Some(a), Some(b)) => format!("{:.6}", -a / a.hypot(b)),
        _ => String::new(),
    }
}

fn relations(text: &mut String, s: &SpectralStructure) {
    if s.relations.is_empty() {
        return;
    }
    let _ = writeln!(text, "\nrelations among the frequencies (each named by its value)");
    for relation in s.relations.iter().take(60) {
        let terms: Vec<String> = relation
            .terms
            .iter()
            .map(|(index, n)| {
                let frequency = s.eigenvalues[*index].disc.enclose_im();
                format!("{n}*{}", frequency.lo().to_rational().map_or("?".into(), |q| nearest_decimal(&q, 6)))
            })
            .collect();
        let state = if relation.evidence == Evidence::Proved { "proved" } else { "conjectured" };
        let _ = writeln!(text, "  {} = 0 ({state})", terms.join(" + ").replace("+ -", "- "));
    }
}

fn growth(s: &SpectralStructure) -> String {
    let power = match s.growth.power {
        Some(0) | None => String::new(),
        Some(k) => format!(", with t^{k} in front"),
    };
    let rate = s.rates.first().map_or("0".into(), |r| match &r.rational {
        Some(value) => exact_or_decimal(value),
        None => interval_text(&r.rate),
    });
    match s.growth.boundedness {
        Boundedness::Decaying => format!("decays like exp(rate t), rate {rate}{power}"),
        Boundedness::Bounded => "bounded, does not decay".into(),
        Boundedness::GrowingPolynomially => format!("unbounded like a power of t{power}"),
        Boundedness::GrowingExponentially => format!("unbounded like exp(rate t), rate {rate}{power}"),
        Boundedness::Open => "not decided".into(),
    }
}

fn exact_or_decimal(value: &Rational) -> String {
    let text = for_people(value, 12);
    match text.strip_prefix("about ") {
        None => text,
        Some(decimal) if value.to_string().len() > 16 => format!("{decimal}..."),
        Some(_) => value.to_string(),
    }
}

/// The digits that the width of an interval leaves, fourteen at most.
fn interval_text(x: &Interval) -> String {
    let (Some(lo), Some(hi)) = (x.lo().to_rational(), x.hi().to_rational()) else { return "?".into() };
    for digits in (3..=14).rev() {
        let (a, b) = (nearest_decimal(&lo, digits), nearest_decimal(&hi, digits));
        if a == b {
            return a;
        }
    }
    nearest_decimal(&lo, 6)
}

fn polynomial_text(p: &IntegerPolynomial) -> String {
    if p.degree() > 12 {
        return "(long)".into();
    }
    let mut text = String::new();
    for (k, c) in p.coefficients().iter().enumerate().rev().filter(|(_, c)| !c.is_zero()) {
        let sign = match (text.is_empty(), c.is_negative()) {
            (true, false) => "",
            (true, true) => "-",
            (false, false) => " + ",
            (false, true) => " - ",
        };
        let size = c.magnitude();
        let factor = if size.is_one() && k > 0 { String::new() } else { size.to_string() };
        let power = match k {
            0 => String::new(),
            1 => "s".into(),
            _ => format!("s^{k}"),
        };
        let _ = write!(text, "{sign}{factor}{}{power}", if factor.is_empty() || k == 0 { "" } else { " " });
    }
    text
}
