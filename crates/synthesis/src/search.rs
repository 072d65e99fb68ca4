//! The search for one claim: cells and a cone for `never`, an instant for `enters`, at growing times and precisions.

use crate::enclosure::{Enclosure, approx_value};
use crate::options::Options;
use crate::outcome::Reason;
use crate::problem::Problem;
use crate::strategy::cone::{Plan, first_start};
use crate::strategy::cover::{Cover, Entry, Step};
use crate::strategy::inseparable::meeting;
use crate::strategy::late;
use keepout_checker::certificate::{Cell, Certificate, Cone, Evidence, Node, Pivot, Sign, Sum};
use keepout_checker::check;
use keepout_checker::error::{Obligation, Rejection, Rule};
use keepout_checker::lead::AngleBox;
use keepout_checker::number::Rational;
use keepout_checker::signs::SignSet;
use keepout_checker::statement::{Claim, Statement};
use num_traits::Zero;

/// What became of a claim.
pub(crate) enum Finding {
    /// A certificate that the zone is never entered, or that the cone avoids it.
    Never(Certificate),
    /// A certificate of an entry, the first where that is not too late to tell.
    Enters(Certificate),
    /// A certificate that each cone meets the zone.
    Inseparable(Certificate),
    /// Nothing.
    Open(Reason),
}

/// The first precision tried; each further one is twice as great.
const FIRST_BITS: u32 = 96;

/// Identities, late entries and points of the cone in the zone are looked for when no cone was found at the first so many
/// starts, and the latter two again each third start.
const PATIENCE: u32 = 6;

/// A window that ends before so many times the first start of a cone is covered by cells alone.
const NEAR_END: u32 = 256;

/// A first entry is looked for where the cover up to it takes no more than about so many cells.
const MAX_CELLS_BEFORE: f64 = 2_000.0;

/// The power of two below which the terms that do not lead are negligible.
const NEGLIGIBLE: i64 = -60;

/// Halvings between the last start without a cone and the first with one.
const HALVINGS: u32 = 12;

/// A cone's start is doubled at most so often.
const MAX_DOUBLINGS: u32 = 60;

/// Searches evidence for `never` with a margin, or of an entry, or that each cone meets the zone.
pub(crate) fn settle(statement: &Statement, margin: &Rational, options: &Options, effort: &mut u64) -> Finding {
    at_rising_precision(statement, margin, options, effort, |attempt| attempt.run())
}

/// Searches the least start of a cone that avoids the zone, or evidence that each cone meets it.
pub(crate) fn settle_eventually(statement: &Statement, options: &Options, effort: &mut u64) -> Finding {
    at_rising_precision(statement, &Rational::zero(), options, effort, |attempt| attempt.run_eventually())
}

fn at_rising_precision(
    statement: &Statement,
    margin: &Rational,
    options: &Options,
    effort: &mut u64,
    run: impl Fn(Attempt) -> Finding,
) -> Finding {
    let problem = match Problem::new(statement, Claim::Never { margin: margin.clone() }, &options.limits) {
        Ok(problem) => problem,
        Err(rejection) => return Finding::Open(Reason::Limit(rejection)),
    };
    let mut bits = FIRST_BITS;
    let mut last = Reason::Effort { clear_until: statement.zone.from.clone() };
    while bits <= options.max_bits {
        let hopeless = match &last {
            Reason::TouchesInTheLimit { tried } => Some(tried.clone()),
            _ => None,
        };
        let attempt = Attempt::new(problem.clone(), bits, options, effort);
        match attempt.map(|attempt| attempt.unless_hopeless(hopeless.as_ref(), &run)) {
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

/// What became of the search for a late entry.
enum Late {
    Found(Box<Finding>),
    /// There is one so near that the cover will come to it.
    Near,
    None,
}

struct Attempt<'a> {
    problem: Problem,
    enclosure: Enclosure,
    /// Made when it is first needed; then `None` if no cone can be planned.
    plan: Option<Option<Plan>>,
    /// A box of the torus that stood in the way of the last cone.
    obstacle: Option<AngleBox>,
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
        Ok(Self { problem, enclosure, plan: None, obstacle: None, cover, effort })
    }

    /// Runs, unless even this precision brings no cone where none was found before.
    fn unless_hopeless(mut self, tried: Option<&Rational>, run: &impl Fn(Attempt) -> Finding) -> Finding {
        let Some(t0) = tried else { return run(self) };
        self.enrich();
        if self.cone(t0).is_some() { run(self) } else { self.no_cone(t0) }
    }

    /// Looks for a cone at doubling starts, and extends the cover to each of them, until one of the two settles the zone.
    fn run(mut self) -> Finding {
        let until = self.problem.statement.zone.until.clone();
        let mut t0 = first_start(&self.enclosure);
        let far = &t0 * Rational::from_integer(NEAR_END.into());
        let ends_soon = until.as_ref().is_some_and(|until| *until <= far);
        for attempt in 0..MAX_DOUBLINGS {
            if attempt == PATIENCE && until.is_none() {
                self.enrich();
            }
            if let Some(until) = until.as_ref().filter(|until| **until <= t0) {
                return self.finish(&until.clone(), None);
            }
            if !ends_soon && let Some(cone) = self.cone(&t0) {
                return self.finish(&t0, Some(cone));
            }
            if until.is_none() && attempt >= PATIENCE && attempt % 3 == 0 {
                match self.late_entry(&t0) {
                    Late::Found(found) => return *found,
                    Late::Near => {}
                    Late::None => {
                        if t0 > self.problem.statement.zone.from
                            && let Some(found) = self.meeting(&t0, false)
                        {
                            return found;
                        }
                        if attempt > PATIENCE && self.is_settled_far_field(&t0) {
                            break;
                        }
                    }
                }
            }
            if t0 > self.problem.statement.zone.from
                && let Some(end) = self.extend(&t0)
            {
                return end;
            }
            t0 *= Rational::from_integer(2.into());
        }
        self.no_cone(&t0)
    }

    /// Looks for the least start of a cone, or a point of each cone in the zone.
    fn run_eventually(mut self) -> Finding {
        let mut t0 = first_start(&self.enclosure);
        let mut without = Rational::zero();
        self.enrich();
        for attempt in 0..MAX_DOUBLINGS {
            if let Some(cone) = self.cone(&t0) {
                return self.earliest(without, cone);
            }
            if attempt >= PATIENCE
                && attempt % 3 == 0
                && let Some(found) = self.meeting(&t0, true)
            {
                return found;
            }
            without = t0.clone();
            t0 *= Rational::from_integer(2.into());
        }
        self.no_cone(&t0)
    }

    /// The claim for the earliest cone between a start without one and a start with one.
    fn earliest(mut self, mut without: Rational, mut cone: Cone) -> Finding {
        let zone_from = self.problem.statement.zone.from.clone();
        for _ in 0..HALVINGS {
            if cone.far.from <= zone_from {
                break;
            }
            let middle = (&without + &cone.far.from) / Rational::from_integer(2.into());
            match self.cone(&middle) {
                Some(earlier) => cone = earlier,
                None => without = middle,
            }
        }
        let claim = Claim::Eventually { from: cone.far.from.clone().max(zone_from) };
        let statement = Statement { claim, ..self.problem.statement.clone() };
        let sums = self.sums();
        Finding::Never(self.certificate(statement, sums, Evidence::Never { cells: Vec::new(), cone: Some(cone) }))
    }

    /// Whether the leading terms on a torus of dimension 2 or more are all that is left: later starts show nothing new.
    fn is_settled_far_field(&self, t0: &Rational) -> bool {
        let Some(Some(plan)) = &self.plan else { return false };
        let leading = plan.leading(t0, &self.problem, &self.enclosure);
        plan.base.len() > 1 && leading.forms.iter().flatten().all(|form| form.rest().top() < NEGLIGIBLE)
    }

    fn no_cone(self, tried: &Rational) -> Finding {
        let unproved = self.plan.flatten().is_none_or(|p| p.unproved);
        Finding::Open(match unproved {
            true => Reason::EqualRates,
            false => Reason::TouchesInTheLimit { tried: tried.clone() },
        })
    }

    fn enrich(&mut self) {
        if self.problem.enrich() {
            let _ = self.enclosure.renew(&self.problem);
        }
    }

    /// An entry at a late time where the phases come into the zone; the cover goes on where that time is near.
    fn late_entry(&mut self, t0: &Rational) -> Late {
        let from = self.problem.statement.zone.from.clone().max(t0.clone());
        let Some(Some(plan)) = &self.plan else { return Late::None };
        let candidates = late::candidates(plan, &from, &self.problem, &self.enclosure);
        let reached = approx_value(&self.cover.reached).max(1e-300);
        let cells_to = |t: &Rational| self.cover.cells.len() as f64 * approx_value(t) / reached;
        if candidates.first().is_some_and(|(_, late)| cells_to(late) <= MAX_CELLS_BEFORE) {
            return Late::Near;
        }
        for (early, late) in candidates {
            let mut local = Cover::new(&early);
            if let Step::Entered(Entry { from, cell, .. }) =
                local.extend(&late, &mut self.problem, &mut self.enclosure, self.effort)
            {
                let claim = Claim::Enters { from: from.clone(), to: cell.to.clone(), first: false };
                let statement = Statement { claim, ..self.problem.statement.clone() };
                let evidence = Evidence::Enters { before: Vec::new(), from, cell };
                return Late::Found(Box::new(Finding::Enters(self.certificate(statement, Vec::new(), evidence))));
            }
        }
        Late::None
    }

    /// A point of each cone in the zone; `plain`: also where the zone is true on a whole box.
    fn meeting(&mut self, t0: &Rational, plain: bool) -> Option<Finding> {
        let plan = Plan::of_all(&mut self.problem, &mut self.enclosure)?;
        // A single phase comes back to each value: there the zone is entered, which the cover shows.
        if plan.base.len() < 2 && !plain {
            return None;
        }
        let found = meeting(&plan, t0, plain, &self.problem, &self.enclosure, self.effort)?;
        let statement = Statement { claim: Claim::Inseparable, ..self.problem.statement.clone() };
        let certificate = self.certificate(statement, plan.sums, Evidence::Inseparable(found));
        // That the base frequencies are independent is for the checker to say.
        let is_proved = check(&certificate.statement, &certificate, self.enclosure.limits()).is_ok();
        is_proved.then_some(Finding::Inseparable(certificate))
    }

    fn sums(&self) -> Vec<Sum> {
        self.plan.iter().flatten().flat_map(|plan| plan.sums.clone()).collect()
    }

    fn cone(&mut self, t0: &Rational) -> Option<Cone> {
        let functions = self.problem.factors.len();
        if self.plan.as_ref().and_then(Option::as_ref).is_some_and(|plan| plan.leads.len() < functions) {
            self.plan = None;
        }
        let plan = self.plan.get_or_insert_with(|| Plan::new(&mut self.problem, &mut self.enclosure));
        plan.as_ref()?.cone(t0, &mut self.obstacle, &self.problem, &self.enclosure, self.effort)
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
        let sums = if cone.is_some() { self.sums() } else { Vec::new() };
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
        let is_plain = self.is_plain(&evidence);
        let (auxiliaries, identities) = match is_plain {
            true => (Vec::new(), Vec::new()),
            false => (self.problem.auxiliaries(), self.problem.identities.clone()),
        };
        Certificate {
            statement,
            bits: self.enclosure.bits,
            families: self.enclosure.families.clone(),
            traces: self.problem.factors[..self.problem.traces()].to_vec(),
            auxiliaries,
            identities,
            sums,
            evidence,
        }
    }

    /// Whether evidence that the zone is never entered needs no function but traces.
    fn is_plain(&self, evidence: &Evidence) -> bool {
        let Evidence::Never { cells, cone } = evidence else { return false };
        let refuted = |signs: &[(usize, Sign)]| {
            let mut sets = vec![SignSet::ANY; self.problem.factors.len()];
            signs.iter().for_each(|(f, sign)| sets[*f] = SignSet::only(*sign));
            self.problem.formula.truth(&sets) == Some(false)
        };
        let is_plain_cell = |cell: &Cell| match &cell.pivot {
            Pivot::None => refuted(&cell.signs),
            Pivot::Start(_) => cell.signs.iter().all(|(f, _)| *f < self.problem.traces()),
            Pivot::Function(_) => false,
        };
        let is_plain_node = |node: &Node| match node {
            Node::Split(_) => true,
            Node::Leaf(signs, pivot) => pivot.is_none() && refuted(signs),
        };
        let mut leads = cone.iter().flat_map(|cone| &cone.far.leads);
        cells.iter().all(is_plain_cell)
            && cone.iter().flat_map(|cone| &cone.nodes).all(is_plain_node)
            && leads.all(|lead| lead.function < self.problem.traces())
    }
}
