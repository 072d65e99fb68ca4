//! Traces that are a constant times a square: g = kappa h^2.
//!
//! With g = y t^(2m) (1 + ...) at t = 0 the power series of h is t^m times the square root of 1 + ..., all of it rational. If h is an
//! exponential polynomial, its derivatives at 0 obey a linear recurrence, of order (d + 1)/2 at most for d that of g; the
//! recurrence is looked for, and what is found is proved by the checker's product rule. Half exponents come out by themselves:
//! 1 - sin t = (cos(t/2) - sin(t/2))^2.

use crate::strategy::taylor::{derivatives, taylor};
use keepout_checker::number::Rational;
use keepout_checker::sequence::Sequence;
use keepout_core::{ExponentialPolynomial, minimal_annihilator};
use num_bigint::BigInt;
use num_traits::{One, Zero};

/// The constant kappa and the function h of a function kappa h^2.
pub(crate) fn square_root(function: &ExponentialPolynomial) -> Option<(Rational, ExponentialPolynomial)> {
    // An odd number of terms: a sequence without a recurrence then shows at the first prime.
    let taylor = taylor(&function.derivatives((function.order() + 7) | 1));
    let first = taylor.iter().position(|c| !c.is_zero())?;
    if first % 2 == 1 {
        return None;
    }
    let kappa = taylor[first].clone();
    let root = series_root(&taylor[first..], &kappa);
    let mut h = vec![Rational::zero(); first / 2];
    h.extend(root);
    h.truncate(if h.len() % 2 == 0 { h.len() - 1 } else { h.len() });
    // Half exponents.
    let rate = function.annihilator().leading() * BigInt::from(2);
    let root = from_derivatives(&derivatives(&h), &rate)?;
    let square = &(&root * &root) * &ExponentialPolynomial::constant(kappa.clone());
    (square == *function).then_some((kappa, root))
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

/// The function whose derivatives begin with these, if few enough of them determine the others; its exponents times `rate` are
/// algebraic integers.
fn from_derivatives(list: &[Rational], rate: &BigInt) -> Option<ExponentialPolynomial> {
    let factor = Rational::from_integer(rate.clone());
    let powers = std::iter::successors(Some(Rational::one()), |power| Some(power * &factor));
    let scaled: Vec<Rational> = list.iter().zip(powers).map(|(y, power)| y * power).collect();
    let m = minimal_annihilator(Sequence::from_rationals(&scaled).values())?.dilate_up(rate).primitive_part();
    ExponentialPolynomial::new(&m, list.get(..m.degree())?).ok()
}
