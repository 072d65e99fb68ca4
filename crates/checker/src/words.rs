//! Statements in plain words, for the assessor who asks what has been proved.
//!
//! Every number is printed exactly (see `decimal`), every name as the engineer declared it; products with `*`, powers with `^`
//! (which binds tighter than a sign: -x^2 is -(x^2)), `and` tighter than `or`. Free text is quoted, with control characters
//! escaped, so that no title can pass for a line of the report.

use crate::decimal::fraction_and_decimal;
use crate::formula::claimed_formula;
use crate::set_words::MANY_PREFACE;
use crate::statement::{
    Affine, Atom, Claim, Drive, Exponential, Expression, Formula, Output, Rational, Relation, SignalTerm, Starts,
    State, Statement, Variable, Wave,
};
use num_traits::{One, Signed, Zero};

const PREFACE: &str = "\
This statement speaks of one trajectory: the solution of the equations below from exactly the start below, driven by exactly
the known inputs below. It says nothing about other starts or other inputs, nor whether the equations describe the plant.
All numbers are exact. A decimal in parentheses repeats the number before it; where it says \"about\" it is cut off, and the
fraction counts. t is time, counted from 0 in the unit of the model; x' is the derivative of x with respect to t.
";

const REGION_PREFACE: &str = "\
This statement speaks of all solutions of the equations below that start in a set, which the claim defines from one of them, the
trajectory: the solution from exactly the start below. It does not say whether the equations describe the plant. All numbers
are exact. A decimal in parentheses repeats the number before it; where it says \"about\" it is cut off, and the fraction
counts. t is time, counted from 0 in the unit of the model; x' is the derivative of x with respect to t.
";

const INSEPARABLE: &str = "\
  The trajectory cone from each instant on meets the zone: some phases of the oscillations, to which the trajectory comes
  arbitrarily close, would put it into the zone, at each large t. So no invariant of the o-minimal kind (defined by polynomials
  and exponentials) contains the trajectory from some instant on and avoids the zone.
  This does NOT say that the trajectory enters the zone, nor that it does not.";

impl Statement {
    /// The statement in plain words: several lines, closed by a line feed.
    ///
    /// # Guarantee
    /// All that decides the truth of the claim is printed, and nothing is rounded without the exact number beside it.
    pub fn words(&self) -> String {
        let mut lines = vec![format!("Model: {}", quoted(&self.title)), String::new()];
        let is_region = matches!(self.claim, Claim::Region(_));
        let preface = match (is_region, self.is_single()) {
            (true, _) => REGION_PREFACE,
            (false, true) => PREFACE,
            (false, false) => MANY_PREFACE,
        };
        lines.extend(preface.lines().map(str::to_string));
        self.start_lines(&mut lines);
        self.equation_lines(&mut lines);
        self.input_lines(&mut lines);
        self.unknown_lines(&mut lines);
        self.output_lines(&mut lines);
        self.zone_lines(&mut lines);
        self.claim_lines(&mut lines);
        lines.push(String::new());
        lines.join("\n")
    }

    fn start_lines(&self, lines: &mut Vec<String>) {
        if self.starts != Starts::One {
            return self.set_of_starts_lines(lines);
        }
        section(lines, "States, and their exact values at t = 0:");
        let line = |s: &State| declared(&s.name, &fraction_and_decimal(&s.start), s.unit.as_ref());
        lines.extend(self.states.iter().map(line));
    }

    fn equation_lines(&self, lines: &mut Vec<String>) {
        section(lines, "Equations:");
        // A statement with another number of phases is never verified.
        for rate in self.phases.iter().flat_map(|p| p.rates.iter().enumerate()) {
            let uncertain = self.uncertain_words(rate.0);
            lines.push(format!("  {}' = {}{uncertain}", self.name(Variable::State(rate.0)), self.affine_words(rate.1)));
        }
    }

    fn input_lines(&self, lines: &mut Vec<String>) {
        section(lines, if self.drives.is_empty() { "Known inputs: none." } else { "Known inputs, for all t >= 0:" });
        let signal = |d: &Drive| sum(d.signal.iter().map(|term| (&term.coefficient, signal_factors(term))));
        lines.extend(self.drives.iter().map(|d| declared(&d.name, &signal(d), d.unit.as_ref())));
    }

    fn output_lines(&self, lines: &mut Vec<String>) {
        if !self.outputs.is_empty() {
            section(lines, "Outputs, by definition:");
        }
        let line = |o: &Output| declared(&o.name, &self.expression_words(&o.value), o.unit.as_ref());
        lines.extend(self.outputs.iter().map(line));
        if !self.exponentials.is_empty() {
            section(lines, "Exponentials, by definition:");
        }
        let line = |e: &Exponential| declared(&e.name, &format!("exp({})", self.affine_words(&e.argument)), None);
        lines.extend(self.exponentials.iter().map(line));
    }

    fn zone_lines(&self, lines: &mut Vec<String>) {
        let zone = &self.zone;
        let reference = zone.reference.as_ref().map_or(String::new(), |r| format!(", from requirement {}", quoted(r)));
        let subject = match (&self.claim, self.is_single()) {
            (Claim::Region(_), _) => "A solution",
            (_, true) => "The trajectory",
            (_, false) => "A trajectory",
        };
        let title = format!(
            "Keep-out zone {}{reference}. {subject} is in the zone at an instant t if and only if at t:",
            quoted(&zone.name)
        );
        section(lines, &title);
        lines.push(format!("  {}", self.formula_words(&zone.inside, false)));
        let from = fraction_and_decimal(&zone.from);
        let window = match &zone.until {
            None => format!("Window: all instants t >= {from}, without end; t = {from} counts."),
            Some(until) => {
                let until = fraction_and_decimal(until);
                format!("Window: all instants t from {from} to {until}; both ends count.")
            }
        };
        section(lines, &window);
    }

    fn claim_lines(&self, lines: &mut Vec<String>) {
        section(lines, "Claim:");
        match &self.claim {
            Claim::Never { margin } => {
                let subject = if self.is_single() {
                    "From exactly this start, the trajectory never enters the zone"
                } else {
                    "No admissible trajectory ever enters the zone"
                };
                lines.push(format!("  {subject}, {}:", self.window()));
                lines.push("  it is in the zone at no instant of the window.".into());
                if margin.is_positive() {
                    let margin = fraction_and_decimal(margin);
                    lines.push(format!(
                        "  Margin: {margin}. The same holds for the zone widened by this margin, which is:"
                    ));
                    let none = "(this zone is not a single inequality, so no certificate can prove the claim)".into();
                    let widened = claimed_formula(self).map_or(none, |zone| self.formula_words(&zone, false));
                    lines.push(format!("    {widened}"));
                }
            }
            Claim::Enters { from, to, first } => {
                lines.push(if self.is_single() {
                    "  From exactly this start, the trajectory is in the zone".into()
                } else {
                    "  Some admissible trajectory is in the zone".into()
                });
                let (after, before) = (fraction_and_decimal(from), fraction_and_decimal(to));
                let when = if from == to {
                    format!("at the instant t = {after}")
                } else {
                    format!("at some instant t of the window between {after} and {before} (both ends count)")
                };
                let end = if *first { "," } else { ". Nothing is said about other instants." };
                lines.push(format!("  {when}{end}"));
                if *first {
                    lines.push(format!(
                        "  and at no earlier instant of the window, that is, at none before t = {after}."
                    ));
                }
            }
            Claim::Eventually { from } => {
                let from = fraction_and_decimal(from);
                lines.push(format!(
                    "  From t = {from} on, the trajectory cone avoids the zone: the trajectory is in the zone at no"
                ));
                lines.push("  instant from then on, and would not be if the phases of its oscillations were any others that it".into());
                lines.push("  comes arbitrarily close to. Nothing is said about earlier instants.".into());
            }
            Claim::Inseparable => lines.extend(INSEPARABLE.lines().map(str::to_string)),
            Claim::Region(region) => self.region_lines(region, lines),
        }
    }

    fn window(&self) -> String {
        let from = fraction_and_decimal(&self.zone.from);
        match &self.zone.until {
            None => format!("for all t >= {from}"),
            Some(until) => format!("in the window from {from} to {}", fraction_and_decimal(until)),
        }
    }

    fn affine_words(&self, affine: &Affine) -> String {
        let terms = affine.terms.iter().map(|(factor, variable)| (factor, vec![self.name(*variable).to_string()]));
        let offset = Some((&affine.offset, Vec::new())).filter(|(offset, _)| !offset.is_zero());
        sum(terms.chain(offset))
    }

    fn expression_words(&self, expression: &Expression) -> String {
        let factor = |(variable, power): &(Variable, u32)| raised(self.name(*variable), *power);
        sum(expression.terms.iter().map(|t| (&t.coefficient, t.powers.iter().map(factor).collect())))
    }

    /// The formula; `tight`: as a part of a conjunction, so that a disjunction needs parentheses.
    fn formula_words(&self, formula: &Formula, tight: bool) -> String {
        match formula {
            Formula::Atom(Atom { polynomial, relation }) => {
                format!("{} {}", self.expression_words(polynomial), compared(*relation))
            }
            Formula::And(parts) => match parts.as_slice() {
                [] => "always (a conjunction of nothing)".into(),
                [only] => self.formula_words(only, tight),
                _ => parts.iter().map(|p| self.formula_words(p, true)).collect::<Vec<_>>().join(" and "),
            },
            Formula::Or(parts) => match parts.as_slice() {
                [] => "never (a disjunction of nothing)".into(),
                [only] => self.formula_words(only, tight),
                _ => {
                    let text = parts.iter().map(|p| self.formula_words(p, false)).collect::<Vec<_>>().join(" or ");
                    if tight { format!("({text})") } else { text }
                }
            },
        }
    }
}

pub(crate) fn section(lines: &mut Vec<String>, title: &str) {
    lines.push(String::new());
    lines.push(title.to_string());
}

/// Free text in quotation marks, on one line.
fn quoted(text: &str) -> String {
    format!("{text:?}")
}

pub(crate) fn declared(name: &str, value: &str, unit: Option<&String>) -> String {
    let unit = unit.map_or(String::new(), |u| format!("    [unit label {}]", quoted(u)));
    format!("  {name} = {value}{unit}")
}

fn compared(relation: Relation) -> &'static str {
    match relation {
        Relation::Negative => "< 0",
        Relation::NonPositive => "<= 0",
        Relation::Zero => "= 0",
        Relation::NonNegative => ">= 0",
        Relation::Positive => "> 0",
        Relation::NonZero => "is different from 0",
    }
}

pub(crate) fn raised(name: &str, power: u32) -> String {
    if power == 1 { name.to_string() } else { format!("{name}^{power}") }
}

/// The sum of coefficients times factors: `-2 * x + 1/2 (0.5) * y^2 - z`. Of no terms: `0`.
pub(crate) fn sum<'a>(terms: impl Iterator<Item = (&'a Rational, Vec<String>)>) -> String {
    let mut text = String::new();
    for (coefficient, mut factors) in terms {
        let is_first = text.is_empty();
        let is_unit = !factors.is_empty() && coefficient.abs().is_one();
        text.push_str(match (is_first, coefficient.is_negative()) {
            (true, true) if is_unit => "-",
            // The sign of the first number stays with it.
            (true, _) => "",
            (false, false) => " + ",
            (false, true) => " - ",
        });
        if !is_unit {
            let number = if is_first { coefficient.clone() } else { coefficient.abs() };
            factors.insert(0, fraction_and_decimal(&number));
        }
        text.push_str(&factors.join(" * "));
    }
    if text.is_empty() { "0".into() } else { text }
}

/// The factors of a signal's term after its coefficient.
fn signal_factors(term: &SignalTerm) -> Vec<String> {
    let of_time = |function: &str, rate: &Rational| {
        let argument = sum(std::iter::once((rate, vec!["t".to_string()])));
        format!("{function}({argument})")
    };
    let mut factors = Vec::new();
    if term.power > 0 {
        factors.push(raised("t", term.power));
    }
    if !term.rate.is_zero() {
        factors.push(of_time("exp", &term.rate));
    }
    match &term.wave {
        Wave::One => {}
        Wave::Cosine(w) => factors.push(of_time("cos", w)),
        Wave::Sine(w) => factors.push(of_time("sin", w)),
    }
    factors
}
