//! Sets of starts that contain the trajectory from some instant on, are invariant, and avoid the zone.
//!
//! The exponents of all states are written as combinations of a scale, base rates and base frequencies, each combination with its
//! reason. Then starts, and bands of the irrational rates, are tried until the zone is false on all leaves of a bisection of
//! the base angles.

use crate::enclosure::{Enclosure, approx_value};
use crate::options::Options;
use crate::problem::Problem;
use crate::strategy::cone::{Plan, approx_dyadic, common_line, first_start, widest};
use crate::strategy::pivot::simplest_between;
use keepout_checker::certificate::{Certificate, Evidence, Factor, Node, RootRef, Sign, Sum};
use keepout_checker::expansion::{Expansion, Frame};
use keepout_checker::lead::{AngleBox, LeadForm, halves, whole_torus};
use keepout_checker::limits::Budget;
use keepout_checker::number::{Complex, Interval, Rational};
use keepout_checker::region::{Exponent, NamedRoot, Rate, Reason, Region, RegionLead, RegionProof, Step};
use keepout_checker::statement::{Claim, Statement};
use keepout_core::ToRational;
use num_bigint::BigInt;
use num_integer::Integer;
use num_traits::{One, Signed, ToPrimitive, Zero};
use std::cmp::Ordering;
use std::collections::BTreeMap;

/// Why no set was found.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum RegionFailure {
    /// The statement has known inputs, or its zone names the time or an exponential.
    NotOfStates,
    /// The window has an end.
    WindowEnds,
    /// The states' exponents could not be separated or written as combinations.
    Exponents,
    /// Whatever start was tried, the zone may meet the set.
    Meets,
    /// The work allowed was used up.
    Effort,
}

/// Precisions that are tried.
const BITS: [u32; 3] = [128, 256, 512];

/// The start is doubled at most so often.
const MAX_DOUBLINGS: u32 = 40;

/// Bands of irrational rates are multiples of one over these.
const BANDS: [i64; 5] = [1, 4, 32, 512, 1 << 16];

/// y need not start later than at the exponential of this.
const MAX_LOG_START: f64 = 40.0;

/// Numerators and denominators of rational sums of irrational rates are at most this.
const MAX_TERM: i64 = 1 << 16;

/// The certificate of a set of starts. The statement's own claim is not looked at.
pub(crate) fn find(statement: &Statement, options: &Options, effort: &mut u64) -> Result<Certificate, RegionFailure> {
    if statement.zone.until.is_some() {
        return Err(RegionFailure::WindowEnds);
    }
    if !statement.drives.is_empty() || !statement.exponentials.is_empty() {
        return Err(RegionFailure::NotOfStates);
    }
    let mut failure = RegionFailure::Exponents;
    for bits in BITS.into_iter().filter(|bits| *bits <= options.max_bits.max(BITS[0])) {
        match find_at(statement, bits, options, effort) {
            Err(RegionFailure::Exponents) => {}
            Err(found) => failure = found,
            Ok(certificate) => return Ok(certificate),
        }
        if failure == RegionFailure::Effort || failure == RegionFailure::NotOfStates {
            break;
        }
    }
    Err(failure)
}

fn find_at(
    statement: &Statement,
    bits: u32,
    options: &Options,
    effort: &mut u64,
) -> Result<Certificate, RegionFailure> {
    let unknown = Claim::Region(Box::new(empty()));
    let problem = Problem::new(statement, unknown, &options.limits).map_err(|_| RegionFailure::Exponents)?;
    let enclosure = Enclosure::new(&problem, bits, &options.limits).map_err(|_| RegionFailure::Exponents)?;
    let draft = Draft::new(problem, enclosure).ok_or(RegionFailure::Exponents)?;
    let mut from = first_start(&draft.enclosure);
    for _ in 0..MAX_DOUBLINGS {
        let bands: &[i64] = if draft.rates.is_empty() { &BANDS[..1] } else { &BANDS };
        for band in bands {
            let (region, log_start) = draft.region(&from, *band).ok_or(RegionFailure::Exponents)?;
            let attempt = Attempt::new(&draft, &region, &log_start, options)?;
            if let Some(nodes) = attempt.bisected(effort)? {
                let leads = attempt.leads;
                return Ok(draft.certificate(region, log_start, leads, nodes));
            }
        }
        from *= Rational::from_integer(2.into());
    }
    Err(RegionFailure::Meets)
}

fn empty() -> Region {
    let one = Rational::one();
    Region {
        from: one.clone(),
        scale: one.clone(),
        start: one,
        power: None,
        roots: Vec::new(),
        rates: Vec::new(),
        base: Vec::new(),
        exponents: Vec::new(),
    }
}

/// The exponents of all states as combinations.
struct Draft {
    problem: Problem,
    enclosure: Enclosure,
    /// The roots of all states.
    roots: Vec<usize>,
    /// The base rates: positions of roots.
    rates: Vec<usize>,
    scale: Rational,
    growths: Vec<Step>,
    angles: Angles,
    sums: Vec<Sum>,
    /// Whether some state has a power of t.
    has_powers: bool,
}

impl Draft {
    fn new(mut problem: Problem, mut enclosure: Enclosure) -> Option<Self> {
        let states = problem.statement.states.len();
        let zone = problem.traces() - states;
        let terms = || enclosure.forms[zone..].iter().flat_map(|f| &f.terms);
        let has_powers = terms().any(|t| t.coefficients.len() > 1);
        let mut roots: Vec<usize> = terms().map(|t| t.root).collect();
        roots.sort_unstable();
        roots.dedup();
        let mut plan = Plan::for_roots(&roots, &mut problem, &mut enclosure)?;
        let mut angles = Angles::of(&plan);
        if may_be_commensurable(&plan.base, &enclosure)
            && let Some(fewer) = Angles::by_differences(&roots, &mut plan, &mut problem, &mut enclosure)
            && fewer.base.len() < angles.base.len()
        {
            angles = fewer;
        }
        let mut rows =
            Growths { all: roots.clone(), plan, known: BTreeMap::new(), steps: Vec::new(), rates: Vec::new() };
        // Real roots first: doubled real parts are compared with them.
        let is_real = |r: &usize, enclosure: &Enclosure| enclosure.table.roots()[*r].is_real;
        roots.sort_by_key(|r| !is_real(r, &enclosure));
        for root in &roots {
            rows.add(*root, &mut problem, &mut enclosure)?;
        }
        let Growths { plan, mut steps, rates, .. } = rows;
        let scale = scale(&steps, &rates, &enclosure);
        for step in &mut steps {
            step.row[0] /= &scale;
            // Rows were made while the number of base rates grew.
            step.row.resize(rates.len() + 1, Rational::zero());
        }
        let sums = plan.sums;
        Some(Self { problem, enclosure, roots, rates, scale, growths: steps, angles, sums, has_powers })
    }

    fn row(&self, root: usize) -> Option<&Vec<Rational>> {
        self.growths.iter().find(|step| step.root == root).map(|step| &step.row)
    }

    /// The set from an instant on, with bands of the width 1 / `band`; and a number whose exponential is at most its start.
    fn region(&self, from: &Rational, band: i64) -> Option<(Region, Rational)> {
        let enclosure = &self.enclosure;
        let grows = self.roots.iter().filter_map(|r| self.row(*r)).flatten().any(|g| !g.is_zero());
        // Where nothing grows, y stands for nothing.
        let scale = if grows { self.scale.clone() } else { from.recip() };
        let (start, log_start) = start((approx_value(&scale) * approx_value(from)).min(MAX_LOG_START))?;
        let power = (self.has_powers && grows).then(|| power(from, &scale, &log_start));
        let mut positions: Vec<usize> = Vec::new();
        let mut place = |root: usize| {
            positions.iter().position(|r| *r == root).unwrap_or_else(|| {
                positions.push(root);
                positions.len() - 1
            })
        };
        let exponents = self
            .roots
            .iter()
            .map(|root| {
                Some(Exponent { root: place(*root), growth: self.row(*root)?.clone(), turns: self.angles.turns(*root) })
            })
            .collect::<Option<Vec<_>>>()?;
        let base = self.angles.base.iter().map(|root| place(*root)).collect();
        let grid = Rational::from_integer(band.into());
        let rates = self
            .rates
            .iter()
            .map(|root| {
                let re = &enclosure.table.roots()[*root].value.re;
                let (lo, hi) = (re.lo().to_rational()? / &self.scale, re.hi().to_rational()? / &self.scale);
                Some(Rate { root: place(*root), lo: (lo * &grid).floor() / &grid, hi: (hi * &grid).ceil() / &grid })
            })
            .collect::<Option<_>>()?;
        let roots = positions.iter().map(|root| named(*root, &self.problem, enclosure)).collect::<Option<_>>()?;
        let from = from.clone();
        Some((Region { from, scale, start, power, roots, rates, base, exponents }, log_start))
    }

    /// The positions in the table of the roots that [`Self::region`] lists.
    fn positions(&self) -> Vec<usize> {
        let mut positions: Vec<usize> = Vec::new();
        for root in self.roots.iter().chain(&self.angles.base).chain(&self.rates) {
            if !positions.contains(root) {
                positions.push(*root);
            }
        }
        positions
    }

    fn certificate(self, region: Region, log_start: Rational, leads: Vec<RegionLead>, nodes: Vec<Node>) -> Certificate {
        let roots = self.positions();
        let claim = Claim::Region(Box::new(region));
        Certificate {
            statement: Statement { claim, ..self.problem.statement.clone() },
            bits: self.enclosure.bits,
            families: self.enclosure.families.clone(),
            traces: self.problem.factors[..self.problem.traces()].to_vec(),
            auxiliaries: Vec::new(),
            identities: Vec::new(),
            sums: self.sums,
            evidence: Evidence::Region(RegionProof {
                roots,
                log_start,
                growths: self.growths,
                angles: self.angles.steps,
                leads,
                nodes,
            }),
        }
    }
}

/// The imaginary parts of roots as combinations.
struct Angles {
    base: Vec<usize>,
    steps: Vec<Step>,
}

/// Whether the ratio of two base frequencies may be rational with small terms.
fn may_be_commensurable(base: &[usize], enclosure: &Enclosure) -> bool {
    let frequency = |root: usize| approx_dyadic(enclosure.table.roots()[root].value.im.lo());
    let close = |a: f64, b: f64| (a - b).abs() < 1e-9 * a;
    let pairs = base.iter().enumerate().flat_map(|(i, a)| base[i + 1..].iter().map(move |b| (*a, *b)));
    pairs
        .into_iter()
        .any(|(a, b)| (1..=6).any(|n| (1..=6).any(|m| close(f64::from(n) * frequency(a), f64::from(m) * frequency(b)))))
}

impl Angles {
    fn of(plan: &Plan) -> Self {
        let steps = plan.angles.iter().map(|a| Step {
            root: a.root,
            row: a.turns.iter().map(|n| Rational::from_integer((*n).into())).collect(),
            reason: a.sum.map_or(Reason::Base, Reason::Sum),
        });
        Self { base: plan.base.clone(), steps: steps.collect() }
    }

    /// The turns of a root; a real one has none.
    fn turns(&self, root: usize) -> Vec<i64> {
        let row = self.steps.iter().rev().find(|step| step.root == root).map(|step| &step.row);
        let whole = |row: &Vec<Rational>| row.iter().map(|n| n.to_integer().to_i64().unwrap_or(0)).collect();
        row.map_or_else(|| vec![0; self.base.len()], whole)
    }

    /// Angles of roots of different real parts, whose sums cannot show that their frequencies are related: by the roots
    /// mu - conj mu, which are purely imaginary, over halves of base roots among these.
    fn by_differences(
        roots: &[usize],
        plan: &mut Plan,
        problem: &mut Problem,
        enclosure: &mut Enclosure,
    ) -> Option<Self> {
        let mut differences = Vec::new();
        for root in roots.iter().filter(|r| !enclosure.table.roots()[**r].is_real).copied().collect::<Vec<_>>() {
            let pair = [(1, RootRef { index: root, conjugate: false }), (-1, RootRef { index: root, conjugate: true })];
            let sum = plan.sum(&pair, problem, enclosure)??;
            differences.push((root, sum, plan.sums[sum].root.index));
        }
        let imaginary: Vec<usize> = differences.iter().map(|(_, _, index)| *index).collect();
        let inner = Plan::for_roots(&imaginary, problem, enclosure)?;
        let offset = plan.sums.len();
        plan.sums.extend(inner.sums.iter().cloned());
        let mut angles = Self { base: Vec::new(), steps: Vec::new() };
        let row =
            |turns: &[i64], times: i64| turns.iter().map(|n| Rational::from_integer((n * times).into())).collect();
        for base in &inner.base {
            let half = half_root(*base, problem, enclosure)?;
            let sum = plan.sum(&[(2, RootRef { index: half, conjugate: false })], problem, enclosure)??;
            let turns = inner.turns(*base);
            angles.base.push(half);
            angles.steps.push(Step { root: half, row: row(&turns, 1), reason: Reason::Base });
            angles.steps.push(Step { root: *base, row: row(&turns, 2), reason: Reason::Sum(sum) });
        }
        for angle in &inner.angles {
            if let Some(sum) = angle.sum {
                let reason = Reason::Sum(offset + sum);
                angles.steps.push(Step { root: angle.root, row: row(&angle.turns, 2), reason });
            }
        }
        for (root, sum, difference) in differences {
            angles.steps.push(Step { root, row: row(&inner.turns(difference), 1), reason: Reason::Sum(sum) });
        }
        Some(angles)
    }
}

/// The half of a root, as a root of a family of its own.
fn half_root(root: usize, problem: &mut Problem, enclosure: &mut Enclosure) -> Option<usize> {
    let family = enclosure.table.roots()[root].family;
    let halved = problem.families[family].dilate_up(&BigInt::from(2)).primitive_part();
    let position = problem.family(&halved)?;
    enclosure.renew(problem)?;
    let double = Interval::integer(2);
    let roots = enclosure.table.roots();
    let is_half = |r: &keepout_checker::root::Root| {
        let value = r.value.mul_real(&double, enclosure.bits);
        r.family == position
            && !value.re.is_disjoint(&roots[root].value.re)
            && !value.im.is_disjoint(&roots[root].value.im)
    };
    roots.iter().position(is_half)
}

/// The real parts of roots as combinations. The first entry of a row is the rational part, in absolute terms.
struct Growths {
    /// The roots of all states.
    all: Vec<usize>,
    plan: Plan,
    known: BTreeMap<usize, Vec<Rational>>,
    steps: Vec<Step>,
    rates: Vec<usize>,
}

impl Growths {
    fn push(&mut self, root: usize, row: Vec<Rational>, reason: Reason) {
        self.known.insert(root, row.clone());
        self.steps.push(Step { root, row, reason });
    }

    fn push_base(&mut self, root: usize) {
        self.rates.push(root);
        let mut row = vec![Rational::zero(); self.rates.len() + 1];
        row[self.rates.len()] = Rational::one();
        self.push(root, row, Reason::Base);
    }

    fn is_on_line(&mut self, root: usize, problem: &Problem, enclosure: &Enclosure) -> bool {
        let line = common_line(&[root], problem, enclosure);
        if let Some(line) = &line {
            self.push(root, vec![line.clone()], Reason::Line(line.clone()));
        }
        line.is_some()
    }

    fn add(&mut self, root: usize, problem: &mut Problem, enclosure: &mut Enclosure) -> Option<()> {
        if self.known.contains_key(&root) || self.is_on_line(root, problem, enclosure) {
            return Some(());
        }
        if enclosure.table.roots()[root].is_real {
            if !self.is_related(root, problem, enclosure)? {
                self.push_base(root);
            }
            return Some(());
        }
        if !is_suspect(root, &self.all, enclosure) {
            self.push_base(root);
            return Some(());
        }
        // The double of the real part is a real root.
        let pair = [false, true].map(|conjugate| (1, RootRef { index: root, conjugate }));
        let Some(sum) = self.plan.sum(&pair, problem, enclosure)? else {
            self.push_base(root);
            return Some(());
        };
        let double = self.plan.sums[sum].root.index;
        let is_known = self.known.contains_key(&double)
            || self.is_on_line(double, problem, enclosure)
            || self.is_related(double, problem, enclosure)?;
        let times = |row: &[Rational], x: Rational| row.iter().map(|g| g * &x).collect::<Vec<_>>();
        if is_known {
            let row = times(&self.known[&double], Rational::new(1.into(), 2.into()));
            self.push(root, row, Reason::Sum(sum));
        } else {
            self.push_base(root);
            let row = times(&self.known[&root], Rational::from_integer(2.into()));
            self.push(double, row, Reason::Sum(sum));
        }
        Some(())
    }

    /// Whether the real root is a combination of known ones: a multiple of one, a sum of multiples of two, or a rational
    /// less a multiple of one.
    fn is_related(&mut self, root: usize, problem: &mut Problem, enclosure: &mut Enclosure) -> Option<bool> {
        let irrational = |row: &Vec<Rational>| row.iter().skip(1).any(|g| !g.is_zero());
        let is_candidate =
            |(r, row): (&usize, &Vec<Rational>)| (enclosure.table.roots()[*r].is_real && irrational(row)).then_some(*r);
        let known: Vec<usize> = self.known.iter().filter_map(is_candidate).collect();
        for parts in multiples(root, &known, enclosure) {
            if let Some(sum) =
                self.plan.sum(&parts, problem, enclosure)?.filter(|s| self.plan.sums[*s].root.index == root)
            {
                self.push_combination(root, sum, &parts);
                return Some(true);
            }
        }
        let plain = |index| RootRef { index, conjugate: false };
        for other in known {
            for (n, m) in [(1, 1), (1, -1), (1, 2), (2, 1), (1, -2), (2, -1)] {
                let parts = [(n, plain(root)), (m, plain(other))];
                if !is_simple(&parts, enclosure) {
                    continue;
                }
                let Some(sum) = self.plan.sum(&parts, problem, enclosure)? else { continue };
                let total = self.plan.sums[sum].root.index;
                if self.known.contains_key(&total) || self.is_on_line(total, problem, enclosure) {
                    // n root = total - m other
                    let length = self.rates.len() + 1;
                    let entry =
                        |index: usize, j: usize| self.known[&index].get(j).cloned().unwrap_or_else(Rational::zero);
                    let (n, m) = (Rational::from_integer(n.into()), Rational::from_integer(m.into()));
                    let row = (0..length).map(|j| (entry(total, j) - entry(other, j) * &m) / &n).collect();
                    self.push(root, row, Reason::Sum(sum));
                    return Some(true);
                }
            }
        }
        Some(false)
    }

    fn push_combination(&mut self, root: usize, sum: usize, parts: &[(i64, RootRef)]) {
        let mut row = vec![Rational::zero(); self.rates.len() + 1];
        for (times, part) in parts {
            for (slot, g) in row.iter_mut().zip(&self.known[&part.index]) {
                *slot += g * Rational::from_integer((*times).into());
            }
        }
        self.push(root, row, Reason::Sum(sum));
    }
}

/// Multiples of one known real root, or sums of multiples of two, that meet a real root.
fn multiples(root: usize, known: &[usize], enclosure: &Enclosure) -> Vec<Vec<(i64, RootRef)>> {
    let value = |r: usize| approx_dyadic(enclosure.table.roots()[r].value.re.lo());
    let plain = |index: usize| RootRef { index, conjugate: false };
    let meets = |sum: f64| (sum - value(root)).abs() < 1e-9 * value(root).abs();
    let mut found = Vec::new();
    for a in known {
        let n = (value(root) / value(*a)).round();
        if n != 0.0 && n.abs() <= 8.0 && meets(n * value(*a)) {
            found.push(vec![(n as i64, plain(*a))]);
        }
    }
    for (i, a) in known.iter().enumerate() {
        for b in &known[i + 1..] {
            for n in (-3_i64..=3).filter(|n| *n != 0) {
                for m in (-3_i64..=3).filter(|m| *m != 0) {
                    if meets(n as f64 * value(*a) + m as f64 * value(*b)) {
                        found.push(vec![(n, plain(*a)), (m, plain(*b))]);
                    }
                }
            }
        }
    }
    found
}

/// Whether the real part of a root that is not real may be rational, or be related to that of another root.
fn is_suspect(root: usize, all: &[usize], enclosure: &Enclosure) -> bool {
    let plain = |index| RootRef { index, conjugate: false };
    let others = all.iter().filter(|other| **other != root);
    let pairs = others.flat_map(|b| [(1, 1), (1, -1), (1, 2), (2, 1), (1, -2), (2, -1)].map(|(n, m)| (n, *b, m)));
    is_simple(&[(1, plain(root))], enclosure)
        || pairs.into_iter().any(|(n, b, m)| is_simple(&[(n, plain(root)), (m, plain(b))], enclosure))
}

/// Whether the real part of a sum may be a rational with a small numerator and denominator.
fn is_simple(parts: &[(i64, RootRef)], enclosure: &Enclosure) -> bool {
    let Some(value) = crate::strategy::equality::value(parts, enclosure) else { return false };
    let (Some(lo), Some(hi)) = (value.re.lo().to_rational(), value.re.hi().to_rational()) else { return false };
    if lo.is_zero() || hi.is_zero() || lo.is_negative() != hi.is_negative() {
        return true;
    }
    let simplest = if hi.is_negative() { -simplest_between(&-hi, &-lo) } else { simplest_between(&lo, &hi) };
    let small = |n: &BigInt| n.abs() <= BigInt::from(MAX_TERM);
    small(simplest.numer()) && small(simplest.denom())
}

/// The greatest number of which all rational parts are multiples; else one of the size of the rates.
fn scale(steps: &[Step], rates: &[usize], enclosure: &Enclosure) -> Rational {
    let rational = steps.iter().map(|s| s.row[0].abs()).filter(|r| !r.is_zero());
    let divisor = rational
        .reduce(|a, b| Rational::new((a.numer() * b.denom()).gcd(&(b.numer() * a.denom())), a.denom() * b.denom()));
    let size = |root: &usize| enclosure.table.roots()[*root].value.re.abs_hi().top().clamp(-200, 200);
    divisor.unwrap_or_else(|| {
        let top = rates.iter().map(size).max().unwrap_or(0);
        let power = Rational::from_integer(BigInt::from(1) << (top - 1).unsigned_abs());
        if top >= 1 { power } else { power.recip() }
    })
}

/// A rational a little below exp(log), and one a little below its logarithm. A guess that the checker checks.
fn start(log: f64) -> Option<(Rational, Rational)> {
    let value = log.exp() * (1.0 - 2.0_f64.powi(-26));
    let unit = 2.0_f64.powi(value.log2().floor() as i32 - 20).min(1.0);
    let start = (value / unit).floor() * unit;
    let log_start = start.ln() - 2.0_f64.powi(-30) * (1.0 + start.ln().abs());
    Some((
        Rational::from_float(start)?,
        Rational::from_float((log_start * 2.0_f64.powi(32)).floor() / 2.0_f64.powi(32))?,
    ))
}

/// A small number with from <= exp(power l) and power scale exp(power l) >= 1. A guess that the checker checks.
fn power(from: &Rational, scale: &Rational, log_start: &Rational) -> Rational {
    let (from, scale, log) = (approx_value(from), approx_value(scale), approx_value(log_start));
    let fits = |p: f64| p * log >= from.ln() + 1e-6 && p * log + (p * scale).ln() >= 1e-6;
    let mut denominator = 1_i64;
    let mut best = (1..=4096).map(|n| n as f64).find(|n| fits(*n)).unwrap_or(4096.0);
    // Simple fractions: halved as long as that fits.
    while denominator < 64 && fits(best / 2.0) {
        denominator *= 2;
        best /= 2.0;
    }
    Rational::from_float(best).unwrap_or_else(Rational::one)
}

/// A root with a rectangle of few digits that holds no other root of its polynomial.
fn named(root: usize, problem: &Problem, enclosure: &Enclosure) -> Option<NamedRoot> {
    let found = &enclosure.table.roots()[root];
    let polynomial = problem.families[found.family].to_monic().coefficients().to_vec();
    let zero = Rational::zero();
    let side = |x: &Interval, grid: &Rational| -> Option<(Rational, Rational)> {
        let (lo, hi) = (x.lo().to_rational()?, x.hi().to_rational()?);
        Some(((lo * grid).floor() / grid, (hi * grid).ceil() / grid))
    };
    // Digits of the smaller part count, too.
    let mut grid = Rational::from_integer(100.into());
    for _ in 0..enclosure.bits {
        let re = side(&found.value.re, &grid)?;
        let im = if found.is_real { (zero.clone(), zero.clone()) } else { side(&found.value.im, &grid)? };
        let hull = |(lo, hi): &(Rational, Rational)| {
            let end = |x: &Rational| Interval::rational(x, enclosure.bits);
            Interval::hull(end(lo).lo().clone(), end(hi).hi().clone())
        };
        let rectangle = Complex { re: hull(&re), im: hull(&im) };
        let inside = enclosure.table.candidates(&rectangle, &[Factor { family: found.family, multiplicity: 1 }]);
        let narrow = found.is_real || im.0.is_positive();
        if inside.len() == 1 && narrow {
            return Some(NamedRoot { polynomial, re, im });
        }
        grid *= Rational::from_integer(10.into());
    }
    None
}

/// One set, and the leading parts of the zone's polynomials on it.
struct Attempt<'a> {
    draft: &'a Draft,
    forms: Vec<Option<LeadForm>>,
    /// Polynomials that are 0 on the set.
    zeros: Vec<bool>,
    leads: Vec<RegionLead>,
    options: &'a Options,
}

impl<'a> Attempt<'a> {
    fn new(
        draft: &'a Draft,
        region: &Region,
        log_start: &Rational,
        options: &'a Options,
    ) -> Result<Self, RegionFailure> {
        let (problem, enclosure) = (&draft.problem, &draft.enclosure);
        let zone = problem.traces() - problem.statement.states.len();
        let mut budget = Budget::new(enclosure.limits());
        let frame =
            Frame::new(region, &draft.positions(), &enclosure.table, enclosure.bits).ok_or(RegionFailure::Exponents)?;
        let coordinates: Vec<Expansion> = enclosure.forms[zone..problem.traces()]
            .iter()
            .map(|form| frame.coordinate(form))
            .collect::<Option<_>>()
            .ok_or(RegionFailure::Exponents)?;
        let mut attempt = Self { draft, forms: Vec::new(), zeros: Vec::new(), leads: Vec::new(), options };
        for (function, polynomial) in problem.formula.polynomials.iter().take(zone).enumerate() {
            let limits = enclosure.limits();
            let expanded = frame.expand(polynomial, &problem.statement, &coordinates, limits, &mut budget);
            let expansion = expanded.map_err(|_| RegionFailure::Effort)?.ok_or(RegionFailure::NotOfStates)?;
            let expansion = frame.without_zeros(&expansion, &enclosure.forms[function], &mut budget);
            let expansion = expansion.map_err(|_| RegionFailure::Effort)?;
            attempt.zeros.push(expansion.is_empty());
            attempt.forms.push(None);
            if let Some((lead, form)) = lead(function, &frame, &expansion, log_start) {
                attempt.leads.push(lead);
                attempt.forms[function] = Some(form);
            }
        }
        Ok(attempt)
    }

    /// A bisection with the zone false on each leaf; `None`: the zone may meet the set.
    fn bisected(&self, effort: &mut u64) -> Result<Option<Vec<Node>>, RegionFailure> {
        let mut nodes = Vec::new();
        let mut open = vec![(whole_torus(self.draft.angles.base.len()), 0_u64)];
        while let Some((angles, depth)) = open.pop() {
            let limits = &self.options.limits;
            if *effort == 0 {
                return Err(RegionFailure::Effort);
            }
            if depth >= limits.depth || nodes.len() as u64 >= limits.nodes {
                return Ok(None);
            }
            *effort -= 1;
            let signs = self.signs(&angles);
            if self.is_refuted(&signs) {
                nodes.push(Node::Leaf(self.needed(signs), None));
                continue;
            }
            let centre: AngleBox = angles.iter().map(|(c, _)| (c.clone(), Rational::zero())).collect();
            // Halving brings nothing where the centre alone is not decided.
            let Some(axis) = widest(&angles).filter(|_| self.is_refuted(&self.signs(&centre))) else { return Ok(None) };
            let Some((lower, upper)) = halves(&angles, axis) else { return Ok(None) };
            open.push((upper, depth + 1));
            open.push((lower, depth + 1));
            nodes.push(Node::Split(axis));
        }
        Ok(Some(nodes))
    }

    fn signs(&self, angles: &AngleBox) -> Vec<Option<Sign>> {
        let sign = |(form, is_zero): (&Option<LeadForm>, &bool)| match (form, is_zero) {
            (_, true) => Some(Ordering::Equal),
            (Some(form), false) => form.enclose(angles).and_then(|value| value.certain_sign()),
            (None, false) => None,
        };
        self.forms.iter().zip(&self.zeros).map(sign).collect()
    }

    fn is_refuted(&self, signs: &[Option<Sign>]) -> bool {
        let mut padded = signs.to_vec();
        padded.resize(self.draft.problem.traces(), None);
        self.draft.problem.truth(&padded) == Some(false)
    }

    /// The signs without those that are not needed.
    fn needed(&self, mut signs: Vec<Option<Sign>>) -> Vec<(usize, Sign)> {
        for i in 0..signs.len() {
            let sign = signs[i].take();
            if !self.is_refuted(&signs) {
                signs[i] = sign;
            }
        }
        signs.into_iter().enumerate().filter_map(|(i, sign)| Some((i, sign?))).collect()
    }
}

/// The leading growth of a polynomial with the smallest rest beside it.
fn lead(function: usize, frame: &Frame, expansion: &Expansion, log_start: &Rational) -> Option<(RegionLead, LeadForm)> {
    let mut keys: Vec<(Vec<Rational>, usize)> = expansion.keys().map(|k| (k.growth.clone(), k.power)).collect();
    keys.dedup();
    let forms = keys.into_iter().filter_map(|(growth, power)| {
        let form = frame.lead_form(expansion, (&growth, power), log_start)?;
        Some((RegionLead { function, growth, power: power.to_u32()? }, form))
    });
    forms.min_by(|(_, a), (_, b)| a.rest().cmp(b.rest()))
}
