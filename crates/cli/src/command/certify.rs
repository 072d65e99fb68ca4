//! `keepout certify`: settles the zones of a model and writes the evidence.

use super::progress::Progress;
use super::{CLEAR, ENTERED, UNSETTLED, WRONG, complain, invariant, loaded, print, worst_case};
use crate::diagnostic::nearest;
use crate::model::{Model, Need};
use crate::number::{Rounding, for_people, rounded, to_decimal};
use keepout_checker::many::Witness;
use keepout_checker::statement::{Claim, Formula, Rational, Statement, Variable};
use keepout_synthesis::{Margin, Options, Outcome, Place, Proof, Reason, certify, certify_eventually};
use num_traits::{One, Signed, Zero};
use rayon::prelude::*;
use serde_json::{Map, Value, json};
use std::fmt::Write as _;
use std::panic::AssertUnwindSafe;
use std::path::{Path, PathBuf};

/// The arguments of the command.
#[derive(Debug, clap::Args)]
pub struct Arguments {
    /// The model, a TOML file
    pub model: PathBuf,
    /// Settle only the zone of this name; may be given several times
    #[arg(long = "zone", value_name = "NAME")]
    pub zones: Vec<String>,
    /// Write statement and certificate of each settled zone into this folder
    #[arg(long, value_name = "DIR")]
    pub out: Option<PathBuf>,
    /// For each zone that is clear for all time, look for a set of states around the trajectory from which every start is
    /// safe for ever, and write it into this folder: as polynomial inequalities (JSON, SMT-LIB 2, text) and with evidence
    #[arg(long, value_name = "DIR")]
    pub invariant: Option<PathBuf>,
    /// Print one JSON object instead of text
    #[arg(long)]
    pub json: bool,
    /// Ask whether each zone is left for good: from which time on no phase of the oscillations leads into it, whatever
    /// happens before
    #[arg(long)]
    pub eventually: bool,
    /// How much work to spend on each zone before giving up; a whole number, the same everywhere
    #[arg(long, value_name = "N", default_value_t = Options::default().effort)]
    pub effort: u64,
    /// Do not look for the margins of clear zones: the verdicts come sooner
    #[arg(long)]
    pub no_margins: bool,
}

/// Runs the command; returns the exit status.
pub fn run(arguments: &Arguments) -> u8 {
    let Some(model) = loaded(&arguments.model, Need::Zones) else { return WRONG };
    let chosen = match chosen(&model, &arguments.zones) {
        Ok(chosen) => chosen,
        Err(message) => {
            complain(&format!("{message}\n"));
            return WRONG;
        }
    };
    let options = Options { effort: arguments.effort, margin: !arguments.no_margins, ..Options::default() };
    let progress = Progress::new(chosen.len());
    let settled: Vec<Settled> = chosen
        .into_par_iter()
        .map(|zone| {
            let statement = model.statement(zone);
            let outcome = settle(&statement, &options, arguments.eventually);
            let is_safe = matches!(outcome, Ok(Outcome::Clear { .. } | Outcome::Eventually { .. }));
            let wanted = arguments.invariant.is_some() && is_safe && statement.zone.until.is_none();
            let set = wanted.then(|| invariant::find(&statement, &options));
            progress.one_done();
            Settled { statement, outcome, set }
        })
        .collect();
    drop(progress);
    if let Some(folder) = &arguments.out
        && let Err(message) = settled.iter().try_for_each(|s| s.write(folder))
    {
        complain(&format!("{message}\n"));
        return WRONG;
    }
    if let Some(folder) = &arguments.invariant {
        let written =
            |s: &Settled| s.set.iter().try_for_each(|set| invariant::write(set, &s.statement.zone.name, folder));
        if let Err(message) = settled.iter().try_for_each(written) {
            complain(&format!("{message}\n"));
            return WRONG;
        }
    }
    let is = |word: &str| settled.iter().any(|s| s.verdict() == word);
    let status = match (is("enters"), is("unsettled") || is("inseparable")) {
        (true, _) => ENTERED,
        (false, true) => UNSETTLED,
        (false, false) => CLEAR,
    };
    let report = match arguments.json {
        true => report_json(&model, &settled),
        false => report_text(&model, &settled, arguments.out.as_deref()),
    };
    print(&report, status)
}

/// The outcome; a defect of the program leaves the zone unsettled and the others alone.
fn settle(statement: &Statement, options: &Options, eventually: bool) -> Result<Outcome, String> {
    let search = if eventually { certify_eventually } else { certify };
    let attempt = std::panic::catch_unwind(AssertUnwindSafe(|| search(statement, options)));
    match attempt {
        Ok(outcome) => outcome.map_err(|e| e.to_string()),
        Err(_) => Err("a defect of this program stopped the search; please report the model".into()),
    }
}

/// The positions of the named zones; of all zones if none is named.
fn chosen(model: &Model, names: &[String]) -> Result<Vec<usize>, String> {
    if names.is_empty() {
        return Ok((0..model.zones.len()).collect());
    }
    let mut list = Vec::new();
    for name in names {
        let Some(position) = model.zones.iter().position(|z| z.name == *name) else {
            let known: Vec<&str> = model.zones.iter().map(|z| z.name.as_str()).collect();
            let hint = nearest(name, known.iter().copied())
                .map_or(String::new(), |close| format!("; did you mean `{close}`?"));
            return Err(format!("the model has no zone `{name}`{hint}\nits zones: {}", known.join(", ")));
        };
        if !list.contains(&position) {
            list.push(position);
        }
    }
    Ok(list)
}

/// A zone and what became of it.
struct Settled {
    statement: Statement,
    outcome: Result<Outcome, String>,
    /// A set of safe starts, if one was asked for and the zone is clear.
    set: Option<Result<Proof, String>>,
}

impl Settled {
    fn verdict(&self) -> &'static str {
        match &self.outcome {
            Ok(Outcome::Clear { .. }) => "clear",
            Ok(Outcome::Enters { .. }) => "enters",
            Ok(Outcome::Eventually { .. }) => "left",
            Ok(Outcome::Inseparable { .. }) => "inseparable",
            Ok(Outcome::Unsettled { .. }) | Err(_) => "unsettled",
        }
    }

    fn proof(&self) -> Option<&Proof> {
        match &self.outcome {
            Ok(
                Outcome::Clear { proof, .. }
                | Outcome::Enters { proof }
                | Outcome::Eventually { proof }
                | Outcome::Inseparable { proof },
            ) => Some(proof),
            Ok(Outcome::Unsettled { .. }) | Err(_) => None,
        }
    }

    /// The trajectory that shows that a zone of many trajectories is entered.
    fn witness(&self) -> Option<&Witness> {
        self.proof().and_then(worst_case::witness)
    }

    /// Writes the evidence; evidence of an earlier run for this zone does not stay beside another verdict.
    fn write(&self, folder: &Path) -> Result<(), String> {
        let failed = |path: &Path, e: std::io::Error| format!("cannot write {}: {e}", path.display());
        std::fs::create_dir_all(folder).map_err(|e| failed(folder, e))?;
        let path = |what: &str| folder.join(format!("{}.{what}.json", self.statement.zone.name));
        let texts = [
            ("statement", self.proof().map(|p| p.statement().to_json().print())),
            ("certificate", self.proof().map(|p| p.certificate().to_json().print())),
            ("witness", self.witness().map(|w| worst_case::to_json(w, &self.statement))),
        ];
        for (what, text) in texts {
            let path = path(what);
            match text {
                Some(text) => std::fs::write(&path, text).map_err(|e| failed(&path, e))?,
                None if path.exists() => std::fs::remove_file(&path).map_err(|e| failed(&path, e))?,
                None => {}
            }
        }
        Ok(())
    }
}

fn report_text(model: &Model, settled: &[Settled], out: Option<&Path>) -> String {
    let mut text = format!("{}\n", model.title);
    let width = settled.iter().map(|s| s.statement.zone.name.len()).max().unwrap_or(0);
    let verdict_width = settled.iter().map(|s| s.verdict().len()).max().unwrap_or(0).max("unsettled".len());
    for zone in settled {
        let name = &zone.statement.zone.name;
        let _ = writeln!(text, "  {name:width$}  {:verdict_width$}  {}", zone.verdict(), zone.in_words());
        if let Some(witness) = zone.witness() {
            let file = out.map_or(String::new(), |_| format!(" (see {name}.witness.json)"));
            let words = format!("{}{file}", worst_case::in_words(witness, &zone.statement));
            let _ = writeln!(text, "  {:width$}  {:verdict_width$}  {words}", "", "");
        }
        if let Some(set) = &zone.set {
            let _ = writeln!(text, "  {:width$}  {:verdict_width$}  {}", "", "", invariant::in_words(set));
        }
    }
    if let Some(folder) = out {
        let _ = writeln!(text, "evidence in {}; to re-check one zone:", folder.display());
        if let Some(zone) = settled.iter().find(|s| s.proof().is_some()) {
            let file = |what: &str| folder.join(format!("{}.{what}.json", zone.statement.zone.name));
            let _ = writeln!(text, "  keepout-check {} {}", quoted(&file("statement")), quoted(&file("certificate")));
        }
    }
    text
}

/// A path for a command line.
pub(super) fn quoted(path: &Path) -> String {
    let text = path.display().to_string();
    if text.contains(|c: char| c.is_whitespace() || "'\"\\$&;()".contains(c)) {
        format!("'{}'", text.replace('\'', "'\\''"))
    } else {
        text
    }
}

impl Settled {
    fn in_words(&self) -> String {
        match &self.outcome {
            Err(message) => message.clone(),
            Ok(Outcome::Clear { margin, .. }) => {
                let window = match &self.statement.zone.until {
                    None => "for all time".to_string(),
                    Some(until) => format!("up to t = {}", for_people(until, 8)),
                };
                format!("{window}{}", margin.as_ref().map_or(String::new(), |m| format!("; {}", self.margin_words(m))))
            }
            Ok(Outcome::Enters { proof }) => match &proof.statement().claim {
                Claim::Enters { from, to, first: true } => format!("first {}", bracket(from, to)),
                Claim::Enters { from, to, first: false } => {
                    format!("{}; there may be an earlier entry", bracket(from, to))
                }
                Claim::Never { .. } | Claim::Eventually { .. } | Claim::Inseparable | Claim::Region(_) => String::new(),
            },
            Ok(Outcome::Eventually { proof }) => match &proof.statement().claim {
                Claim::Eventually { from } => {
                    format!("for good from t = {} on, at the latest", rounded(from, 7, Rounding::Up))
                }
                Claim::Never { .. } | Claim::Enters { .. } | Claim::Inseparable | Claim::Region(_) => String::new(),
            },
            Ok(Outcome::Inseparable { .. }) => INSEPARABLE.into(),
            Ok(Outcome::Unsettled { reason, .. }) => format!("{}; {}", reason_words(reason), help_words(reason)),
        }
    }

    fn margin_words(&self, margin: &Margin) -> String {
        let unit = unit_of(&self.statement).map_or(String::new(), |u| format!(" {u}"));
        let place = match &margin.place {
            Place::Near(t) => format!("near t = {}", to_decimal(t, 6)),
            Place::Late => "approached as t -> infinity".into(),
            Place::Recurring => "approached again and again".into(),
        };
        if margin.certified.is_positive() {
            return format!("margin {}{unit}, {place}", to_decimal(&margin.certified, 9));
        }
        match &margin.at_most {
            Some(at_most) if at_most.is_positive() => {
                format!("no margin certified (at most {}{unit}, {place})", to_decimal(at_most, 6))
            }
            Some(_) => format!("margin 0, {place}"),
            None => "no margin certified: the border is touched, or nearly".into(),
        }
    }
}

/// What it means, and what it does not.
const INSEPARABLE: &str = "phases that the oscillations come arbitrarily close to lead into the zone at \
    every late time: no invariant of the class can keep the trajectory clear of it. This does not say that the zone is \
    entered, nor that it is not; a zone moved away by any margin can be settled";

pub(super) fn bracket(from: &Rational, to: &Rational) -> String {
    if from == to {
        return format!("at t = {}", for_people(from, 12));
    }
    let (low, high) = (to_decimal(from, 12), to_decimal(to, 12));
    if from.is_zero() {
        return format!("right after t = 0 (before t = {})", to_decimal(to, 3));
    }
    if low == high { format!("at t = {low}...") } else { format!("between t = {low} and t = {high}") }
}

/// The unit of the zone's polynomial where it is that of a single quantity.
pub(super) fn unit_of(statement: &Statement) -> Option<&str> {
    let Formula::Atom(atom) = &statement.zone.inside else { return None };
    let mut unit = None;
    for term in atom.polynomial.terms.iter().filter(|t| !t.powers.is_empty()) {
        let [(variable, 1)] = term.powers.as_slice() else { return None };
        let own = match variable {
            Variable::State(i) => statement.states.get(*i)?.unit.as_deref(),
            Variable::Drive(i) => statement.drives.get(*i)?.unit.as_deref(),
            Variable::Output(i) => statement.outputs.get(*i)?.unit.as_deref(),
            Variable::Time | Variable::Exponential(_) | Variable::Disturbance(_) => None,
        }?;
        if !term.coefficient.abs().is_one() || unit.is_some_and(|u| u != own) {
            return None;
        }
        unit = Some(own);
    }
    unit
}

fn reason_words(reason: &Reason) -> String {
    match reason {
        Reason::Touches { from, to } => format!(
            "between t = {} and t = {} the trajectory touches the border or comes too close to tell: no factor that vanishes \
             there was found (to decide such zeros in general is an open problem)",
            to_decimal(from, 12),
            to_decimal(to, 12)
        ),
        Reason::TouchesInTheLimit { tried } => format!(
            "the leading terms for large times touch the border, or come too close to tell: no identity that shows it was \
             found (starts of a cone up to t = {} were tried)",
            to_decimal(tried, 3)
        ),
        Reason::EqualRates => "leading growth rates seem to be equal, which could not be proved".into(),
        Reason::Effort { clear_until } => {
            format!("the work allowed was used up; the zone is not entered before t = {}", to_decimal(clear_until, 6))
        }
        Reason::NotAffine => {
            "for many trajectories zones are settled whose polynomials are affine in the states with constant coefficients".into()
        }
        Reason::WindowEnds => "a window with `until` has no large times".into(),
        Reason::Limit(rejection) => rejection.to_string(),
    }
}

fn help_words(reason: &Reason) -> &'static str {
    match reason {
        Reason::Touches { .. } | Reason::TouchesInTheLimit { .. } => {
            "what would help: a slightly wider or narrower zone"
        }
        Reason::EqualRates => "what would help: a window with `until`",
        Reason::Effort { .. } => "what would help: a greater --effort, or a window with `until`",
        Reason::NotAffine => "what would help: a zone of half-spaces that contains this one",
        Reason::WindowEnds => "what would help: a zone without `until`",
        Reason::Limit(_) => "what would help: a smaller model, or a zone of a lower degree",
    }
}

fn report_json(model: &Model, settled: &[Settled]) -> String {
    let zones: Vec<Value> = settled.iter().map(Settled::json).collect();
    let report =
        json!({ "program": "keepout", "version": env!("CARGO_PKG_VERSION"), "title": model.title, "zones": zones });
    format!("{report:#}\n")
}

pub(super) fn decimal_value(value: &Rational) -> Value {
    let number: Option<f64> = to_decimal(value, 17).parse().ok();
    number.filter(|x: &f64| x.is_finite()).map_or(Value::Null, Value::from)
}

impl Settled {
    fn json(&self) -> Value {
        let zone = &self.statement.zone;
        let mut fields = Map::new();
        fields.insert("name".into(), json!(zone.name));
        fields.insert("ref".into(), json!(zone.reference));
        fields.insert("verdict".into(), json!(self.verdict()));
        match &self.outcome {
            Err(message) => drop(fields.insert("reason".into(), json!(message))),
            Ok(Outcome::Clear { margin, .. }) => {
                if let Some(margin) = margin {
                    fields.insert("margin".into(), json!(margin.certified.to_string()));
                    fields.insert("margin_decimal".into(), decimal_value(&margin.certified));
                    let place = match &margin.place {
                        Place::Near(t) => json!({ "near": t.to_string(), "near_decimal": decimal_value(t) }),
                        Place::Late => json!("approached as t -> infinity"),
                        Place::Recurring => json!("approached again and again"),
                    };
                    fields.insert("margin_place".into(), place);
                    if let Some(at_most) = &margin.at_most {
                        fields.insert("margin_at_most_decimal".into(), decimal_value(at_most));
                    }
                }
            }
            Ok(Outcome::Enters { proof }) => {
                if let Claim::Enters { from, to, first } = &proof.statement().claim {
                    let time = json!({
                        "from": from.to_string(), "to": to.to_string(), "first": first,
                        "from_decimal": decimal_value(from), "to_decimal": decimal_value(to),
                    });
                    fields.insert("time".into(), time);
                }
            }
            Ok(Outcome::Eventually { proof }) => {
                if let Claim::Eventually { from } = &proof.statement().claim {
                    let time = json!({ "from": from.to_string(), "from_decimal": decimal_value(from) });
                    fields.insert("time".into(), time);
                }
            }
            Ok(Outcome::Inseparable { .. }) => drop(fields.insert("meaning".into(), json!(INSEPARABLE))),
            Ok(Outcome::Unsettled { reason, tried }) => {
                fields.insert("reason".into(), json!(reason_words(reason)));
                fields.insert("tried".into(), json!(tried));
                fields.insert("would_help".into(), json!(help_words(reason).trim_start_matches("what would help: ")));
            }
        }
        if let Some(witness) = self.witness() {
            fields.insert("witness".into(), worst_case::summary(witness, &self.statement));
        }
        match &self.set {
            Some(Ok(proof)) => drop(fields.insert("set".into(), set_value(proof))),
            Some(Err(reason)) => drop(fields.insert("no_set".into(), json!(reason))),
            None => {}
        }
        Value::Object(fields)
    }
}

fn set_value(proof: &Proof) -> Value {
    match &proof.statement().claim {
        Claim::Region(region) => {
            json!({ "from": region.from.to_string(), "from_decimal": decimal_value(&region.from) })
        }
        Claim::Never { .. } | Claim::Enters { .. } | Claim::Eventually { .. } | Claim::Inseparable => Value::Null,
    }
}
