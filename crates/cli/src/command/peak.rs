//! `keepout peak`: certified bounds of the extreme values of an expression.

use super::certify::{bracket, quoted, unit_of};
use super::{CLEAR, UNSETTLED, WRONG, complain, loaded, print};
use crate::diagnostic::Diagnostics;
use crate::model::{Model, Need};
use crate::number::{Rounding, rounded, rounded_float};
use keepout_checker::statement::{
    Atom, Claim, Expression, Formula, Rational, Relation, Statement, Term, Variable, Zone,
};
use keepout_synthesis::{Options, Peak, Proof, peak};
use num_traits::{Signed, Zero};
use serde_json::{Map, Value, json};
use std::collections::BTreeMap;
use std::fmt::Write as _;
use std::panic::AssertUnwindSafe;
use std::path::{Path, PathBuf};

/// The arguments of the command.
#[derive(Debug, clap::Args)]
pub struct Arguments {
    /// The model, a TOML file; it needs no zone
    pub model: PathBuf,
    /// What to bound: an expression that is affine in states, drives, outputs and t
    #[arg(long, value_name = "EXPRESSION", allow_hyphen_values = true)]
    pub of: String,
    /// The first instant that counts; 0 if it is left out
    #[arg(long, value_name = "T", allow_hyphen_values = true)]
    pub from: Option<String>,
    /// The last instant that counts; for all time if it is left out
    #[arg(long, value_name = "T", allow_hyphen_values = true)]
    pub until: Option<String>,
    /// Write statement and certificate of each bound into this folder
    #[arg(long, value_name = "DIR")]
    pub out: Option<PathBuf>,
    /// Print one JSON object instead of text
    #[arg(long)]
    pub json: bool,
    /// How much work to spend on each bound before giving up; a whole number, the same everywhere
    #[arg(long, value_name = "N", default_value_t = Options::default().effort)]
    pub effort: u64,
}

/// Runs the command; returns the exit status.
pub fn run(arguments: &Arguments) -> u8 {
    let Some(model) = loaded(&arguments.model, Need::Nothing) else { return WRONG };
    let statement = match question(&model, arguments) {
        Ok(statement) => statement,
        Err(message) => {
            complain(&message);
            return WRONG;
        }
    };
    let options = Options { effort: arguments.effort, ..Options::default() };
    let side = |kind| Extreme { kind, found: find(&statement, kind, &options) };
    let (max, min) = rayon::join(|| side(Kind::Maximum), || side(Kind::Minimum));
    let extremes = [max, min];
    if let Some(folder) = &arguments.out
        && let Err(message) = extremes.iter().try_for_each(|e| e.write(folder))
    {
        complain(&format!("{message}\n"));
        return WRONG;
    }
    let status = if extremes.iter().all(Extreme::is_bounded) { CLEAR } else { UNSETTLED };
    let report = match arguments.json {
        true => report_json(&statement, &arguments.of, &extremes),
        false => report_text(&statement, &arguments.of, &extremes, arguments.out.as_deref()),
    };
    print(&report, status)
}

/// The statement with the zone EXPRESSION >= 0, or what is wrong with the command.
fn question(model: &Model, arguments: &Arguments) -> Result<Statement, String> {
    let told = |d: Diagnostics| d.to_string();
    let polynomial = model.affine(&arguments.of, "--of").map_err(told)?;
    let time = |text: &Option<String>, option: &str| -> Result<Option<Rational>, String> {
        let Some(text) = text else { return Ok(None) };
        let value = model.number(text, option).map_err(told)?;
        if value.is_negative() {
            return Err(format!("{option} is a time >= 0, found {value}: t counts from 0, when the model starts\n"));
        }
        Ok(Some(value))
    };
    let from = time(&arguments.from, "--from")?.unwrap_or_else(Rational::zero);
    let until = time(&arguments.until, "--until")?;
    if let Some(end) = until.as_ref().filter(|end| **end < from) {
        return Err(format!("the window ends at {end}, before it begins at {from}: choose --until >= --from\n"));
    }
    Ok(model.about(zone(polynomial, &arguments.of, from, until)))
}

fn zone(polynomial: Expression, of: &str, from: Rational, until: Option<Rational>) -> Zone {
    let inside = Formula::Atom(Atom { polynomial, relation: Relation::NonNegative });
    Zone { name: "peak".into(), reference: Some(of.to_string()), inside, from, until }
}

/// Which extreme.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
enum Kind {
    Maximum,
    Minimum,
}

/// Which bound of an extreme.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
enum Side {
    Upper,
    Lower,
}

const SIDES: [Side; 2] = [Side::Upper, Side::Lower];

impl Kind {
    fn word(self) -> &'static str {
        match self {
            Self::Maximum => "maximum",
            Self::Minimum => "minimum",
        }
    }

    fn key(self) -> &'static str {
        match self {
            Self::Maximum => "max",
            Self::Minimum => "min",
        }
    }

    /// The bound that no trajectory exceeds; the other one is reached by some.
    fn outer(self) -> Side {
        match self {
            Self::Maximum => Side::Upper,
            Self::Minimum => Side::Lower,
        }
    }

    fn inner(self) -> Side {
        match self {
            Self::Maximum => Side::Lower,
            Self::Minimum => Side::Upper,
        }
    }
}

impl Side {
    fn of(self, found: &Peak) -> Option<(&Rational, &Proof)> {
        let bound = match self {
            Self::Upper => &found.upper,
            Self::Lower => &found.lower,
        };
        bound.as_ref().map(|(value, proof)| (value, proof.as_ref()))
    }

    fn key(self) -> &'static str {
        match self {
            Self::Upper => "upper",
            Self::Lower => "lower",
        }
    }

    /// Decimals of a bound are bounds too.
    fn rounding(self) -> Rounding {
        match self {
            Self::Upper => Rounding::Up,
            Self::Lower => Rounding::Down,
        }
    }

    fn words(self, value: &Rational, unit: &str) -> String {
        let decimal = rounded(value, 9, self.rounding());
        match self {
            Self::Upper => format!("at most {decimal}{unit}"),
            Self::Lower => format!("at least {decimal}{unit}"),
        }
    }
}

/// The bounds; a defect of the program leaves them open.
fn find(statement: &Statement, kind: Kind, options: &Options) -> Peak {
    let search = || peak(statement, kind == Kind::Maximum, options);
    let nothing = |reason: String| Peak { upper: None, lower: None, reason: Some(reason) };
    match std::panic::catch_unwind(AssertUnwindSafe(search)) {
        Ok(found) => found.map_or_else(|e| nothing(e.to_string()), |found| proved(found, statement, kind)),
        Err(_) => nothing("a defect of this program stopped the search; please report the model".into()),
    }
}

/// The bounds without those that their proofs do not say: what is told follows from what was verified, not from the search.
fn proved(found: Peak, question: &Statement, kind: Kind) -> Peak {
    let keep = |bound: Option<(Rational, Box<Proof>)>, side| bound.filter(|(v, p)| says(p, v, question, (kind, side)));
    let told = SIDES.map(|side| side.of(&found).is_some());
    let Peak { upper, lower, reason } = found;
    let (upper, lower) = (keep(upper, Side::Upper), keep(lower, Side::Lower));
    let is_kept = [upper.is_some(), lower.is_some()] == told;
    let defect = "a defect of this program: a proof is not about the bound that was found; please report the model";
    Peak { upper, lower, reason: if is_kept { reason } else { Some(defect.into()) } }
}

/// Whether a proof is about the question's expression p, system and window, and implies the bound: of a maximum `p <= value` always,
/// or `p >= value` at some instant; of a minimum the same with the signs turned.
fn says(proof: &Proof, value: &Rational, question: &Statement, (kind, side): (Kind, Side)) -> bool {
    let said = proof.statement();
    let zone = Zone { inside: question.zone.inside.clone(), ..said.zone.clone() };
    let same_system = Statement { zone, claim: question.claim.clone(), ..said.clone() } == *question;
    let (Formula::Atom(said_atom), Formula::Atom(atom)) = (&said.zone.inside, &question.zone.inside) else {
        return false;
    };
    let ((said_terms, said_constant), (terms, constant)) = (parts(&said_atom.polynomial), parts(&atom.polynomial));
    if !same_system || said_terms != terms {
        return false;
    }
    // The zone is `p > level` or `p >= level`, of a minimum `p < level` or `p <= level`.
    let level = constant - said_constant;
    let upward = match said_atom.relation {
        Relation::Positive | Relation::NonNegative => true,
        Relation::Negative | Relation::NonPositive => false,
        Relation::Zero | Relation::NonZero => return false,
    };
    let is_enough = if side == Side::Upper { *value >= level } else { *value <= level };
    let is_claimed = match &said.claim {
        // Not in the zone: so p is at most, of a minimum at least, the level. A margin says more.
        Claim::Never { .. } => side == kind.outer(),
        Claim::Enters { .. } => side == kind.inner(),
        Claim::Eventually { .. } | Claim::Inseparable | Claim::Region(_) => false,
    };
    is_enough && is_claimed && upward == (kind == Kind::Maximum)
}

/// Coefficients of products of powers.
type Coefficients<'a> = BTreeMap<&'a [(Variable, u32)], &'a Rational>;

/// The terms of a polynomial that are not constant, and its constant.
fn parts(polynomial: &Expression) -> (Coefficients<'_>, Rational) {
    let is_constant = |term: &&Term| term.powers.is_empty();
    let varying = polynomial.terms.iter().filter(|t| !is_constant(t));
    let constant = polynomial.terms.iter().find(is_constant).map_or_else(Rational::zero, |t| t.coefficient.clone());
    (varying.map(|t| (t.powers.as_slice(), &t.coefficient)).collect(), constant)
}

/// An extreme and its bounds.
struct Extreme {
    kind: Kind,
    found: Peak,
}

impl Extreme {
    fn bound(&self, side: Side) -> Option<(&Rational, &Proof)> {
        side.of(&self.found)
    }

    fn is_bounded(&self) -> bool {
        SIDES.iter().all(|side| self.bound(*side).is_some())
    }

    fn reason(&self) -> &str {
        self.found.reason.as_deref().unwrap_or("no reason was given")
    }

    /// Whether the search says that no bound exists. That is no proof, as its reason tells.
    fn is_unbounded(&self) -> bool {
        self.bound(self.kind.outer()).is_none() && self.reason().contains("without bound")
    }

    /// The bracket of the instant at which the bound that is reached is reached.
    fn instant(&self) -> Option<(&Rational, &Rational)> {
        match &self.bound(self.kind.inner())?.1.statement().claim {
            Claim::Enters { from, to, .. } => Some((from, to)),
            Claim::Never { .. } | Claim::Eventually { .. } | Claim::Inseparable | Claim::Region(_) => None,
        }
    }

    fn in_words(&self, unit: &str) -> String {
        let sides = [self.kind.outer(), self.kind.inner()];
        let bounds = sides.iter().filter_map(|side| self.bound(*side).map(|(value, _)| side.words(value, unit)));
        let mut parts: Vec<String> = bounds.collect();
        if let (Some((from, to)), Some(last)) = (self.instant(), parts.last_mut()) {
            let _ = write!(last, " ({})", bracket(from, to));
        }
        if !self.is_bounded() {
            parts.push(match parts.is_empty() && !self.is_unbounded() {
                true => format!("open: {}", self.reason()),
                false => self.reason().to_string(),
            });
        }
        parts.join(", ")
    }

    fn json(&self) -> Value {
        let mut fields = Map::new();
        if self.is_unbounded() {
            fields.insert("unbounded".into(), json!(true));
        }
        for side in SIDES {
            let value = self.bound(side).map(|(value, _)| value);
            fields.insert(side.key().into(), json!(value.map(Rational::to_string)));
            let decimal = value.and_then(|v| rounded_float(v, side.rounding()));
            fields.insert(format!("{}_decimal", side.key()), json!(decimal));
        }
        let at = self.instant();
        fields.insert("at".into(), json!(at.map(|(from, _)| from.to_string())));
        fields.insert("at_decimal".into(), json!(at.and_then(|(from, _)| rounded_float(from, Rounding::Down))));
        if !self.is_bounded() {
            fields.insert("reason".into(), json!(self.reason()));
        }
        Value::Object(fields)
    }

    fn file(&self, side: Side, what: &str) -> String {
        format!("{}-{}.{what}.json", self.kind.key(), side.key())
    }

    /// Writes the evidence; that of an earlier run does not stay where there is none.
    fn write(&self, folder: &Path) -> Result<(), String> {
        let failed = |path: &Path, e: std::io::Error| format!("cannot write {}: {e}", path.display());
        std::fs::create_dir_all(folder).map_err(|e| failed(folder, e))?;
        for side in SIDES {
            let proof = self.bound(side).map(|(_, proof)| proof);
            let texts = [
                ("statement", proof.map(|p| p.statement().to_json().print())),
                ("certificate", proof.map(|p| p.certificate().to_json().print())),
            ];
            for (what, text) in texts {
                let path = folder.join(self.file(side, what));
                match text {
                    Some(text) => std::fs::write(&path, text).map_err(|e| failed(&path, e))?,
                    None if path.exists() => std::fs::remove_file(&path).map_err(|e| failed(&path, e))?,
                    None => {}
                }
            }
        }
        Ok(())
    }
}

fn report_text(statement: &Statement, of: &str, extremes: &[Extreme], out: Option<&Path>) -> String {
    let mut text = format!("{}\n", statement.title);
    let unit = unit_of(statement).map_or(String::new(), |u| format!(" {u}"));
    let width = of.chars().count();
    for (i, extreme) in extremes.iter().enumerate() {
        let label = if i == 0 { of } else { "" };
        let _ = writeln!(text, "  {label:width$}  {}  {}", extreme.kind.word(), extreme.in_words(&unit));
    }
    let Some(folder) = out else { return text };
    let bounds = || extremes.iter().flat_map(|e| SIDES.map(|side| (e, side)));
    if bounds().any(|(e, side)| e.bound(side).is_some()) {
        let _ = writeln!(text, "evidence in {}; to re-check it:", folder.display());
    }
    for (extreme, side) in bounds().filter(|(e, side)| e.bound(*side).is_some()) {
        let file = |what: &str| quoted(&folder.join(extreme.file(side, what)));
        let _ = writeln!(text, "  keepout-check {} {}", file("statement"), file("certificate"));
    }
    text
}

fn report_json(statement: &Statement, of: &str, extremes: &[Extreme]) -> String {
    let zone = &statement.zone;
    let mut report = json!({
        "program": "keepout", "version": env!("CARGO_PKG_VERSION"), "title": statement.title, "of": of,
        "unit": unit_of(statement), "from": zone.from.to_string(), "until": zone.until.as_ref().map(Rational::to_string),
    });
    for extreme in extremes {
        report[extreme.kind.key()] = extreme.json();
    }
    format!("{report:#}\n")
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::model::load_text;
    use keepout_synthesis::{Outcome, certify};

    /// x = exp(-t): its maximum is 1, at t = 0.
    fn model(inside: &str) -> Model {
        let zone = format!("[[zone]]\nname = \"z\"\ninside = \"{inside}\"\n");
        let text = format!("title = \"Decay\"\n[state.x]\nstart = 1\nunit = \"rad\"\nrate = \"-x\"\n{zone}");
        load_text(&text, "m", "m", Path::new("."), Need::Zones).unwrap_or_else(|d| panic!("{d}"))
    }

    fn proof(inside: &str) -> Box<Proof> {
        let options = Options { margin: false, ..Options::default() };
        match certify(&model(inside).statement(0), &options) {
            Ok(Outcome::Clear { proof, .. } | Outcome::Enters { proof }) => proof,
            other => panic!("{inside}: {other:?}"),
        }
    }

    fn maximum() -> Extreme {
        let third = |p: i64| Rational::new(p.into(), 3.into());
        let found = Peak {
            upper: Some((third(4), proof("x > 4/3"))),
            lower: Some((third(2), proof("x >= 2/3 and t = 0"))),
            reason: None,
        };
        Extreme { kind: Kind::Maximum, found }
    }

    fn open(reason: &str) -> Extreme {
        Extreme { kind: Kind::Minimum, found: Peak { upper: None, lower: None, reason: Some(reason.into()) } }
    }

    fn statement() -> Statement {
        let model = model("x > 2");
        let polynomial = model.affine("x", "--of").unwrap_or_else(|d| panic!("{d}"));
        model.about(zone(polynomial, "x", Rational::zero(), None))
    }

    /// A proof about the zone with this condition, named as that of a question.
    fn proof_for(condition: &str) -> Box<Proof> {
        let mut statement = statement();
        statement.zone.inside = model(condition).zones.remove(0).inside;
        match certify(&statement, &Options { margin: false, ..Options::default() }) {
            Ok(Outcome::Clear { proof, .. } | Outcome::Enters { proof }) => proof,
            other => panic!("{condition}: {other:?}"),
        }
    }

    #[test]
    fn a_bound_is_told_only_if_its_proof_says_it() {
        use Kind::{Maximum, Minimum};
        use Side::{Lower, Upper};
        let third = |p: i64| Rational::new(p.into(), 3.into());
        let holds = |condition: &str, p: i64, what| says(&proof_for(condition), &third(p), &statement(), what);
        // x = exp(-t) is never above 4/3, and 2/3 or more at t = 0.
        assert!(holds("x > 4/3", 4, (Maximum, Upper)) && holds("x >= 4/3", 5, (Maximum, Upper)));
        assert!(holds("x >= 2/3", 2, (Maximum, Lower)) && holds("x > 2/3", 1, (Maximum, Lower)));
        assert!(holds("x < -1/3", -1, (Minimum, Lower)) && holds("x <= 2/3", 2, (Minimum, Upper)));
        // More than what is proved.
        assert!(!holds("x > 4/3", 3, (Maximum, Upper)) && !holds("x >= 2/3", 3, (Maximum, Lower)));
        assert!(!holds("x < -1/3", 0, (Minimum, Lower)) && !holds("x <= 2/3", 1, (Minimum, Upper)));
        // Another claim, another side, another expression.
        assert!(!holds("x >= 2/3", 2, (Maximum, Upper)) && !holds("x > 4/3", 4, (Maximum, Lower)));
        assert!(!holds("x > 4/3", 4, (Minimum, Upper)) && !holds("x <= 2/3", 2, (Maximum, Lower)));
        assert!(!holds("2*x > 8/3", 8, (Maximum, Upper)) && !holds("x = 2", 6, (Maximum, Upper)));
        assert!(!holds("x > 4/3 and t > 5", 4, (Maximum, Upper)));
        // Another system, another window.
        let mut other = statement();
        other.states[0].start = third(1);
        assert!(!says(&proof_for("x > 4/3"), &third(4), &other, (Maximum, Upper)));
        other = statement();
        other.zone.until = Some(third(1));
        assert!(!says(&proof_for("x > 4/3"), &third(4), &other, (Maximum, Upper)));
    }

    #[test]
    fn a_bound_that_is_not_proved_is_left_out_and_called_a_defect() {
        let third = |p: i64| Rational::new(p.into(), 3.into());
        let found = |value: Rational| Peak {
            upper: Some((value, proof_for("x > 4/3"))),
            lower: Some((third(2), proof_for("x >= 2/3"))),
            reason: None,
        };
        let right = proved(found(third(4)), &statement(), Kind::Maximum);
        assert!(right.upper.is_some() && right.lower.is_some() && right.reason.is_none());
        let wrong = proved(found(third(3)), &statement(), Kind::Maximum);
        assert!(wrong.upper.is_none() && wrong.lower.is_some());
        assert!(wrong.reason.is_some_and(|r| r.starts_with("a defect of this program")));
    }

    #[test]
    fn bounds_are_told_with_decimals_that_are_bounds_too() {
        let text = report_text(&statement(), "x", &[maximum(), open("the work was used up")], Some(Path::new("out")));
        let wanted = "Decay\n  x  maximum  at most 1.33333334 rad, at least 0.666666666 rad (at t = 0)\n\
                      \u{20}    minimum  open: the work was used up\n\
                      evidence in out; to re-check it:\n\
                      \u{20} keepout-check out/max-upper.statement.json out/max-upper.certificate.json\n\
                      \u{20} keepout-check out/max-lower.statement.json out/max-lower.certificate.json\n";
        assert_eq!(text, wanted);
    }

    #[test]
    fn the_object_has_exact_bounds_and_decimals() {
        let text = report_json(&statement(), "x", &[maximum(), open("it grows without bound, as far as can be seen")]);
        let found: Value = serde_json::from_str(&text).expect("JSON");
        assert_eq!((&found["max"]["upper"], &found["max"]["lower"]), (&json!("4/3"), &json!("2/3")));
        assert_eq!((&found["max"]["at"], &found["max"]["at_decimal"]), (&json!("0"), &json!(0.0)));
        let decimal = |key: &str| found["max"][key].as_f64().and_then(Rational::from_float).expect("a number");
        let third = |p: i64| Rational::new(p.into(), 3.into());
        assert!(decimal("upper_decimal") > third(4) && decimal("lower_decimal") < third(2));
        assert!(found["max"].get("unbounded").is_none() && found["max"].get("reason").is_none());
        assert_eq!(found["min"]["unbounded"], json!(true));
        assert_eq!(found["min"]["reason"], json!("it grows without bound, as far as can be seen"));
        assert_eq!((&found["of"], &found["unit"], &found["until"]), (&json!("x"), &json!("rad"), &Value::Null));
    }

    #[test]
    fn what_is_open_is_not_called_unbounded() {
        let found = open("the work was used up").json();
        assert!(found.get("unbounded").is_none());
        assert_eq!((&found["upper"], &found["lower"]), (&Value::Null, &Value::Null));
    }

    #[test]
    fn evidence_is_written_for_each_bound_and_that_of_earlier_runs_is_removed() {
        let folder = std::env::temp_dir().join(format!("keepout-peak-{}", std::process::id()));
        maximum().write(&folder).expect("written");
        for name in ["max-upper", "max-lower"] {
            for what in ["statement", "certificate"] {
                assert!(folder.join(format!("{name}.{what}.json")).exists(), "{name} {what}");
            }
        }
        let nothing = Peak { upper: None, lower: None, reason: Some("open".into()) };
        Extreme { kind: Kind::Maximum, found: nothing }.write(&folder).expect("written");
        assert!(!folder.join("max-upper.certificate.json").exists());
        std::fs::remove_dir_all(&folder).expect("removed");
    }
}
