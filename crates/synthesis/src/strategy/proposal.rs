//! Leading terms in floating point: they say where to look, and prove nothing.

use crate::enclosure::{Enclosure, approx_value};
use crate::problem::Problem;
use crate::strategy::cone::{Plan, approx_dyadic};
use keepout_checker::certificate::Sign;
use keepout_checker::lead::{AngleBox, LeadForm};
use keepout_checker::number::Interval;
use std::cmp::Ordering;

/// A leading part: terms Re(c exp(i n . phi)), and a bound of the rest.
struct Form {
    waves: Vec<(f64, f64, Vec<f64>)>,
    slack: f64,
}

/// The leading parts of all functions; `None`: there is none, or its numbers are out of range.
pub(crate) struct Proposals {
    forms: Vec<Option<Form>>,
    vanishes: Vec<bool>,
}

/// An interval of angles: centre and radius.
pub(crate) type ApproxBox = Vec<(f64, f64)>;

pub(crate) fn approx_box(angles: &AngleBox) -> ApproxBox {
    angles.iter().map(|(c, r)| (approx_value(c), approx_value(r))).collect()
}

impl Proposals {
    pub(crate) fn new(plan: &Plan, forms: &[Option<LeadForm>], problem: &Problem, enclosure: &Enclosure) -> Self {
        let form = |index: usize| {
            let (lead, exact) = (plan.leads[index].as_ref()?, forms[index].as_ref()?);
            let leading = enclosure.forms[index].terms.iter().filter(|t| lead.roots.contains(&t.root));
            let top = leading.clone().map(|t| t.coefficients.len()).max()?;
            let mut waves = Vec::new();
            for term in leading.filter(|t| t.coefficients.len() == top) {
                let c = term.coefficients.last()?;
                let weight = if term.is_real { 1.0 } else { 2.0 };
                let turns = plan.turns(term.root).iter().map(|n| *n as f64).collect();
                waves.push((weight * middle(&c.re), weight * middle(&c.im), turns));
            }
            let size: f64 = waves.iter().map(|(re, im, _)| re.abs() + im.abs()).sum();
            let slack = approx_dyadic(exact.rest()) + 1e-13 * size;
            (size.is_finite() && size < 1e200 && slack.is_finite()).then_some(Form { waves, slack })
        };
        let vanishes = (0..forms.len()).map(|f| problem.is_zero(f)).collect();
        Self { forms: (0..forms.len()).map(form).collect(), vanishes }
    }

    /// The probable sign of a function on a box.
    pub(crate) fn sign(&self, function: usize, angles: &ApproxBox) -> Option<Sign> {
        if self.vanishes[function] {
            return Some(Ordering::Equal);
        }
        let (value, radius) = self.value(function, angles)?;
        if value > radius {
            Some(Ordering::Greater)
        } else if value < -radius {
            Some(Ordering::Less)
        } else {
            None
        }
    }

    /// The probable value of a function at the centre of a box, and how far it may be from it elsewhere in the box.
    pub(crate) fn value(&self, function: usize, angles: &ApproxBox) -> Option<(f64, f64)> {
        let form = self.forms[function].as_ref()?;
        let (mut value, mut bend) = (0.0, 0.0);
        let mut gradient = vec![0.0; angles.len()];
        for (re, im, turns) in &form.waves {
            let angle: f64 = turns.iter().zip(angles).map(|(n, (c, _))| n * c).sum();
            let (sin, cos) = angle.sin_cos();
            value += re * cos - im * sin;
            let mut reach = 0.0;
            for ((n, (_, r)), slope) in turns.iter().zip(angles).zip(&mut gradient) {
                *slope -= n * (re * sin + im * cos);
                reach += n.abs() * r;
            }
            bend += 0.5 * re.hypot(*im) * reach * reach;
        }
        let spread: f64 = gradient.iter().zip(angles).map(|(slope, (_, r))| slope.abs() * r).sum();
        Some((value, spread + bend + form.slack))
    }

    /// Whether the zone is probably true on a box just where the one trace of undecided sign is zero, and not beside.
    pub(crate) fn is_true_at_zero(&self, angles: &ApproxBox, problem: &Problem) -> bool {
        let signs: Vec<Option<Sign>> = (0..self.forms.len()).map(|f| self.sign(f, angles)).collect();
        let undecided: Vec<usize> = (0..problem.atoms()).filter(|f| signs[*f].is_none()).collect();
        let [only] = undecided.as_slice() else { return false };
        let truths = problem.truths(&signs, *only);
        truths[1] == Some(true) && truths[0] != Some(true) && truths[2] != Some(true)
    }

    /// The probable truth of the zone on a box; signs of auxiliary functions only where those of traces do not decide.
    pub(crate) fn truth(&self, angles: &ApproxBox, problem: &Problem) -> Option<bool> {
        let mut signs = vec![None; self.forms.len()];
        for function in (0..problem.atoms()).chain(problem.traces()..self.forms.len()) {
            if function == problem.traces()
                && let Some(truth) = problem.truth(&signs)
            {
                return Some(truth);
            }
            signs[function] = self.sign(function, angles);
        }
        problem.truth(&signs)
    }
}

fn middle(x: &Interval) -> f64 {
    0.5 * (approx_dyadic(x.lo()) + approx_dyadic(x.hi()))
}
