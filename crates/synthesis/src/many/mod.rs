//! Many trajectories: sets of starts, disturbances, uncertain quantities.
//!
//! A floating-point scan says how large each functional can become and when; what it says is then proved, by cells and a tail or
//! by a worst trajectory, and accepted by the checker before it is returned.

mod approx;
mod conjunction;
mod game;
mod plan;
mod prove;
mod scan;
mod witness;

use crate::enclosure::approx_value;
use crate::options::Options;
use crate::outcome::{Error, Margin, Outcome, Place, Proof, Reason};
use conjunction::{Conjunction, Half, Separation, conjunctions};
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
    functionals: Vec<Functional>,
}

/// What the games of the conjunctions say of a piece.
enum Separated {
    Apart(Box<Analysis>),
    Meets(Box<Certificate>),
    Unclear,
}

struct Search<'a> {
    statement: Statement,
    formula: IndexedFormula,
    /// The zone as a disjunction of conjunctions of half-spaces.
    conjunctions: Vec<Vec<Half>>,
    /// For each half-space its function.
    functionals: Vec<Functional>,
    /// Means that have been of use.
    means: Vec<Functional>,
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
        let position = |atom: &Atom| formula.polynomials.iter().position(|p| *p == atom.polynomial).unwrap_or(0);
        // Too many: each atom alone, as if all had to be refuted.
        let alone = || functionals.iter().map(|f| f.polynomials.iter().map(|(p, w)| (*p, w.is_positive())).collect());
        let conjunctions = conjunctions(&claimed, &position).unwrap_or_else(|| alone().collect());
        Self {
            statement,
            formula,
            conjunctions,
            functionals,
            means: Vec::new(),
            options,
            effort: options.effort,
            supremum: None,
            looks_at_all: false,
        }
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
            let mut analysis = match self.analyse(&ranges, &self.functionals, bits) {
                Ok(analysis) => analysis,
                Err(reason) => return Verdict::Open(*reason),
            };
            if analysis.nearest.0 >= -1e-9 * analysis.scan.scale && self.conjunctions.iter().any(|c| c.len() > 1) {
                match self.separated(&ranges, &analysis, bits) {
                    Separated::Apart(better) => analysis = *better,
                    Separated::Meets(certificate) => return Verdict::Enters(certificate),
                    Separated::Unclear => {}
                }
            }
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

    /// Means of half-spaces' functions where these alone do not show a conjunction to be false; or a mixture of trajectories.
    fn separated(&mut self, ranges: &Ranges, analysis: &Analysis, bits: u32) -> Separated {
        if !self.means.is_empty() {
            let all: Vec<Functional> = self.functionals.iter().chain(&self.means).cloned().collect();
            if let Ok(better) = self.analyse(ranges, &all, bits)
                && better.nearest.0 < -1e-9 * better.scan.scale
            {
                return Separated::Apart(Box::new(better));
            }
        }
        let from = approx_value(&self.statement.zone.from);
        let forms = analysis.plan.forms();
        let mut wanted: Vec<Functional> = Vec::new();
        for conjunction in self.conjunctions.clone() {
            let one = |half: &Half| Functional { polynomials: vec![(half.0, signed(half.1))], variables: Vec::new() };
            let find = |half: &Half| self.functionals.iter().position(|f| *f == one(half)).map(|i| forms + i);
            let Some(parts) = conjunction.iter().map(find).collect::<Option<Vec<usize>>>() else {
                return Separated::Unclear;
            };
            let game = Conjunction::new(&analysis.scan, parts.clone(), &analysis.scan.sizes, from);
            match game.separate(&mut self.effort) {
                Separation::Apart(means) => wanted.extend(means.iter().map(|w| mean(&conjunction, w))),
                Separation::Meets { at, mixture } if analysis.plan.groups.is_empty() => {
                    return self.met(ranges, analysis, (&game, at, &mixture), bits);
                }
                Separation::Meets { .. } | Separation::Unclear => {
                    // What uncertain terms may add is not known to be in reach: without it.
                    let mut sizes = analysis.scan.sizes.clone();
                    let first = sizes.len() - analysis.plan.groups.len();
                    sizes[first..].fill(0.0);
                    let game = Conjunction::new(&analysis.scan, parts, &sizes, from);
                    if let (false, Separation::Meets { at, mixture }) =
                        (analysis.plan.groups.is_empty(), game.separate(&mut self.effort))
                    {
                        return self.met(ranges, analysis, (&game, at, &mixture), bits);
                    }
                    return Separated::Unclear;
                }
            }
        }
        wanted.dedup();
        let Ok(better) = self.analyse(ranges, &wanted, bits) else { return Separated::Unclear };
        self.means.extend(wanted.into_iter().filter(|f| f.polynomials.len() > 1));
        Separated::Apart(Box::new(better))
    }

    /// The certificate of a mixture of trajectories, each the worst of a mean at an instant.
    fn met(
        &self,
        ranges: &Ranges,
        analysis: &Analysis,
        (game, at, mixture): (&Conjunction, f64, &[(f64, Vec<f64>)]),
        bits: u32,
    ) -> Separated {
        let values: Vec<Rational> = ranges[..self.statement.uncertain.len()].iter().map(|r| r.centre()).collect();
        let mut at = witness::instant(at, if at > 0.0 { at * 1e-9 } else { 1.0 }).max(self.statement.zone.from.clone());
        if let Some(until) = &self.statement.zone.until {
            at = at.min(until.clone());
        }
        let weights: Vec<Rational> = mixture.iter().map(|(w, _)| rounded_near(*w)).collect();
        let total: Rational = weights.iter().sum();
        let one = |(weight, (_, mean)): (Rational, &(f64, Vec<f64>))| {
            let along = game.along(mean);
            let choice = witness::worst(&analysis.plan, &along, 0, &at, &self.statement, values.clone());
            (weight / &total, choice)
        };
        let choices: Vec<(Rational, witness::Choice)> = weights.into_iter().zip(mixture).map(one).collect();
        let zone = IndexedFormula::new(&self.statement.zone.inside);
        let limits = &self.options.limits;
        let certificate = witness::blended(&choices)
            .and_then(|choice| witness::certificate(&choice, &self.statement, &zone, bits, limits))
            .filter(|c| keepout_checker::check(&c.statement, c, limits).is_ok());
        certificate.map_or(Separated::Unclear, |c| Separated::Meets(Box::new(c)))
    }

    fn analyse(&self, ranges: &Ranges, functionals: &[Functional], bits: u32) -> Result<Analysis, Box<Reason>> {
        let no_plan = |fault: NoPlan| match fault {
            NoPlan::Rejected(rejection) => Box::new(Reason::Limit(rejection)),
            NoPlan::NotAffine => Box::new(Reason::NotAffine),
        };
        let limits = &self.options.limits;
        let polynomials = &self.formula.polynomials;
        let mut plan =
            Plan::new(&self.statement, ranges, functionals, polynomials, (bits, false), limits).map_err(no_plan)?;
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
        let looks_at_all = self.looks_at_all || self.conjunctions.iter().any(|c| c.len() > 1);
        let mut scan = Scan::new(&plan, sizes.clone(), until, |sample| {
            !looks_at_all && forms == 0 && sample.t >= from && self.inside(functionals, &|i| sample.values[i]) > 0.0
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
        let nearest = self.nearest(&scan, functionals, forms, from);
        Ok(Analysis { plan, scan, bounds, nearest, functionals: functionals.to_vec() })
    }

    /// How far inside the zone the largest value at an instant is, by the given functions: an upper bound.
    fn inside(&self, functionals: &[Functional], value: &dyn Fn(usize) -> f64) -> f64 {
        let speaks_of = |functional: &Functional, conjunction: &[Half]| {
            functional.polynomials.iter().all(|(position, w)| conjunction.contains(&(*position, w.is_positive())))
        };
        let least = |conjunction: &Vec<Half>| {
            let listed = functionals.iter().enumerate().filter(|(_, f)| speaks_of(f, conjunction));
            listed.map(|(i, _)| value(i)).fold(f64::INFINITY, f64::min)
        };
        self.conjunctions.iter().map(least).fold(f64::NEG_INFINITY, f64::max)
    }

    fn nearest(&self, scan: &Scan, functionals: &[Functional], forms: usize, from: f64) -> (f64, f64) {
        if let [_] = functionals {
            return scan.supremum(forms, from);
        }
        let mut best = (f64::NEG_INFINITY, from);
        for sample in scan.samples.iter().filter(|s| s.t >= from) {
            let here = self.inside(functionals, &|i| sample.values[forms + i]);
            if here > best.0 {
                best = (here, sample.t);
            }
        }
        if scan.limits.iter().skip(forms).all(Option::is_some) && !scan.limits.is_empty() {
            let late = self.inside(functionals, &|i| scan.limits[forms + i].unwrap_or(f64::INFINITY));
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
                    let here = self.inside(functionals, &|k| scan.value_at(forms + k, t));
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
            .map(|s| (self.inside(&analysis.functionals, &|i| s.values[forms + i]), s.t))
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
            for index in 0..analysis.functionals.len() {
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
    let analysis = match search.analyse(&whole(statement), &search.functionals, PRECISIONS[0]) {
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
    let scale = Some(analysis.scan.scale.max(analysis.nearest.0.abs())).filter(|s| *s > 0.0).unwrap_or(1.0);
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
        if let Ok(analysis) = search.analyse(&point, &search.functionals, PRECISIONS[0]) {
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

fn signed(positive: bool) -> Rational {
    if positive { Rational::one() } else { -Rational::one() }
}

/// The mean of half-spaces' functions with these weights.
fn mean(conjunction: &[Half], weights: &[Rational]) -> Functional {
    let mut polynomials: Vec<(usize, Rational)> = Vec::new();
    for ((position, positive), weight) in conjunction.iter().zip(weights).filter(|(_, w)| !w.is_zero()) {
        let weight = weight * signed(*positive);
        match polynomials.iter_mut().find(|(p, _)| p == position) {
            Some((_, known)) => *known += weight,
            None => polynomials.push((*position, weight)),
        }
    }
    polynomials.retain(|(_, w)| !w.is_zero());
    polynomials.sort_by_key(|(position, _)| *position);
    Functional { polynomials, variables: Vec::new() }
}
