//! A trajectory that is in the zone: the worst start and the worst signals of one functional.

use super::plan::Plan;
use super::scan::{Scan, rounded_near};
use crate::enclosure::approx_value;
use keepout_checker::Limits;
use keepout_checker::certificate::{Certificate, Evidence};
use keepout_checker::formula::IndexedFormula;
use keepout_checker::many::{Functional, Witness};
use keepout_checker::number::Rational;
use keepout_checker::statement::{Claim, Range, Starts, Statement, Variable};
use keepout_checker::support::{Inputs, Shape};
use num_traits::{One, Signed, Zero};
use std::collections::BTreeSet;

/// What one admissible trajectory is: the worst for some function at some instant.
#[derive(Clone, Debug)]
pub(crate) struct Choice {
    pub(crate) at: Rational,
    pub(crate) start: Vec<Rational>,
    pub(crate) weights: Vec<Rational>,
    pub(crate) uncertain: Vec<Rational>,
    pub(crate) signals: Vec<Vec<(Rational, Rational)>>,
}

/// The worst trajectory for one support function of a scan at an instant; the statement is that of the plan, with its uncertain
/// quantities at the given values.
pub(crate) fn worst(
    plan: &Plan,
    scan: &Scan,
    index: usize,
    at: &Rational,
    statement: &Statement,
    uncertain: Vec<Rational>,
) -> Choice {
    let t = approx_value(at);
    let support = &scan.supports[index];
    let values: Vec<f64> = support.responses.iter().map(|f| f.value(t)).collect();
    let (start, weights) = worst_start(&plan.plain, &plan.inputs, &values);
    let mut signals = Vec::new();
    for (k, disturbance) in statement.disturbances.iter().enumerate() {
        let form = &support.signals[k];
        let mut switches: Vec<Rational> = Vec::new();
        for crossing in scan.crossings[index][k].iter().rev().filter(|c| **c < t) {
            let until = at - rounded_near(*crossing);
            if until.is_positive() && until < *at && switches.last().is_none_or(|last| until > *last) {
                switches.push(until);
            }
        }
        switches.push(at.clone());
        let mut begin = Rational::zero();
        let mut signal = Vec::new();
        for until in switches {
            let middle = (approx_value(&begin) + approx_value(&until)) / 2.0;
            let level = if form.value(t - middle) >= 0.0 { &disturbance.range.to } else { &disturbance.range.from };
            begin.clone_from(&until);
            signal.push((until, level.clone()));
        }
        if at.is_zero() {
            signal.clear();
        }
        signals.push(signal);
    }
    Choice { at: at.clone(), start, weights, uncertain, signals }
}

/// The start that makes a functional greatest, given its responses to the vectors of the starts; and what shows it admissible.
fn worst_start(plain: &Statement, inputs: &Inputs, values: &[f64]) -> (Vec<Rational>, Vec<Rational>) {
    let mut start: Vec<Rational> = plain.states.iter().map(|s| s.start.clone()).collect();
    let sign = |x: f64| if x >= 0.0 { Rational::one() } else { -Rational::one() };
    let mut add = |vector: &[(usize, Rational)], factor: &Rational| {
        vector.iter().for_each(|(i, x)| start[*i] += x * factor);
    };
    match (&inputs.shape, &plain.starts) {
        (Shape::Sum, starts) => {
            let weights: Vec<Rational> = values.iter().map(|x| sign(*x)).collect();
            inputs.starts.iter().zip(&weights).for_each(|(v, w)| add(v, w));
            let listed = matches!(starts, Starts::Zonotope(_));
            (start, if listed { weights } else { Vec::new() })
        }
        (Shape::Hull, _) => {
            let best = (0..values.len()).max_by(|a, b| values[*a].total_cmp(&values[*b])).filter(|i| values[*i] > 0.0);
            let weight = |i: usize| if best == Some(i) { Rational::one() } else { Rational::zero() };
            let weights: Vec<Rational> = (0..values.len()).map(weight).collect();
            inputs.starts.iter().zip(&weights).for_each(|(v, w)| add(v, w));
            (start, weights)
        }
        (Shape::Ellipsoid(_), Starts::Ellipsoid(shape)) => {
            let norm = super::approx::combined(&inputs.shape, values.iter().copied());
            // v with l_i v = f_i / s (1 - 1e-12), from the last column backwards: each l_i is 1 at its own state and 0 before it.
            let mut v = vec![Rational::zero(); shape.len()];
            for (column, f) in inputs.starts.iter().zip(values).rev() {
                let wanted = if norm > 0.0 { f / norm * (1.0 - 1e-12) } else { 0.0 };
                let known: Rational = column.iter().skip(1).map(|(i, x)| x * &v[*i]).sum();
                if let Some((pivot, _)) = column.first() {
                    v[*pivot] = rounded_near(wanted) - known;
                }
            }
            for (row, weight) in shape.iter().zip(&v) {
                row.iter().enumerate().for_each(|(i, x)| start[i] += x * weight);
            }
            (start, v)
        }
        (Shape::Ellipsoid(_), _) => (start, Vec::new()),
    }
}

/// The certificate of a trajectory that is in the zone.
pub(crate) fn certificate(
    choice: &Choice,
    statement: &Statement,
    formula: &IndexedFormula,
    bits: u32,
    limits: &Limits,
) -> Option<Certificate> {
    let claim = Claim::Enters { from: choice.at.clone(), to: choice.at.clone(), first: false };
    let statement = Statement { claim, ..statement.clone() };
    let mut witness = Witness {
        at: choice.at.clone(),
        start: choice.start.clone(),
        weights: choice.weights.clone(),
        uncertain: choice.uncertain.clone(),
        signals: choice.signals.clone(),
        splits: Vec::new(),
        functionals: Vec::new(),
    };
    let mut families = Vec::new();
    if !choice.at.is_zero() {
        let mut single = statement.clone();
        single.starts = Starts::One;
        single.states.iter_mut().zip(&choice.start).for_each(|(s, x)| s.start.clone_from(x));
        let points: Vec<Range> = choice.uncertain.iter().map(|p| Range { from: p.clone(), to: p.clone() }).collect();
        let functionals = needed(&statement, formula);
        let plan = Plan::new(&single, &points, &functionals, &formula.polynomials, (bits, true), limits).ok()?;
        witness.functionals = functionals;
        witness.splits = plan.splits;
        families = plan.families;
    }
    Some(Certificate {
        statement,
        bits,
        families,
        traces: Vec::new(),
        auxiliaries: Vec::new(),
        identities: Vec::new(),
        sums: Vec::new(),
        evidence: Evidence::Witness(Box::new(witness)),
    })
}

/// The zone's polynomials that are affine in the states, and the variables of the others.
fn needed(statement: &Statement, formula: &IndexedFormula) -> Vec<Functional> {
    let mut functionals = Vec::new();
    let mut variables = BTreeSet::new();
    for (position, polynomial) in formula.polynomials.iter().enumerate() {
        if keepout_checker::affine_form::AffineForm::new(polynomial, statement).is_some() {
            functionals.push(Functional { polynomials: vec![(position, Rational::one())], variables: Vec::new() });
            continue;
        }
        let mut open: Vec<Variable> = polynomial.terms.iter().flat_map(|t| t.powers.iter().map(|(v, _)| *v)).collect();
        while let Some(variable) = open.pop() {
            match variable {
                Variable::Output(i) => {
                    open.extend(statement.outputs[i].value.terms.iter().flat_map(|t| t.powers.iter().map(|(v, _)| *v)));
                }
                Variable::State(_) | Variable::Drive(_) => drop(variables.insert(variable)),
                Variable::Time | Variable::Exponential(_) | Variable::Disturbance(_) => {}
            }
        }
    }
    let one = |v: Variable| Functional { polynomials: Vec::new(), variables: vec![(v, Rational::one())] };
    functionals.extend(variables.into_iter().map(one));
    functionals
}

/// A simple instant near a time.
pub(crate) fn instant(t: f64, grain: f64) -> Rational {
    super::prove::rounded(t, grain.max(t.abs() * 1e-15)).max(Rational::zero())
}

/// The mixture of trajectories up to the same instant, with weights of sum 1.
pub(crate) fn blended(choices: &[(Rational, Choice)]) -> Option<Choice> {
    let (_, first) = choices.first()?;
    let sum = |vector: &dyn Fn(&Choice) -> &Vec<Rational>| -> Vec<Rational> {
        let entry = |i: usize| choices.iter().map(|(w, c)| w * &vector(c)[i]).sum();
        (0..vector(first).len()).map(entry).collect()
    };
    let signal = |k: usize| {
        let mut ends: BTreeSet<&Rational> = BTreeSet::new();
        ends.extend(choices.iter().flat_map(|(_, c)| c.signals[k].iter().map(|(until, _)| until)));
        let level = |end: &Rational| {
            let own = |c: &Choice| c.signals[k].iter().find(|(until, _)| until >= end).map(|(_, level)| level.clone());
            choices.iter().filter_map(|(w, c)| own(c).map(|level| w * level)).sum::<Rational>()
        };
        ends.into_iter().map(|end| (end.clone(), level(end))).collect()
    };
    Some(Choice {
        at: first.at.clone(),
        start: sum(&|c| &c.start),
        weights: sum(&|c| &c.weights),
        uncertain: first.uncertain.clone(),
        signals: (0..first.signals.len()).map(signal).collect(),
    })
}
