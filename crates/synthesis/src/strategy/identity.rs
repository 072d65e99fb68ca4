//! Identities from which the sign of a function follows where the function touches zero.
//!
//! In this order: factors of the zone's polynomial; a constant times a square; factors of a periodic function; a sum of waves that
//! is at most (or at least) zero because their amplitudes add up to the constant; the terms of greatest growth and the rest.
//! What is found is proved by the checker, from derivatives at 0. That every zero of a factor that stays is simple, so that the
//! search ends, would follow from Schanuel's conjecture; no result rests on it.

use crate::problem::Problem;
use crate::strategy::amplitude::squares_of_waves;
use crate::strategy::factor::factors_of;
use crate::strategy::periodic::periodic_factors;
use crate::strategy::square::square_root;
use crate::strategy::wave::top_and_rest;
use keepout_checker::certificate::Identity;
use keepout_core::ExponentialPolynomial;
use num_traits::One;

/// Classes of growth are split off this often.
const MAX_DEPTH: u32 = 3;

/// Functions of a greater order are left as they are: exact elimination gets dear.
const MAX_ORDER: usize = 40;

/// A sum of products of powers of functions.
pub(crate) type SumOfProducts = Vec<Vec<(ExponentialPolynomial, u32)>>;

/// Adds identities for a trace: by factors of its polynomial, and by what becomes of these.
pub(crate) fn decompose_trace(trace: usize, problem: &mut Problem) {
    if problem.factors[trace].is_empty() {
        return;
    }
    let polynomial = problem.formula.polynomials[trace].clone();
    let factors = factors_of(&polynomial);
    if factors.len() > 1 || factors.iter().any(|(_, power)| *power > 1) {
        let traces: Option<Vec<_>> = factors.iter().map(|(p, power)| Some((problem.trace_of(p)?, *power))).collect();
        if let Some(product) = traces.filter(|list| list.iter().all(|(f, _)| !f.is_zero())) {
            let parts: Vec<ExponentialPolynomial> = product.iter().map(|(f, _)| f.clone()).collect();
            for part in parts {
                decompose_added(&part, problem);
            }
            add(trace, vec![product], problem);
            return;
        }
    }
    decompose(trace, MAX_DEPTH, problem);
}

fn decompose_added(function: &ExponentialPolynomial, problem: &mut Problem) {
    if let Some(index) = problem.add(function) {
        decompose(index, MAX_DEPTH, problem);
    }
}

/// Adds identities for a function.
fn decompose(index: usize, depth: u32, problem: &mut Problem) {
    let Some(function) = problem.function(index).filter(|f| !is_plain(f) && f.order() <= MAX_ORDER) else { return };
    if let Some((kappa, root)) = square_root(&function) {
        add(index, vec![vec![(ExponentialPolynomial::constant(kappa), 1), (root, 2)]], problem);
    } else if let Some(product) = periodic_factors(&function) {
        add(index, vec![product], problem);
    } else if let Some(squares) = squares_of_waves(&function) {
        add(index, squares, problem);
    } else if let Some((top, rest)) = top_and_rest(&function).filter(|_| depth > 0) {
        for part in [&top, &rest] {
            if let Some(part) = problem.add(part) {
                decompose(part, depth - 1, problem);
            }
        }
        add(index, vec![vec![(top, 1)], vec![(rest, 1)]], problem);
    }
}

/// Whether the sign of a function is plain to see: a constant times an exponential.
fn is_plain(function: &ExponentialPolynomial) -> bool {
    function.order() <= 1
}

/// Adds an identity, and its functions.
fn add(target: usize, sum: SumOfProducts, problem: &mut Problem) -> Option<()> {
    let mut summands = Vec::new();
    for product in sum {
        let is_one = |f: &ExponentialPolynomial| *f == ExponentialPolynomial::constant(One::one());
        let mut factors = Vec::new();
        for (function, power) in product.iter().filter(|(f, _)| !is_one(f)) {
            factors.push((problem.add(function)?, *power));
        }
        summands.push(factors);
    }
    let identity = Identity { target, summands };
    if !problem.identities.contains(&identity) {
        problem.identities.push(identity);
    }
    Some(())
}
