//! Covers: cells in the order of time, halved until the zone is decided on each.

use crate::enclosure::{Enclosure, Judgement, approx_value};
use crate::problem::Problem;
use crate::strategy::entry::{instant, needed};
use crate::strategy::pivot;
use keepout_checker::certificate::{Cell, Pivot};
use keepout_checker::number::Rational;
use num_traits::Zero;

/// A cell that has been decided, and the instant where it begins.
#[derive(Clone, Debug)]
pub(crate) struct Entry {
    /// Before this instant, from the window's start on, the zone is not entered.
    pub(crate) clear_until: Rational,
    /// The start of the cell in which it is entered.
    pub(crate) from: Rational,
    /// That cell.
    pub(crate) cell: Cell,
}

/// How the extension of a cover ended.
#[derive(Clone, Debug)]
pub(crate) enum Step {
    /// The cover reaches the wanted instant.
    Done,
    /// The zone is entered.
    Entered(Entry),
    /// Neither the zone's truth nor its falsehood can be shown in this bracket.
    Stuck(Rational, Rational),
    /// The work is used up.
    Exhausted,
}

/// A cover that grows in time.
pub(crate) struct Cover {
    pub(crate) from: Rational,
    pub(crate) reached: Rational,
    pub(crate) cells: Vec<Cell>,
    hint: Vec<usize>,
}

/// An entry is bracketed to this relative width, as a power of two: 2^-34 < 1e-10.
const BRACKET: i32 = -34;

/// Pivots are dear: they are tried at this width, and after so many further halvings each.
const TOUCH_EVERY: i32 = 16;

impl Cover {
    pub(crate) fn new(from: &Rational) -> Self {
        Self { from: from.clone(), reached: from.clone(), cells: Vec::new(), hint: Vec::new() }
    }

    /// Extends the cover to an instant.
    pub(crate) fn extend(
        &mut self,
        to: &Rational,
        problem: &mut Problem,
        enclosure: &mut Enclosure,
        effort: &mut u64,
    ) -> Step {
        if self.reached >= *to && !self.cells.is_empty() {
            return Step::Done;
        }
        if self.cells.is_empty()
            && let Some(step) = self.first_instant(to, problem, enclosure)
        {
            return step;
        }
        let mut open = vec![(self.reached.clone(), to.clone())];
        while let Some((a, b)) = open.pop() {
            if *effort == 0 {
                return Step::Exhausted;
            }
            *effort = effort.saturating_sub(enclosure.cost());
            let judgement = enclosure.judge(problem, &a, &b, &self.hint);
            match judgement.truth {
                Some(false) => self.push(problem, &b, judgement),
                Some(true) => return self.entered(&a, &a, instant(&a, problem, enclosure)),
                None => match self.undecided(&a, &b, problem, enclosure) {
                    Undecided::Split => {
                        let middle = simple_middle(&a, &b);
                        open.push((middle.clone(), b));
                        open.push((a, middle));
                    }
                    Undecided::Covered => {}
                    Undecided::Again => open.push((a, b)),
                    Undecided::Step(step) => return *step,
                },
            }
        }
        Step::Done
    }

    fn entered(&self, clear_until: &Rational, from: &Rational, cell: Option<Cell>) -> Step {
        match cell {
            Some(cell) => Step::Entered(Entry { clear_until: clear_until.clone(), from: from.clone(), cell }),
            None => Step::Stuck(clear_until.clone(), from.clone()),
        }
    }

    fn push(&mut self, problem: &Problem, to: &Rational, judgement: Judgement) {
        let signs = needed(problem, judgement.signs, false);
        self.hint = signs.iter().map(|(i, _)| *i).collect();
        self.cells.push(Cell { to: to.clone(), order: judgement.order, signs, pivot: Pivot::None });
        self.reached = to.clone();
    }

    /// The window's first instant: decided by itself, and at t = 0 exactly; then what comes just after it.
    fn first_instant(&mut self, to: &Rational, problem: &mut Problem, enclosure: &mut Enclosure) -> Option<Step> {
        let from = self.from.clone();
        if let Some(cell) = instant(&from, problem, enclosure) {
            return Some(self.entered(&from, &from, Some(cell)));
        }
        let mut judgement = enclosure.judge(problem, &from, &from, &[]);
        if judgement.truth.is_none() && !from.is_zero() {
            // A trace may be zero at just this instant.
            pivot::divide_at(&from, &from, problem);
            enclosure.renew(problem)?;
            if let Some(cell) = instant(&from, problem, enclosure) {
                return Some(self.entered(&from, &from, Some(cell)));
            }
            judgement = enclosure.judge(problem, &from, &from, &[]);
        }
        if from == *to {
            return match judgement.truth {
                Some(false) => {
                    self.push(problem, to, judgement);
                    Some(Step::Done)
                }
                Some(true) | None => Some(Step::Stuck(from.clone(), from)),
            };
        }
        if !from.is_zero() || judgement.truth != Some(false) {
            return None;
        }
        match pivot::at_start(to, problem, enclosure) {
            pivot::AtStart::Ordinary => None,
            pivot::AtStart::Clear(cell) => {
                self.reached = cell.to.clone();
                self.cells.push(cell);
                (self.reached >= *to).then_some(Step::Done)
            }
            pivot::AtStart::Entered(cell) => Some(self.entered(&from, &from, Some(cell))),
        }
    }

    fn undecided(&mut self, a: &Rational, b: &Rational, problem: &mut Problem, enclosure: &mut Enclosure) -> Undecided {
        let width = approx_value(&(b - a)) / approx_value(b);
        if width > 2.0_f64.powi(BRACKET) {
            return Undecided::Split;
        }
        if let Some(cell) = instant(b, problem, enclosure) {
            return Undecided::Step(Box::new(self.entered(a, b, Some(cell))));
        }
        if problem.enrich() && enclosure.renew(problem).is_some() {
            return Undecided::Again;
        }
        let is_last = width <= 2.0_f64.powf(-0.45 * f64::from(enclosure.bits));
        let touch = match is_last || width.log2().floor() as i32 % TOUCH_EVERY == BRACKET % TOUCH_EVERY - 1 {
            true => pivot::touch(a, b, problem, enclosure),
            false => None,
        };
        match touch {
            None | Some(pivot::Touch::None) => {}
            Some(pivot::Touch::Clear(cell)) => {
                self.reached = cell.to.clone();
                self.cells.push(cell);
                return Undecided::Covered;
            }
            Some(pivot::Touch::Entered(cell)) => return Undecided::Step(Box::new(self.entered(a, a, Some(cell)))),
        }
        if !is_last {
            return Undecided::Split;
        }
        Undecided::Step(Box::new(Step::Stuck(a.clone(), b.clone())))
    }
}

enum Undecided {
    Split,
    Covered,
    Again,
    Step(Box<Step>),
}

/// A rational with a short binary expansion near the middle of [a, b].
pub(crate) fn simple_middle(a: &Rational, b: &Rational) -> Rational {
    let middle = (a + b) / Rational::from_integer(2.into());
    let width = approx_value(&(b - a));
    if width <= 0.0 {
        return middle;
    }
    // 2^-k <= width / 64: rounding the middle to a multiple of it moves it by less than a hundredth of the width.
    let k = 6_i64.saturating_sub(width.log2().floor() as i64);
    let power = Rational::from_integer(num_bigint::BigInt::from(1) << u64::try_from(k.clamp(0, 4000)).unwrap_or(0));
    let rounded = (middle.clone() * &power).round() / power;
    if *a < rounded && rounded < *b { rounded } else { middle }
}
