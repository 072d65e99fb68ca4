//! Margins: the largest m such that the zone widened by m is still never entered.
//!
//! Write the zone as v >= 0 or v > 0. The margin is minus the supremum of v over the window. The supremum over a bounded stretch
//! and that of the leading terms over the torus are enclosed by branch and bound; a rational number just below the margin is then
//! proved by settling the widened zone.

use crate::enclosure::{Enclosure, approx_value};
use crate::options::Options;
use crate::outcome::{Margin, Place, Proof};
use crate::problem::Problem;
use crate::search::{Finding, settle};
use crate::strategy::cone::{Plan, approx_dyadic, widest};
use crate::strategy::proposal::{Proposals, approx_box};
use keepout_checker::certificate::{Evidence, RealPart};
use keepout_checker::lead::{AngleBox, LeadForm, halves, whole_torus};
use keepout_checker::number::{Dyadic, Interval, Rational};
use keepout_checker::statement::{Claim, Formula, Relation};
use keepout_core::IntegerPolynomial;
use keepout_core::ToRational;
use num_bigint::BigInt;
use num_traits::{Signed, Zero};
use std::cmp::Ordering;
use std::collections::BinaryHeap;

/// The margin is looked for with at least this precision, and with more bits than the proof needed.
const MIN_BITS: u32 = 128;

/// Steps of one branch and bound in time.
const MAX_STEPS: u32 = 3_000;

/// Steps of one branch and bound on the torus.
const MAX_TORUS_STEPS: u32 = 100_000;

/// How often the stretch that is searched for the supremum is made four times longer.
const MAX_EXTENSIONS: u32 = 6;

/// The proof of the widened zone and the margin, for a zone that is a single comparison.
pub(crate) fn margin(proof: &Proof, options: &Options) -> Option<(Proof, Margin)> {
    let Formula::Atom(atom) = &proof.statement().zone.inside else { return None };
    let mut problem =
        Problem::new(proof.statement(), Claim::Never { margin: Rational::zero() }, &options.limits).ok()?;
    let bits = MIN_BITS.max(proof.certificate().bits + MIN_BITS / 2);
    let mut enclosure = Enclosure::new(&problem, bits, &options.limits).ok()?;
    let upward = match atom.relation {
        Relation::Positive | Relation::NonNegative => true,
        Relation::Negative | Relation::NonPositive => false,
        Relation::Zero => sign_of_trace(proof, &problem, &mut enclosure)? == Ordering::Less,
        Relation::NonZero => return None,
    };
    let window = &proof.statement().zone;
    if !proof.certificate().identities.is_empty() {
        // Plain signs did not tell the trajectory from the border: no margin is to be had.
        let place = Place::Near(window.from.clone());
        return Some((proof.clone(), Margin { certified: Rational::zero(), at_most: None, place }));
    }
    if !problem.products_of(0).is_empty() && window.until.is_none() {
        return None;
    }
    let touches_at_start = problem.products_of(0).is_empty()
        && window.from.is_zero()
        && problem.sequences[0].sign_at_zero() == Ordering::Equal;
    if touches_at_start || problem.is_zero(0) {
        let place = Place::Near(window.from.clone());
        return Some((proof.clone(), Margin { certified: Rational::zero(), at_most: Some(Rational::zero()), place }));
    }
    let tail = if window.until.is_some() { Tail::None } else { tail(&mut problem, &mut enclosure, upward)? };
    if matches!(tail, Tail::Vanishes) {
        let nothing = Margin { certified: Rational::zero(), at_most: Some(Rational::zero()), place: Place::Late };
        return Some((proof.clone(), nothing));
    }
    let mut instants = instants(proof);
    for _ in 0..MAX_EXTENSIONS {
        let peak = supremum(&instants, upward, &problem, &mut enclosure)?;
        let (low, high, place) = tail.joined(peak);
        let at_most = (-low.to_rational()?).max(Rational::zero());
        match proved(&-high.to_rational()?, proof, options) {
            Attempt::Proved(proof) => {
                let Claim::Never { margin } = &proof.statement().claim else { return None };
                let margin = Margin { certified: margin.clone(), at_most: Some(at_most), place };
                return Some((*proof, margin));
            }
            Attempt::Failed => {
                return Some((proof.clone(), Margin { certified: Rational::zero(), at_most: Some(at_most), place }));
            }
            Attempt::EnteredLater(time) => {
                let four = Rational::from_integer(4.into());
                let longer = instants.last()? * four;
                instants.extend([longer.clone(), time].into_iter().max());
            }
        }
    }
    None
}

/// The sign that the trace has at the window's start; it never vanishes in the window.
fn sign_of_trace(proof: &Proof, problem: &Problem, enclosure: &mut Enclosure) -> Option<Ordering> {
    let from = proof.statement().zone.from.clone();
    let sign = enclosure.sign(problem, 0, &from, &from, 2 + enclosure.order(&from, &from));
    sign.filter(|s| *s != Ordering::Equal)
}

/// The instants between which the supremum is looked for.
fn instants(proof: &Proof) -> Vec<Rational> {
    let zone = &proof.statement().zone;
    let mut instants = vec![zone.from.clone()];
    if let Evidence::Never { cells, cone } = &proof.certificate().evidence {
        instants.extend(cells.iter().map(|c| c.to.clone()));
        instants.extend(cone.iter().map(|c| c.far.from.clone()));
    }
    instants.extend(zone.until.clone());
    instants.retain(|t| *t >= zone.from);
    if zone.until.is_none() && instants.len() == 1 {
        instants.push(&zone.from + Rational::from_integer(1.into()));
    }
    instants.sort();
    instants.dedup();
    instants
}

enum Attempt {
    Proved(Box<Proof>),
    EnteredLater(Rational),
    Failed,
}

/// Proves a margin a little smaller than a given one.
fn proved(margin: &Rational, proof: &Proof, options: &Options) -> Attempt {
    for slack in [2, 7] {
        let part = Rational::new(BigInt::from(10_000_000 - slack), BigInt::from(10_000_000));
        let candidate = rounded_down(&(margin * part));
        if !candidate.is_positive() {
            return Attempt::Failed;
        }
        let mut effort = options.effort;
        match settle(proof.statement(), &candidate, options, &mut effort) {
            Finding::Never(certificate) => {
                if let Ok(proof) = Proof::new(certificate, &options.limits) {
                    return Attempt::Proved(Box::new(proof));
                }
            }
            Finding::Enters(certificate) => {
                if let Claim::Enters { to, .. } = &certificate.statement.claim {
                    return Attempt::EnteredLater(to.clone());
                }
            }
            Finding::Inseparable(_) | Finding::Open(_) => {}
        }
    }
    Attempt::Failed
}

/// A decimal of nine significant digits, not above a number.
fn rounded_down(x: &Rational) -> Rational {
    if !x.is_positive() {
        return Rational::zero();
    }
    let digits = 8 - approx_value(x).log10().floor() as i64;
    let power = Rational::from_integer(BigInt::from(10).pow(digits.unsigned_abs() as u32));
    if digits >= 0 { (x * &power).floor() / power } else { (x / &power).floor() * power }
}

/// What the trace does for large times.
enum Tail {
    /// Nothing that matters: the window ends, or the trace goes away from the zone.
    None,
    /// It tends to 0, from outside the zone.
    Vanishes,
    /// Its limit (with the sign that makes the zone v >= 0) is in this enclosure.
    Limit(Interval),
    /// Its limit superior is in this enclosure; it oscillates for ever.
    Oscillates(Interval),
}

impl Tail {
    /// Bounds of the supremum of the bounded stretch and the tail together, and where it is nearly attained.
    fn joined(&self, peak: Peak) -> (Dyadic, Dyadic, Place) {
        let (limit, later) = match self {
            Self::None | Self::Vanishes => return (peak.low, peak.high, Place::Near(peak.at)),
            Self::Limit(limit) => (limit, *limit.lo() >= peak.low),
            // Periodic traces attain it in the stretch, up to rounding.
            Self::Oscillates(limit) => (limit, !narrow(&peak.low, limit.lo(), 0.0) && *limit.lo() >= peak.low),
        };
        let high = peak.high.max(limit.hi().clone());
        match (later, self) {
            (false, _) => (peak.low, high, Place::Near(peak.at)),
            (true, Self::Oscillates(_)) => (limit.lo().clone(), high, Place::Recurring),
            (true, Self::None | Self::Vanishes | Self::Limit(_)) => (limit.lo().clone(), high, Place::Late),
        }
    }
}

/// `None`: not known.
fn tail(problem: &mut Problem, enclosure: &mut Enclosure, upward: bool) -> Option<Tail> {
    let plan = Plan::new(problem, enclosure)?;
    let lead = plan.leads[0].as_ref()?;
    let root = &enclosure.table.roots()[*lead.roots.first()?];
    let zero = Rational::zero();
    let on_axis = match &lead.real_part {
        RealPart::Line(line) => *line == zero,
        RealPart::Single | RealPart::Doubled(_) => {
            problem.families[root.family] == IntegerPolynomial::variable()
                || enclosure.table.is_on_line(lead.roots[0], &zero, enclosure.bits) == Some(true)
        }
    };
    if !on_axis {
        return match root.value.re.certain_sign()? {
            Ordering::Less => Some(Tail::Vanishes),
            Ordering::Equal | Ordering::Greater => Some(Tail::None),
        };
    }
    let terms = &enclosure.forms[0].terms;
    if terms.iter().any(|t| lead.roots.contains(&t.root) && t.coefficients.len() > 1) {
        return Some(Tail::None);
    }
    let mut t0 = Rational::from_integer(1.into());
    for _ in 0..60 {
        let forms = plan.leading(&t0, problem, enclosure).forms;
        if forms.first()?.as_ref().is_some_and(|form| form.rest().top() < -100) {
            let supremum = torus_supremum(&plan, &forms, problem, enclosure, upward)?;
            return Some(if plan.base.is_empty() { Tail::Limit(supremum) } else { Tail::Oscillates(supremum) });
        }
        t0 *= Rational::from_integer(2.into());
    }
    None
}

/// An entry of the queue of a branch and bound: the greatest upper bound comes first.
struct Open<T> {
    high: Dyadic,
    part: T,
}

impl<T> PartialEq for Open<T> {
    fn eq(&self, other: &Self) -> bool {
        self.high == other.high
    }
}

impl<T> Eq for Open<T> {}

impl<T> PartialOrd for Open<T> {
    fn partial_cmp(&self, other: &Self) -> Option<Ordering> {
        Some(self.cmp(other))
    }
}

impl<T> Ord for Open<T> {
    fn cmp(&self, other: &Self) -> Ordering {
        self.high.cmp(&other.high)
    }
}

fn oriented(value: Interval, upward: bool) -> Interval {
    if upward { value } else { value.neg() }
}

/// Whether [low, high] is as narrow as margins are wanted.
fn narrow(low: &Dyadic, high: &Dyadic, scale: f64) -> bool {
    let (Some(low), Some(high)) = (low.to_rational(), high.to_rational()) else { return false };
    let size = approx_value(&low.abs()).max(1e-9 * scale);
    approx_value(&(high - low)) <= 1e-8 * size
}

/// An enclosed supremum, and where it is nearly attained.
struct Peak {
    low: Dyadic,
    high: Dyadic,
    at: Rational,
}

/// The supremum of v between the first and the last instant.
fn supremum(instants: &[Rational], upward: bool, problem: &Problem, enclosure: &mut Enclosure) -> Option<Peak> {
    let mut best: Option<(Dyadic, Rational)> = None;
    let mut scale = 0.0_f64;
    let mut open = BinaryHeap::new();
    let mut pending: Vec<(Rational, Rational)> = instants.windows(2).map(|w| (w[0].clone(), w[1].clone())).collect();
    if pending.is_empty() {
        let only = instants.first()?.clone();
        pending.push((only.clone(), only));
    }
    for _ in 0..MAX_STEPS {
        for (a, b) in pending.drain(..) {
            let middle = crate::strategy::cover::simple_middle(&a, &b);
            for t in [&a, &middle, &b] {
                let order = enclosure.order(t, t);
                let value = oriented(enclosure.on_stretch(problem, 0, t, t, order)?, upward);
                scale = scale.max(value.lo().to_rational().map_or(0.0, |x| approx_value(&x.abs())));
                if best.as_ref().is_none_or(|(low, _)| value.lo() > low) {
                    best = Some((value.lo().clone(), t.clone()));
                }
            }
            let order = enclosure.order(&a, &b);
            let high = oriented(enclosure.on_stretch(problem, 0, &a, &b, order)?, upward).hi().clone();
            if best.as_ref().is_none_or(|(low, _)| high >= *low) {
                open.push(Open { high, part: (a, b) });
            }
        }
        let top: Open<(Rational, Rational)> = open.pop()?;
        let (low, at) = best.clone()?;
        if narrow(&low, &top.high, scale) || top.part.0 == top.part.1 {
            return Some(Peak { high: top.high.max(low.clone()), low, at });
        }
        let (a, b) = top.part;
        let middle = crate::strategy::cover::simple_middle(&a, &b);
        pending.extend([(a, middle.clone()), (middle, b)]);
    }
    None
}

/// The supremum over the torus: a lower bound, and in floating point a probable upper bound.
fn torus_supremum(
    plan: &Plan,
    forms: &[Option<LeadForm>],
    problem: &Problem,
    enclosure: &Enclosure,
    upward: bool,
) -> Option<Interval> {
    let proposals = Proposals::new(plan, forms, problem, enclosure);
    let sign = if upward { 1.0 } else { -1.0 };
    let mut best: Option<(f64, AngleBox)> = None;
    let mut open = BinaryHeap::new();
    let mut pending = vec![whole_torus(plan.base.len())];
    let mut high = f64::MAX;
    for _ in 0..MAX_TORUS_STEPS {
        for angles in pending.drain(..) {
            let (value, radius) = proposals.value(0, &approx_box(&angles))?;
            if best.as_ref().is_none_or(|(low, _)| sign * value > *low) {
                best = Some((sign * value, angles.clone()));
            }
            open.push(Open { high: approx_to_dyadic(sign * value + radius)?, part: angles });
        }
        let top: Open<AngleBox> = open.pop()?;
        high = approx_dyadic(&top.high);
        if plan.base.is_empty() || high - best.as_ref()?.0 <= 1e-9 * high.abs() {
            break;
        }
        let (lower, upper) = halves(&top.part, widest(&top.part)?)?;
        pending.extend([lower, upper]);
    }
    let (_, angles) = best?;
    let centre: AngleBox = angles.iter().map(|(c, _)| (c.clone(), Rational::zero())).collect();
    let low = oriented(forms[0].as_ref()?.enclose(&centre)?, upward).lo().clone();
    Some(Interval::hull(low.clone(), approx_to_dyadic(high)?.max(low)))
}

fn approx_to_dyadic(x: f64) -> Option<Dyadic> {
    let scaled = (x.abs() > 0.0).then(|| x.abs().log2().floor() as i32 - 52);
    let Some(exponent) = scaled else { return Some(Dyadic::zero()) };
    x.is_finite().then(|| Dyadic::new(BigInt::from((x / 2.0_f64.powi(exponent)) as i64), i64::from(exponent)))
}
