//! Cells and a tail that the checker will accept for a piece: bounded exactly as the checker bounds them.

use super::plan::Plan;
use super::scan::{REACH, Scan, bisect};
use crate::enclosure::approx_value;
use crate::strategy::cone::approx_dyadic;
use keepout_checker::certificate::Angle;
use keepout_checker::formula::{Conflict, IndexedFormula};
use keepout_checker::limits::{Budget, Limits};
use keepout_checker::many::{Piece, Tail, TailLead, TimeCell};
use keepout_checker::number::{Dyadic, Interval, Rational};
use keepout_checker::support::Support;
use keepout_checker::trace::Stretch;
use num_traits::{FromPrimitive, Signed, Zero};
use std::cmp::Ordering;

/// What is to be proved of a piece.
pub(crate) struct Goal<'a> {
    pub(crate) formula: &'a IndexedFormula,
    pub(crate) from: &'a Rational,
    pub(crate) until: Option<&'a Rational>,
    /// Bounds of the groups' forms.
    pub(crate) bounds: Vec<Rational>,
    /// How much may be lost in all integrals together.
    pub(crate) slack: f64,
    /// The length of time on which it may be lost.
    pub(crate) horizon: f64,
}

/// Why a proof failed: the instant where it did.
#[derive(Clone, Debug)]
pub(crate) struct Stuck {
    pub(crate) at: f64,
}

struct Bounded<'a> {
    support: std::borrow::Cow<'a, Support>,
    bound: Option<&'a Rational>,
    conflict: Vec<(usize, bool)>,
    /// The support function in the scan.
    index: usize,
}

/// Proves a piece; the plan's inputs have their sizes.
pub(crate) fn prove(plan: &Plan, scan: &Scan, goal: &Goal, effort: &mut u64, limits: &Limits) -> Result<Piece, Stuck> {
    let limits = Limits { work: u64::MAX, ..limits.clone() };
    let mut all = Vec::new();
    for index in 0..plan.supports.len() {
        let support = &plan.supports[index];
        if let Some(bound) = goal.bounds.get(index) {
            for support in [std::borrow::Cow::Borrowed(support), std::borrow::Cow::Owned(support.negated())] {
                all.push(Bounded { support, bound: Some(bound), conflict: Vec::new(), index });
            }
        } else {
            let functional = &plan.functionals[index - goal.bounds.len()];
            let weighted = functional.polynomials.iter().map(|(p, w)| (*p, w.is_positive()));
            let conflict = if functional.variables.is_empty() { weighted.collect() } else { Vec::new() };
            all.push(Bounded { support: std::borrow::Cow::Borrowed(support), bound: None, conflict, index });
        }
    }
    let rest = (goal.slack / scan.scale.max(1e-300) * 1e-3).clamp(1e-30, 1e-4);
    let bits = plan.bits.min(if rest > 1e-12 { 60 } else { 124 });
    let mut prover = Prover { plan, scan, goal, all, budget: Budget::new(&limits), bits, rest };
    let (cells, tail) = prover.run(effort)?;
    Ok(Piece {
        families: plan.families.clone(),
        bounds: goal.bounds.clone(),
        functionals: plan.functionals.clone(),
        splits: plan.splits.clone(),
        cells,
        tail,
    })
}

struct Prover<'a> {
    plan: &'a Plan,
    scan: &'a Scan,
    goal: &'a Goal<'a>,
    all: Vec<Bounded<'a>>,
    budget: Budget,
    /// Mantissa bits on cells, and the size of a Taylor rest that does not matter: as the distance to the zone asks for.
    bits: u32,
    rest: f64,
}

/// Why a cell is not accepted.
enum Fault {
    /// The response of a signal of a support function loses too much.
    Signal(usize, usize),
    /// A bound is not met.
    Bound,
}

impl Prover<'_> {
    fn run(&mut self, effort: &mut u64) -> Result<(Vec<TimeCell>, Option<Tail>), Stuck> {
        let signals = self.plan.inputs.signals.len();
        let mut integrals = vec![vec![Dyadic::zero(); signals]; self.all.len()];
        let mut reached = Rational::zero();
        let mut pending: Vec<Rational> = Vec::new();
        let mut cells = Vec::new();
        let mut next_tail = 0.0;
        loop {
            let at = approx_value(&reached);
            let done = !cells.is_empty() && pending.is_empty();
            if done && self.goal.until.is_some_and(|until| reached >= *until) {
                return Ok((cells, None));
            }
            if done && self.goal.until.is_none() && reached >= *self.goal.from && at >= next_tail {
                if let Some(tail) = self.tail(&reached, &integrals, effort) {
                    return Ok((cells, Some(tail)));
                }
                next_tail = at * 1.1;
            }
            *effort = effort.checked_sub(1).ok_or(Stuck { at })?;
            let end = match pending.pop() {
                Some(end) => end,
                None => self.next_end(&reached),
            };
            let order = self.order(&reached, &end);
            match self.cell(&reached, &end, order, &integrals) {
                Ok(after) => {
                    integrals = after;
                    cells.push(TimeCell { to: end.clone(), order, bits: self.bits });
                    reached = end;
                }
                Err(fault) => {
                    let width = approx_value(&(&end - &reached));
                    if width <= 1e-13 * (at + width).max(1e-280) || pending.len() > 200 {
                        return Err(Stuck { at });
                    }
                    let cuts = self.cuts(at, approx_value(&end), fault);
                    let mut ends = vec![end.clone()];
                    for cut in cuts.into_iter().rev() {
                        let Some(cut) = between(&reached, cut, ends.last().unwrap_or(&end)) else { continue };
                        ends.push(cut);
                    }
                    if ends.len() == 1 {
                        ends.push(crate::strategy::cover::simple_middle(&reached, &end));
                    }
                    pending.extend(ends);
                }
            }
        }
    }

    /// The end of a cell that begins here and is as long as the Taylor models allow.
    fn next_end(&self, reached: &Rational) -> Rational {
        let at = approx_value(reached);
        let step = self.scan.stride(at);
        let mut end = rounded(at + step, step / 64.0).max(reached + rounded(step / 2.0, step / 64.0));
        if *reached < *self.goal.from {
            end = end.min(self.goal.from.clone());
        }
        self.goal.until.map_or(end.clone(), |until| end.min(until.clone()))
    }

    /// The number of Taylor terms for a cell.
    fn order(&self, from: &Rational, to: &Rational) -> u32 {
        let at = approx_value(from);
        let half = approx_value(&(to - from)) / 2.0;
        let x = (REACH * 2.0 / self.scan.stride(at).max(1e-300) * half).min(8.0);
        let mut order = 2.0_f64.max(2.0 * x).ceil();
        let mut term: f64 = (1..=(order as u32)).map(|k| x / f64::from(k)).product();
        while term > self.rest && order < 80.0 {
            order += 1.0;
            term *= x / order;
        }
        order as u32 + 4
    }

    /// The integrals after a cell, if it is accepted.
    fn cell(
        &mut self,
        from: &Rational,
        to: &Rational,
        order: u32,
        integrals: &[Vec<Dyadic>],
    ) -> Result<Vec<Vec<Dyadic>>, Fault> {
        let half = Rational::new(1.into(), 2.into());
        let (centre, half_width) = ((from + to) * &half, (to - from) * &half);
        let bits = self.bits;
        let stretch = Stretch { centre: &centre, half_width: &half_width, order, bits };
        let share = self.goal.slack / 2.0 * approx_value(&(to - from)) / self.goal.horizon;
        let mut conflicts = Vec::new();
        let mut after = Vec::new();
        for (one, before) in self.all.iter().zip(integrals) {
            let found = one.support.on_cell(&self.plan.inputs, before, stretch, &mut self.budget);
            let found = found.ok().flatten().ok_or(Fault::Bound)?;
            if let Some(bound) = one.bound
                && found.upper >= *Interval::rational(bound, bits).lo()
            {
                return Err(Fault::Bound);
            }
            for (k, (now, old)) in found.integrals.iter().zip(before).enumerate() {
                let gained = approx_dyadic(now) - approx_dyadic(old);
                let truth = self.scan.integral(one.index, k, approx_value(from), approx_value(to));
                // Rounding in floating point is no loss.
                let spare = share + self.share_of_zero(one.index, k, approx_value(from), approx_value(to));
                if self.scan.sizes[k] * (gained - truth) > spare + 1e-15 * self.scan.scale {
                    return Err(Fault::Signal(one.index, k));
                }
            }
            let needs_strict = found.upper.sign() != Ordering::Less;
            if !needs_strict || found.leaves_zero {
                conflicts.push(Conflict { parts: one.conflict.clone(), needs_strict });
            }
            after.push(found.integrals);
        }
        let in_window = to > self.goal.from || self.goal.until.is_some_and(|until| to >= until);
        if in_window && !self.goal.formula.is_refuted(&conflicts) {
            return Err(Fault::Bound);
        }
        Ok(after)
    }

    /// Where to cut a cell that is not accepted: just beside a zero of the response that loses too much, so near that little is
    /// lost between; or, where zeros are near the ends alone, nearer to them.
    fn cuts(&self, a: f64, b: f64, fault: Fault) -> Vec<f64> {
        let Fault::Signal(index, k) = fault else { return Vec::new() };
        let form = &self.scan.supports[index].signals[k];
        let f = |t: f64| form.value(t);
        // The loss on a cell around a zero is at most its length times the greatest size there.
        let wanted = self.goal.slack / 2.0 / self.zeros(index) / self.scan.sizes[k].max(1e-300);
        let width = |zero: f64, sign: f64, room: f64| {
            let mut width = room / 4.0;
            while 2.0 * width * f(zero + sign * width).abs() > wanted && width > 4e-15 * zero.abs() {
                width /= 2.0;
            }
            width
        };
        let samples: Vec<f64> = (0..=16).map(|i| a + (b - a) * f64::from(i) / 16.0).collect();
        let crossing = samples.windows(2).find(|w| f(w[0]) * f(w[1]) < 0.0).map(|w| bisect(&f, w[0], w[1]));
        if let Some(zero) = crossing {
            let half = width(zero, -1.0, zero - a).min(width(zero, 1.0, b - zero));
            return vec![zero - half, zero + half];
        }
        let (start, end) = (f(a).abs(), f(b).abs());
        let beside = width(a, 1.0, b - a);
        if start < 1e-3 * f(a + beside).abs() {
            return vec![a + beside];
        }
        vec![if start <= end { a + (b - a) / 4.0 } else { b - (b - a) / 4.0 }]
    }

    /// What may be lost on a cell with a zero of a response: an equal share for each zero.
    fn share_of_zero(&self, index: usize, k: usize, from: f64, to: f64) -> f64 {
        let crossings = &self.scan.crossings[index][k];
        let next = crossings.partition_point(|c| *c < from);
        let has_zero = from == 0.0 || crossings.get(next).is_some_and(|c| *c <= to);
        if has_zero { self.goal.slack / 2.0 / self.zeros(index) } else { 0.0 }
    }

    /// The number of zeros of responses, those at 0 included.
    fn zeros(&self, index: usize) -> f64 {
        self.scan.crossings[index].iter().map(|list| list.len() + 1).sum::<usize>() as f64
    }

    fn tail(&mut self, from: &Rational, integrals: &[Vec<Dyadic>], effort: &mut u64) -> Option<Tail> {
        let at = approx_value(from);
        let hopeful = self.all.iter().all(|one| self.scan.rest(one.index, at) <= self.goal.slack);
        if !from.is_positive() || !hopeful {
            return None;
        }
        let zero = Rational::zero();
        let table = &self.plan.table;
        let on_axis: Vec<usize> =
            (0..table.roots().len()).filter(|i| table.is_on_line(*i, &zero, self.plan.bits) == Some(true)).collect();
        let mut used: Vec<usize> = Vec::new();
        let mut leads = Vec::new();
        for one in &self.all {
            let forms = || std::iter::once(&one.support.central).chain(&one.support.responses);
            let terms = || forms().flat_map(|f| &f.terms).filter(|t| on_axis.contains(&t.root));
            let power = terms().map(|t| t.coefficients.len()).max().unwrap_or(1) - 1;
            let mut roots: Vec<usize> = terms().map(|t| t.root).collect();
            roots.sort_unstable();
            roots.dedup();
            used.extend(roots.iter().filter(|r| !table.roots()[**r].is_real));
            leads.push(TailLead { power: power as u32, roots, nodes: vec![None] });
        }
        used.sort_unstable();
        used.dedup();
        let dimension = used.len();
        let unit = |axis: usize| (0..dimension).map(|i| i64::from(i == axis)).collect();
        let angles = used.iter().enumerate().map(|(i, r)| Angle { root: *r, turns: unit(i), sum: None }).collect();
        let mut tail = Tail { from: from.clone(), base: used, angles, leads };
        let mut conflicts = Vec::new();
        for (position, integrals) in integrals.iter().enumerate() {
            let upper = self.leaves(&mut tail, position, integrals, effort)?;
            let one = &self.all[position];
            if let Some(bound) = one.bound {
                let stays = upper < *Interval::rational(bound, self.plan.bits).lo();
                if tail.leads[position].power > 0 || !stays {
                    return None;
                }
            }
            if upper.sign() == Ordering::Less {
                conflicts.push(Conflict { parts: one.conflict.clone(), needs_strict: false });
            }
        }
        self.goal.formula.is_refuted(&conflicts).then_some(tail)
    }

    /// Bisects the torus until the support function is below what is wanted, or as far as the effort goes.
    fn leaves(&mut self, tail: &mut Tail, position: usize, integrals: &[Dyadic], effort: &mut u64) -> Option<Dyadic> {
        let one = &self.all[position];
        let turns = |root: &usize| -> Vec<i64> {
            tail.angles.iter().find(|a| a.root == *root).map_or_else(|| vec![0; tail.base.len()], |a| a.turns.clone())
        };
        let leading: Vec<(usize, Vec<i64>)> = tail.leads[position].roots.iter().map(|r| (*r, turns(r))).collect();
        let (inputs, bits) = (&self.plan.inputs, self.plan.bits);
        let mut lead = tail.leads[position].clone();
        let form =
            one.support.tail_form(inputs, integrals, (&*tail, &lead, &leading), 0, (bits, &mut self.budget)).ok()?;
        let wanted = one.bound.map_or_else(Dyadic::zero, |b| Interval::rational(b, bits).lo().clone());
        lead.nodes.clear();
        let mut greatest: Option<Dyadic> = None;
        let mut open = vec![keepout_checker::lead::whole_torus(tail.base.len())];
        while let Some(angles) = open.pop() {
            *effort = effort.checked_sub(1)?;
            let upper = form.on_leaf(&angles)?;
            let axis = crate::strategy::cone::widest(&angles);
            let small = axis.is_none_or(|a| angles[a].1 < Rational::new(1.into(), 1_000_000.into()));
            if upper < wanted || small {
                lead.nodes.push(None);
                greatest = Some(greatest.map_or(upper.clone(), |g: Dyadic| g.max(upper)));
                if small && greatest.as_ref().is_some_and(|g| *g >= wanted) {
                    // It is not to be had: one leaf for the whole.
                    lead.nodes = vec![None];
                    tail.leads[position] = lead;
                    return form.on_leaf(&keepout_checker::lead::whole_torus(tail.base.len()));
                }
                continue;
            }
            let axis = axis?;
            lead.nodes.push(Some(axis));
            let (lower, higher) = keepout_checker::lead::halves(&angles, axis)?;
            open.push(higher);
            open.push(lower);
        }
        tail.leads[position] = lead;
        greatest
    }
}

/// A number near x, a multiple of a power of two that is not much more than the grain.
pub(crate) fn rounded(x: f64, grain: f64) -> Rational {
    let unit = 2.0_f64.powi(grain.max(1e-300).log2().floor() as i32);
    let steps = (x / unit).round();
    Rational::from_f64(steps).unwrap_or_else(Rational::zero) * Rational::from_f64(unit).unwrap_or_else(Rational::zero)
}

/// A rational near x strictly between two others.
fn between(low: &Rational, x: f64, high: &Rational) -> Option<Rational> {
    let grain = (x - approx_value(low)).min(approx_value(high) - x) / 8.0;
    if grain <= 0.0 || grain.is_nan() {
        return None;
    }
    let value = rounded(x, grain.max(x.abs() * 1e-16));
    (value > *low && value < *high).then_some(value)
}
