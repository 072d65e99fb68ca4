//! Many trajectories: sets of starts, disturbances, uncertain quantities.
//!
//! A floating-point scan says how large each functional can become and when; what it says is then proved, by cells and a tail or
//! by a worst trajectory, and accepted by the checker before it is returned.

mod approx;
mod plan;
mod prove;
mod scan;
mod witness;

use crate::enclosure::approx_value;
use crate::options::Options;
use crate::outcome::{Error, Margin, Outcome, Place, Proof, Reason};
use keepout_checker::certificate::{Certificate, Evidence};
use keepout_checker::formula::{IndexedFormula, claimed_formula};
use keepout_checker::many::{Division, Functional, Ranges};
use keepout_checker::number::Rational;
use keepout_checker::statement::{Atom, Claim, Formula, Relation, Statement};
use keepout_checker::substitution::whole;
use num_traits::{One, Signed, Zero};
use plan::{NoPlan, Plan};
use prove::{Goal, Stuck, prove};
use scan::{Scan, rounded_near};

/// Mantissa bits that are tried one after the other.
const PRECISIONS: [u32; 3] = [128, 256, 512];

/// Bounds of the groups' forms are larger than their suprema at samples by this factor.
const SPARE: f64 = 1.05;

/// The most pieces of a division.
const MAX_PIECES: usize = 4_096;

/// An affine function's certified extreme: the supremum (or the infimum) is between the two numbers.
pub struct Peak {
    /// Not below the extreme: of a maximum proved by `never`, of a minimum by an entry.
    pub upper: Option<(Rational, Box<Proof>)>,
    /// Not above the extreme.
    pub lower: Option<(Rational, Box<Proof>)>,
    /// Why a side is missing.
    pub reason: Option<String>,
}

/// Settles the zone of a statement about many trajectories.
pub(crate) fn settle_many(statement: &Statement, options: &Options) -> Result<Outcome, Error> {
    let mut search = Search::new(statement, options);
    match search.settle() {
        Verdict::Clear(certificate) => {
            let mut proof = Proof::new(*certificate, &options.limits).map_err(Error::Refused)?;
            let mut margin = None;
            if let Some((wide, found)) = options.margin.then(|| search.margin(&proof)).flatten() {
                proof = wide;
                margin = Some(found);
            }
            Ok(Outcome::Clear { proof: Box::new(proof), margin })
        }
        Verdict::Enters(certificate) => {
            let proof = Proof::new(*certificate, &options.limits).map_err(Error::Refused)?;
            Ok(Outcome::Enters { proof: Box::new(proof) })
        }
        Verdict::Open(reason) => {
            let used = options.effort - search.effort;
            let tried = format!(
                "bounds on cells of time and worst trajectories; {used} of {} units of work used",
                options.effort
            );
            Ok(Outcome::Unsettled { reason, tried })
        }
    }
}

enum Verdict {
    Clear(Box<Certificate>),
    Enters(Box<Certificate>),
    Open(Reason),
}

/// What a scan of one piece says.
struct Analysis {
    plan: Plan,
    scan: Scan,
    /// Bounds of the groups' forms.
    bounds: Vec<Rational>,
    /// How far the zone is from being reached, and when it is nearest (infinity: in the limit).
    nearest: (f64, f64),
}

struct Search<'a> {
    statement: Statement,
    formula: IndexedFormula,
    functionals: Vec<Functional>,
    options: &'a Options,
    effort: u64,
    supremum: Option<(f64, f64)>,
    /// Whether scans go on where the zone is met.
    looks_at_all: bool,
}

impl<'a> Search<'a> {
    fn new(statement: &Statement, options: &'a Options) -> Self {
        let claim = Claim::Never { margin: Rational::zero() };
        Self::of(Statement { claim, ..statement.clone() }, options)
    }

    fn of(statement: Statement, options: &'a Options) -> Self {
        let claimed = claimed_formula(&statement).unwrap_or_else(|| statement.zone.inside.clone());
        let formula = IndexedFormula::new(&claimed);
        let mut functionals = Vec::new();
        atoms(&claimed, &mut |atom| {
            let position = formula.polynomials.iter().position(|p| *p == atom.polynomial).unwrap_or(0);
            for weight in orientations(atom.relation) {
                let functional = Functional { polynomials: vec![(position, weight)], variables: Vec::new() };
                if !functionals.contains(&functional) {
                    functionals.push(functional);
                }
            }
        });
        Self { statement, formula, functionals, options, effort: options.effort, supremum: None, looks_at_all: false }
    }

    fn settle(&mut self) -> Verdict {
        let mut last = Reason::Effort { clear_until: Rational::zero() };
        for bits in PRECISIONS {
            match self.attempt(bits) {
                Verdict::Open(reason) => last = reason,
                settled => return settled,
            }
        }
        Verdict::Open(last)
    }

    /// One precision: divides what is admissible until each piece is proved, or some piece shows an entry.
    fn attempt(&mut self, bits: u32) -> Verdict {
        let mut divisions = Vec::new();
        let mut open: Vec<Ranges> = vec![whole(&self.statement)];
        while let Some(ranges) = open.pop() {
            let analysis = match self.analyse(&ranges, bits) {
                Ok(analysis) => analysis,
                Err(reason) => return Verdict::Open(*reason),
            };
            let (distance, at) = analysis.nearest;
            if distance >= -1e-9 * analysis.scan.scale
                && let Some(certificate) = self.entry(&ranges, &analysis, bits)
            {
                return Verdict::Enters(Box::new(certificate));
            }
            let bounded = analysis.bounds.len() == analysis.plan.forms();
            let stuck = if distance <= 1e-7 * analysis.scan.scale && bounded {
                match self.piece(&analysis) {
                    Ok(piece) => {
                        if self.supremum.is_none_or(|(best, _)| distance > best) {
                            self.supremum = Some((distance, at));
                        }
                        divisions.push(Division::Piece(piece));
                        continue;
                    }
                    Err(stuck) => Some(stuck),
                }
            } else {
                None
            };
            match self.widest_axis(&ranges) {
                Some((axis, middle))
                    if divisions.len() + open.len() < MAX_PIECES && !analysis.plan.groups.is_empty() =>
                {
                    divisions.push(Division::Cut(axis, middle.clone()));
                    let (mut lower, mut upper) = (ranges.clone(), ranges);
                    lower[axis].to.clone_from(&middle);
                    upper[axis].from = middle;
                    open.push(upper);
                    open.push(lower);
                }
                _ => return Verdict::Open(self.open_reason(stuck)),
            }
        }
        Verdict::Clear(Box::new(Certificate {
            statement: self.statement.clone(),
            bits,
            families: Vec::new(),
            traces: Vec::new(),
            auxiliaries: Vec::new(),
            identities: Vec::new(),
            sums: Vec::new(),
            evidence: Evidence::Many(divisions),
        }))
    }

    fn open_reason(&self, stuck: Option<Stuck>) -> Reason {
        match stuck {
            Some(Stuck { at }) if self.effort > 0 => {
                Reason::Touches { from: rounded_near(at), to: rounded_near(at * (1.0 + 1e-6) + 1e-9) }
            }
            _ => Reason::Effort { clear_until: Rational::zero() },
        }
    }

    fn widest_axis(&self, ranges: &Ranges) -> Option<(usize, Rational)> {
        let whole = whole(&self.statement);
        let width = |i: usize| {
            let all = approx_value(&(&whole[i].to - &whole[i].from));
            if all > 0.0 { approx_value(&(&ranges[i].to - &ranges[i].from)) / all } else { 0.0 }
        };
        let cuttable = (0..self.statement.uncertain.len()).filter(|i| !self.statement.uncertain[*i].varying);
        let axis = cuttable.filter(|i| width(*i) > 1e-6).max_by(|a, b| width(*a).total_cmp(&width(*b)))?;
        Some((axis, ranges[axis].centre()))
    }

    fn analyse(&self, ranges: &Ranges, bits: u32) -> Result<Analysis, Box<Reason>> {
        let no_plan = |fault: NoPlan| match fault {
            NoPlan::Rejected(rejection) => Box::new(Reason::Limit(rejection)),
            NoPlan::NotAffine => Box::new(Reason::NotAffine),
        };
        let limits = &self.options.limits;
        let polynomials = &self.formula.polynomials;
        let mut plan = Plan::new(&self.statement, ranges, &self.functionals, polynomials, (bits, false), limits)
            .map_err(no_plan)?;
        let first = plan.inputs.signals.len() - plan.groups.len();
        let mut sizes: Vec<f64> = plan.inputs.signals.iter().map(|(_, w)| approx_value(w)).collect();
        for (k, group) in plan.groups.iter().enumerate() {
            if let Some(constant) = group.constant() {
                let size = &group.deviation * constant.abs();
                sizes[first + k] = approx_value(&size);
                plan.inputs.signals[first + k].1 = size;
            }
        }
        let from = approx_value(&self.statement.zone.from);
        let until = self.statement.zone.until.as_ref().map(approx_value);
        let forms = plan.forms();
        let mut scan = Scan::new(&plan, sizes.clone(), until, |sample| {
            !self.looks_at_all && forms == 0 && sample.t >= from && self.inside(&|i| sample.values[i]) > 0.0
        });
        let mut bounds = Vec::new();
        if forms > 0 {
            // Bounds that imply themselves: B = sup of the form with the groups as inputs of size d B.
            let varying: Vec<usize> = (0..plan.groups.len()).filter(|k| plan.groups[*k].constant().is_none()).collect();
            let deviations: Vec<f64> = varying.iter().map(|k| approx_value(&plan.groups[*k].deviation)).collect();
            let mut values = vec![0.0_f64; forms];
            let mut settled = false;
            for _ in 0..60 {
                for ((k, d), b) in varying.iter().zip(&deviations).zip(&values) {
                    scan.sizes[first + k] = d * b;
                }
                scan.renew();
                let next: Vec<f64> = (0..forms).map(|i| scan.largest(i, 0.0)).collect();
                if next.iter().any(|x| !x.is_finite() || *x > 1e9 * (1.0 + scan.scale)) {
                    break;
                }
                let close = next.iter().zip(&values).all(|(a, b)| (a - b).abs() <= 1e-4 * a.abs().max(1e-300));
                values = next;
                if close {
                    settled = true;
                    break;
                }
            }
            if settled {
                for ((k, d), b) in varying.iter().zip(&deviations).zip(&values) {
                    let bound = rounded_near(b * SPARE + 1e-12);
                    scan.sizes[first + k] = d * (b * SPARE + 1e-12);
                    plan.inputs.signals[first + k].1 = &plan.groups[*k].deviation * &bound;
                    bounds.push(bound);
                }
                scan.renew();
            } else {
                varying.iter().for_each(|k| scan.sizes[first + k] = 0.0);
                scan.renew();
            }
        }
        let nearest = self.nearest(&scan, forms, from);
        Ok(Analysis { plan, scan, bounds, nearest })
    }

    /// How far inside the zone the largest value at an instant is: positive inside, for one-sided zones exactly.
    fn inside(&self, value: &dyn Fn(usize) -> f64) -> f64 {
        let claimed = claimed_formula(&self.statement).unwrap_or_else(|| self.statement.zone.inside.clone());
        depth(&claimed, &|atom| {
            let position = self.formula.polynomials.iter().position(|p| *p == atom.polynomial).unwrap_or(0);
            let weights = orientations(atom.relation);
            let find = |w: &Rational| self.functionals.iter().position(|f| f.polynomials[0] == (position, w.clone()));
            weights.iter().filter_map(find).map(value).fold(f64::INFINITY, f64::min)
        })
    }

    fn nearest(&self, scan: &Scan, forms: usize, from: f64) -> (f64, f64) {
        if let [_] = self.functionals.as_slice() {
            return scan.supremum(forms, from);
        }
        let mut best = (f64::NEG_INFINITY, from);
        for sample in scan.samples.iter().filter(|s| s.t >= from) {
            let here = self.inside(&|i| sample.values[forms + i]);
            if here > best.0 {
                best = (here, sample.t);
            }
        }
        if scan.limits.iter().skip(forms).all(Option::is_some) && !scan.limits.is_empty() {
            let late = self.inside(&|i| scan.limits[forms + i].unwrap_or(f64::INFINITY));
            if late > best.0 {
                best = (late, f64::INFINITY);
            }
        }
        // Between samples: about the greatest.
        let step = scan.stride(best.1.min(1e300)) / 8.0;
        if best.1.is_finite() {
            for i in -16_i32..=16 {
                let t = best.1 + step * f64::from(i) / 16.0;
                if t >= from && self.statement.zone.until.as_ref().is_none_or(|u| t <= approx_value(u)) {
                    let here = self.inside(&|k| scan.value_at(forms + k, t));
                    if here > best.0 {
                        best = (here, t);
                    }
                }
            }
        }
        best
    }

    fn piece(&mut self, analysis: &Analysis) -> Result<keepout_checker::many::Piece, Stuck> {
        let zone = &self.statement.zone;
        let scale = analysis.scan.scale.max(1e-300);
        let distance = (-analysis.nearest.0).max(1e-13 * scale);
        let horizon = analysis.scan.samples.last().map_or(1.0, |s| s.t).max(1e-300);
        let goal = Goal {
            formula: &self.formula,
            from: &zone.from,
            until: zone.until.as_ref(),
            bounds: analysis.bounds.clone(),
            slack: distance / 4.0,
            horizon,
        };
        prove(&analysis.plan, &analysis.scan, &goal, &mut self.effort, &self.options.limits)
    }

    /// The certificate of a worst trajectory, if one is in the zone.
    fn entry(&mut self, ranges: &Ranges, analysis: &Analysis, bits: u32) -> Option<Certificate> {
        let count = self.statement.uncertain.len();
        let values: Vec<Rational> = ranges[..count].iter().map(|r| r.centre()).collect();
        let forms = analysis.plan.forms();
        let from = approx_value(&self.statement.zone.from);
        let until = self.statement.zone.until.as_ref();
        let mut times: Vec<f64> = Vec::new();
        let (_, at) = analysis.nearest;
        if at.is_finite() {
            times.push(at);
        }
        // The instants that are farthest inside.
        let mut inside: Vec<(f64, f64)> = (analysis.scan.samples.iter())
            .filter(|s| s.t >= from)
            .map(|s| (self.inside(&|i| s.values[forms + i]), s.t))
            .filter(|(depth, _)| *depth > 0.0)
            .collect();
        inside.sort_by(|a, b| b.0.total_cmp(&a.0));
        times.extend(inside.iter().take(2).map(|(_, t)| *t));
        for t in times {
            self.effort = self.effort.checked_sub(10)?;
            let grain = if t > 0.0 { t * 1e-9 } else { 1.0 };
            let mut at = witness::instant(t, grain).max(self.statement.zone.from.clone());
            if let Some(until) = until {
                at = at.min(until.clone());
            }
            for index in 0..self.functionals.len() {
                let choice =
                    witness::worst(&analysis.plan, &analysis.scan, forms + index, &at, &self.statement, values.clone());
                let zone = IndexedFormula::new(&self.statement.zone.inside);
                let found = witness::certificate(&choice, &self.statement, &zone, bits, &self.options.limits);
                if let Some(certificate) = found
                    && keepout_checker::check(&certificate.statement, &certificate, &self.options.limits).is_ok()
                {
                    return Some(certificate);
                }
            }
        }
        None
    }

    /// The proof of the zone widened by nearly the distance to it.
    fn margin(&mut self, proof: &Proof) -> Option<(Proof, Margin)> {
        let Formula::Atom(atom) = &self.statement.zone.inside else { return None };
        if matches!(atom.relation, Relation::Zero | Relation::NonZero) || !proof.certificate().sums.is_empty() {
            return None;
        }
        let (distance, at) = self.supremum?;
        let place = if at.is_finite() { Place::Near(rounded_near(at)) } else { Place::Late };
        if distance >= 0.0 {
            let margin = Margin { certified: Rational::zero(), at_most: None, place };
            return Some((proof.clone(), margin));
        }
        // Over uncertain quantities the distance is that of bounds which overlap: less may be had.
        let parts = if self.statement.uncertain.is_empty() { [1e-7, 1e-6] } else { [1e-3, 0.3] };
        for part in parts {
            let wanted = rounded_near(-distance * (1.0 - part));
            let statement = Statement { claim: Claim::Never { margin: wanted.clone() }, ..self.statement.clone() };
            let mut search = Search::of(statement, self.options);
            if let Verdict::Clear(certificate) = search.settle()
                && let Ok(proof) = Proof::new(*certificate, &self.options.limits)
            {
                return Some((proof, Margin { certified: wanted, at_most: None, place }));
            }
        }
        Some((proof.clone(), Margin { certified: Rational::zero(), at_most: None, place }))
    }
}

/// Certified bounds of the greatest value (`upward`) or the least value that the polynomial of the statement's zone, a single
/// comparison whose relation does not matter, takes along admissible trajectories in the window.
///
/// # Errors
/// [`Error::Refused`] if the checker refuses what the search found, which is a defect of the search.
pub fn peak(statement: &Statement, upward: bool, options: &Options) -> Result<Peak, Error> {
    let mut peak = Peak { upper: None, lower: None, reason: None };
    let Formula::Atom(atom) = &statement.zone.inside else {
        peak.reason = Some("the zone is not a single comparison".into());
        return Ok(peak);
    };
    let relation = |strict: bool| match (upward, strict) {
        (true, true) => Relation::Positive,
        (true, false) => Relation::NonNegative,
        (false, true) => Relation::Negative,
        (false, false) => Relation::NonPositive,
    };
    let about = |level: &Rational, strict: bool| {
        let mut about = statement.clone();
        let polynomial = shifted(&atom.polynomial, &-level);
        about.zone.inside = Formula::Atom(Atom { polynomial, relation: relation(strict) });
        about
    };
    let sign = if upward { Rational::one() } else { -Rational::one() };
    let mut search = Search::new(&about(&Rational::zero(), false), options);
    search.looks_at_all = true;
    let analysis = match search.analyse(&whole(statement), PRECISIONS[0]) {
        Ok(analysis) => analysis,
        Err(reason) => {
            peak.reason = Some(match *reason {
                Reason::NotAffine => "it is not affine in the states with constant coefficients".into(),
                Reason::Limit(rejection) => rejection.to_string(),
                _ => "the work allowed was used up".into(),
            });
            return Ok(peak);
        }
    };
    let grows = analysis.scan.limits.iter().any(Option::is_none) && statement.zone.until.is_none();
    let options = Options { margin: false, ..options.clone() };
    let scale = analysis.scan.scale.max(analysis.nearest.0.abs());
    let mut centre = analysis.nearest.0;
    if !statement.uncertain.is_empty() {
        centre = refine_uncertain(statement, &about, &options, centre);
    }
    if grows {
        peak.reason = Some("it grows without bound, as far as can be seen".into());
    } else {
        for part in [1e-8, 1e-7, 1e-6, 1e-5, 1e-4, 1e-3, 1e-2] {
            if !statement.uncertain.is_empty() && part < 1e-5 {
                continue;
            }
            let slack = part * if centre.abs() > 1e-6 * scale { centre.abs() } else { scale };
            let level = &sign * neat(centre + slack, slack);
            if let Outcome::Clear { proof, .. } = settle_many(&about(&level, true), &options)? {
                if upward {
                    peak.upper = Some((level, proof))
                } else {
                    peak.lower = Some((level, proof))
                }
                break;
            }
        }
        if peak.upper.is_none() && peak.lower.is_none() {
            peak.reason = Some("the work allowed was used up".into());
        }
    }
    for part in [1e-8, 1e-7, 1e-6, 1e-5, 1e-4, 1e-3, 1e-2] {
        let slack = part * if centre.abs() > 1e-6 * scale { centre.abs() } else { scale };
        let level = &sign * neat(centre - slack, slack);
        if let Outcome::Enters { proof } = settle_many(&about(&level, false), &options)? {
            if upward {
                peak.lower = Some((level, proof))
            } else {
                peak.upper = Some((level, proof))
            }
            break;
        }
    }
    Ok(peak)
}

/// The greatest value over a grid of the uncertain quantities: nearer to the truth than bounds over all of them.
fn refine_uncertain(
    statement: &Statement,
    about: &dyn Fn(&Rational, bool) -> Statement,
    options: &Options,
    fallback: f64,
) -> f64 {
    let mut best = f64::NEG_INFINITY;
    let all = whole(statement);
    let count = statement.uncertain.len();
    let side: usize = if count == 1 {
        17
    } else if count == 2 {
        7
    } else {
        3
    };
    for index in 0..side.pow(count.min(6) as u32) {
        let mut rest = index;
        let mut point = all.clone();
        for range in point.iter_mut().take(count) {
            let part = Rational::new(((rest % side) as i64).into(), ((side - 1) as i64).into());
            rest /= side;
            let value = &range.from + (&range.to - &range.from) * part;
            range.from.clone_from(&value);
            range.to = value;
        }
        let search = Search::new(&about(&Rational::zero(), false), options);
        if let Ok(analysis) = search.analyse(&point, PRECISIONS[0]) {
            best = best.max(analysis.nearest.0);
        }
    }
    if best.is_finite() { best } else { fallback }
}

/// A short decimal near a number, within a tenth of the slack.
fn neat(x: f64, slack: f64) -> Rational {
    let digits = (1.0 - (slack / 10.0).log10().floor()).clamp(-300.0, 300.0) as i32;
    let ten = Rational::from_integer(10.into());
    let power = (0..digits.unsigned_abs()).fold(Rational::one(), |p, _| p * &ten);
    let power = if digits < 0 { power.recip() } else { power };
    (rounded_near(x) * &power).round() / power
}

fn shifted(p: &keepout_checker::statement::Expression, constant: &Rational) -> keepout_checker::statement::Expression {
    let mut terms = p.terms.clone();
    match terms.iter_mut().find(|t| t.powers.is_empty()) {
        Some(term) => term.coefficient += constant,
        None => terms.push(keepout_checker::statement::Term { coefficient: constant.clone(), powers: Vec::new() }),
    }
    terms.retain(|t| !t.coefficient.is_zero());
    keepout_checker::statement::Expression { terms }
}

fn atoms<'f>(formula: &'f Formula, visit: &mut dyn FnMut(&'f Atom)) {
    match formula {
        Formula::Atom(atom) => visit(atom),
        Formula::And(parts) | Formula::Or(parts) => parts.iter().for_each(|p| atoms(p, visit)),
    }
}

/// The factors that make an atom's polynomial positive where the atom holds.
fn orientations(relation: Relation) -> Vec<Rational> {
    match relation {
        Relation::Positive | Relation::NonNegative => vec![Rational::one()],
        Relation::Negative | Relation::NonPositive => vec![-Rational::one()],
        Relation::Zero => vec![Rational::one(), -Rational::one()],
        Relation::NonZero => Vec::new(),
    }
}

fn depth(formula: &Formula, value: &dyn Fn(&Atom) -> f64) -> f64 {
    match formula {
        Formula::Atom(atom) => value(atom),
        Formula::And(parts) => parts.iter().map(|p| depth(p, value)).fold(f64::INFINITY, f64::min),
        Formula::Or(parts) => parts.iter().map(|p| depth(p, value)).fold(f64::NEG_INFINITY, f64::max),
    }
}
