//! The search for one claim: cells and a cone for `never`, an instant for `enters`, at growing times and precisions.

use crate::enclosure::Enclosure;
use crate::options::Options;
use crate::outcome::Reason;
use crate::problem::Problem;
use crate::strategy::cone::{Plan, first_start};
use crate::strategy::cover::{Cover, Entry, Step};
use keepout_checker::certificate::{Certificate, Cone, Evidence, Sum};
use keepout_checker::error::{Obligation, Rejection, Rule};
use keepout_checker::number::Rational;
use keepout_checker::statement::{Claim, Statement};

/// What became of a claim `never`.
pub(crate) enum Finding {
    /// A certificate that it is true.
    Never(Certificate),
    /// A certificate of the first entry.
    Enters(Certificate),
    /// Nothing.
    Open(Reason),
}

/// The first precision tried; each further one is twice as great.
const FIRST_BITS: u32 = 96;

/// An identity that holds for all time is looked for when no cone was found at the first so many starts.
const TIMELESS_AFTER: u32 = 6;

/// A cone's start is doubled at most so often.
const MAX_DOUBLINGS: u32 = 60;

/// Searches evidence for `never` with a margin, or of an entry.
pub(crate) fn settle(statement: &Statement, margin: &Rational, options: &Options, effort: &mut u64) -> Finding {
    let problem = match Problem::new(statement, Claim::Never { margin: margin.clone() }, &options.limits) {
        Ok(problem) => problem,
        Err(rejection) => return Finding::Open(Reason::Limit(rejection)),
    };
    let mut bits = FIRST_BITS;
    let mut last = Reason::Effort { clear_until: statement.zone.from.clone() };
    while bits <= options.max_bits {
        match Attempt::new(problem.clone(), bits, options, effort).map(Attempt::run) {
            Err(rejection @ Rejection::LimitExceeded { .. }) => return Finding::Open(Reason::Limit(rejection)),
            // The roots are not separated at this precision.
            Err(_) => {}
            Ok(Finding::Open(reason @ (Reason::Effort { .. } | Reason::Limit(_)))) => return Finding::Open(reason),
            Ok(Finding::Open(reason)) => last = reason,
            Ok(found) => return found,
        }
        bits *= 2;
    }
    Finding::Open(last)
}

struct Attempt<'a> {
    problem: Problem,
    enclosure: Enclosure,
    /// Made when it is first needed; then `None` if no cone can be planned.
    plan: Option<Option<Plan>>,
    cover: Cover,
    effort: &'a mut u64,
}

impl<'a> Attempt<'a> {
    fn new(problem: Problem, bits: u32, options: &Options, effort: &'a mut u64) -> Result<Self, Rejection> {
        let mut enclosure = Enclosure::new(&problem, bits, &options.limits)?;
        if bits.saturating_mul(2) <= options.max_bits && !enclosure.is_precise(&problem) {
            return Err(Rejection::Inconclusive {
                rule: Rule::Trace,
                obligation: Obligation::ClosedFormIsEnclosed,
                position: 0,
            });
        }
        let cover = Cover::new(&problem.statement.zone.from);
        Ok(Self { problem, enclosure, plan: None, cover, effort })
    }

    /// Looks for a cone at doubling starts, and extends the cover to each of them, until one of the two settles the zone.
    fn run(mut self) -> Finding {
        let until = self.problem.statement.zone.until.clone();
        let mut t0 = first_start(&self.enclosure);
        for attempt in 0..MAX_DOUBLINGS {
            if attempt == TIMELESS_AFTER
                && let Some(cell) = self.cover.pivots.timeless(
                    until.as_ref().unwrap_or(&self.cover.from),
                    &mut self.problem,
                    &mut self.enclosure,
                )
            {
                let evidence = Evidence::Never { cells: vec![cell], cone: None };
                return Finding::Never(self.certificate(self.problem.statement.clone(), Vec::new(), evidence));
            }
            if let Some(until) = until.as_ref().filter(|until| **until <= t0) {
                return self.finish(&until.clone(), None);
            }
            if let Some(cone) = self.cone(&t0) {
                return self.finish(&t0, Some(cone));
            }
            if t0 > self.problem.statement.zone.from
                && let Some(end) = self.extend(&t0)
            {
                return end;
            }
            t0 *= Rational::from_integer(2.into());
        }
        let unproved = self.plan.flatten().is_none_or(|p| p.unproved);
        Finding::Open(if unproved { Reason::EqualRates } else { Reason::TouchesInTheLimit })
    }

    fn cone(&mut self, t0: &Rational) -> Option<Cone> {
        let plan = self.plan.get_or_insert_with(|| Plan::new(&mut self.problem, &mut self.enclosure));
        plan.as_ref()?.cone(t0, &self.problem, &self.enclosure, self.effort)
    }

    /// Extends the cover; what it finds, if it does not just get there.
    fn extend(&mut self, to: &Rational) -> Option<Finding> {
        match self.cover.extend(to, &mut self.problem, &mut self.enclosure, self.effort) {
            Step::Done => None,
            Step::Entered(entry) => Some(Finding::Enters(self.entry_certificate(entry))),
            Step::Stuck(from, to) => Some(Finding::Open(Reason::Touches { from, to })),
            Step::Exhausted => Some(Finding::Open(Reason::Effort { clear_until: self.cover.reached.clone() })),
        }
    }

    /// Closes the cover up to an instant, and states `never`.
    fn finish(mut self, to: &Rational, cone: Option<Cone>) -> Finding {
        let from = self.problem.statement.zone.from.clone();
        if (cone.is_none() || *to > from)
            && let Some(end) = self.extend(to)
        {
            return end;
        }
        let sums = match (&cone, &self.plan) {
            (Some(_), Some(Some(plan))) => plan.sums.clone(),
            _ => Vec::new(),
        };
        let cells = std::mem::take(&mut self.cover.cells);
        Finding::Never(self.certificate(self.problem.statement.clone(), sums, Evidence::Never { cells, cone }))
    }

    /// The certificate of a first entry.
    fn entry_certificate(&mut self, entry: Entry) -> Certificate {
        let start = &self.problem.statement.zone.from;
        let before = if entry.clear_until > *start { std::mem::take(&mut self.cover.cells) } else { Vec::new() };
        let claim = Claim::Enters { from: entry.clear_until.clone(), to: entry.cell.to.clone(), first: true };
        let statement = Statement { claim, ..self.problem.statement.clone() };
        self.certificate(statement, Vec::new(), Evidence::Enters { before, from: entry.from, cell: entry.cell })
    }

    fn certificate(&self, statement: Statement, sums: Vec<Sum>, evidence: Evidence) -> Certificate {
        Certificate {
            statement,
            bits: self.enclosure.bits,
            families: self.enclosure.families.clone(),
            traces: self.problem.factors.clone(),
            auxiliaries: self.cover.pivots.auxiliaries.clone(),
            products: self.cover.pivots.products.clone(),
            sums,
            evidence,
        }
    }
}
