//! Traces that are a constant times a square: g = kappa h^2.
//!
//! With g = y t^(2m) (1 + ...) at t = 0 the power series of h is t^m times the square root of 1 + ..., all of it rational. If h is an
//! exponential polynomial, its derivatives at 0 obey a linear recurrence, of order (d + 1)/2 at most for d that of g; the
//! recurrence is looked for, and what is found is proved by the checker's product rule. Half exponents come out by themselves:
//! 1 - sin t = (cos(t/2) - sin(t/2))^2.

use crate::problem::Problem;
use crate::strategy::taylor::{derivatives, taylor};
use keepout_checker::certificate::Auxiliary;
use keepout_checker::number::Rational;
use keepout_checker::sequence::Sequence;
use keepout_core::minimal_annihilator;
use num_bigint::BigInt;
use num_traits::{One, Zero};

/// The constant kappa and the function h for one trace. Families may be added to the problem.
pub(crate) fn square_root(index: usize, problem: &mut Problem) -> Option<(Rational, Auxiliary)> {
    let degree = problem.degree(&problem.factors[index]);
    let count = problem.sequences[index].count().min(degree + 7);
    let taylor = taylor(&problem.sequences[index].derivatives(count));
    let first = taylor.iter().position(|c| !c.is_zero())?;
    if first % 2 == 1 {
        return None;
    }
    let kappa = taylor[first].clone();
    let root = series_root(&taylor[first..], &kappa);
    let mut h = vec![Rational::zero(); first / 2];
    h.extend(root);
    // An odd number of terms: a sequence without a recurrence then shows at the first prime.
    h.truncate(if h.len() % 2 == 0 { h.len() - 1 } else { h.len() });
    let derivatives = derivatives(&h);
    // Half exponents, in the time in which those of the trace are algebraic integers: twice its rate.
    let rate = Rational::from_integer(problem.sequences[index].rate() * BigInt::from(2));
    let m = minimal_annihilator(&scaled(&derivatives, &rate))?;
    let factors = problem.factor_list(&m.dilate_up(rate.numer()).primitive_part())?;
    let size = problem.degree(&factors);
    Some((kappa, Auxiliary { factors, derivatives: derivatives.get(..size)?.to_vec() }))
}

/// The square root with constant term 1 of a power series divided by its constant term.
fn series_root(series: &[Rational], first: &Rational) -> Vec<Rational> {
    let two = Rational::from_integer(2.into());
    let mut root = vec![Rational::one()];
    for k in 1..series.len() {
        let known: Rational = (1..k).map(|j| &root[j] * &root[k - j]).sum();
        root.push((&series[k] / first - known) / &two);
    }
    root
}

/// The integers y_k rate^k times a common denominator.
fn scaled(derivatives: &[Rational], rate: &Rational) -> Vec<BigInt> {
    let powers = std::iter::successors(Some(Rational::one()), |power| Some(power * rate));
    let scaled: Vec<Rational> = derivatives.iter().zip(powers).map(|(y, power)| y * power).collect();
    Sequence::from_rationals(&scaled).values().to_vec()
}
