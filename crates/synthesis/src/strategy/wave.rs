//! Functions as sums of waves with rational data, and parts of functions.

use crate::enclosure::approx_value;
use crate::strategy::linear::{solve, weights};
use keepout_checker::number::Rational;
use keepout_core::{ExponentialPolynomial, IntegerPolynomial, ToRational, enclose_roots, factorize};
use num_bigint::BigInt;
use num_traits::{Signed, Zero};

/// The function exp(rate t) (constant + sum of waves).
pub(crate) struct Waves {
    pub(crate) rate: Rational,
    pub(crate) constant: Rational,
    pub(crate) waves: Vec<Wave>,
}

/// cosine cos(w t) + (slope / w) sin(w t), w^2 = square.
pub(crate) struct Wave {
    pub(crate) square: Rational,
    cosine: Rational,
    slope: Rational,
}

impl Wave {
    /// (a, b) with a cos(w t) + b sin(w t) / w.
    pub(crate) fn parts(&self) -> (&Rational, &Rational) {
        (&self.cosine, &self.slope)
    }
}

/// A function as waves, if all its exponents are simple, have one rational real part, and rational squares of frequencies.
pub(crate) fn waves(function: &ExponentialPolynomial) -> Option<Waves> {
    let mut rate: Option<Rational> = None;
    let mut squares = Vec::new();
    let mut has_constant = false;
    for factor in factorize(&function.annihilator()).factors {
        let monic = factor.polynomial.to_monic();
        let (own, square) = match monic.coefficients() {
            [c, _] => (-c, None),
            [c, b, _] => {
                let half = b / Rational::from_integer(2.into());
                (-half.clone(), Some(c - &half * &half))
            }
            _ => return None,
        };
        if factor.multiplicity > 1 || *rate.get_or_insert(own.clone()) != own {
            return None;
        }
        match square {
            None => has_constant = true,
            Some(square) if square.is_positive() => squares.push(square),
            Some(_) => return None,
        }
    }
    let rate = rate?;
    let derivatives = (function * &ExponentialPolynomial::exponential(&-&rate)).derivatives(2 * squares.len() + 2);
    let (even, odd): (Vec<_>, Vec<_>) = derivatives.chunks(2).map(|pair| (pair[0].clone(), pair[1].clone())).unzip();
    let mut nodes: Vec<Rational> = squares.iter().map(|square| -square).collect();
    let slopes = weights(&nodes, &odd)?;
    nodes.extend(has_constant.then(Rational::zero));
    let mut cosines = weights(&nodes, &even)?;
    let constant = if has_constant { cosines.pop()? } else { Rational::zero() };
    let waves = squares.into_iter().zip(cosines).zip(slopes);
    let waves = waves.map(|((square, cosine), slope)| Wave { square, cosine, slope }).collect();
    Some(Waves { rate, constant, waves })
}

/// The part of a function with the greatest real part of exponents, and the rest, if rational annihilators separate them.
pub(crate) fn top_and_rest(function: &ExponentialPolynomial) -> Option<(ExponentialPolynomial, ExponentialPolynomial)> {
    let mut parts = Vec::new();
    for factor in factorize(&function.annihilator()).factors {
        let discs = enclose_roots(&factor.polynomial, 64).ok()?;
        let reals: Option<Vec<f64>> = discs.iter().map(|d| d.re.to_rational().map(|re| approx_value(&re))).collect();
        let (low, high) = reals?.into_iter().fold((f64::MAX, f64::MIN), |(l, h), x| (l.min(x), h.max(x)));
        parts.push((factor.polynomial.power(factor.multiplicity), low, high));
    }
    let top = parts.iter().map(|p| p.2).fold(f64::MIN, f64::max);
    let is_top = |x: f64| (x - top).abs() <= 1e-12 * (1.0 + top.abs());
    if parts.iter().any(|(_, low, high)| is_top(*high) && !is_top(*low)) || parts.iter().all(|p| is_top(p.2)) {
        return None;
    }
    let product = |wanted: bool| {
        let chosen = parts.iter().filter(|p| is_top(p.2) == wanted);
        chosen.fold(IntegerPolynomial::one(), |m, (p, _, _)| &m * p)
    };
    let first = projected(function, &product(true), &product(false))?;
    let rest = function - &first;
    Some((first, rest))
}

/// The part of a function that `own` annihilates; `own * other` annihilates the function, both are coprime.
pub(crate) fn projected(
    function: &ExponentialPolynomial,
    own: &IntegerPolynomial,
    other: &IntegerPolynomial,
) -> Option<ExponentialPolynomial> {
    let (n, size) = (own.degree(), own.degree() + other.degree());
    let unit = |m: &IntegerPolynomial, k: usize| {
        let values: Vec<Rational> = (0..m.degree()).map(|i| Rational::from_integer(BigInt::from(i == k))).collect();
        ExponentialPolynomial::new(m, &values).map(|f| f.derivatives(size)).ok()
    };
    let columns = (0..n).map(|k| unit(own, k)).chain((0..other.degree()).map(|k| unit(other, k)));
    let columns: Vec<Vec<Rational>> = columns.collect::<Option<_>>()?;
    let rows: Vec<Vec<Rational>> = (0..size).map(|i| columns.iter().map(|c| c[i].clone()).collect()).collect();
    let values = solve(&rows, &function.derivatives(size))?;
    ExponentialPolynomial::new(own, &values[..n]).ok()
}

/// The rational square root of a rational number >= 0.
pub(crate) fn square_root_of(x: &Rational) -> Option<Rational> {
    if x.is_negative() {
        return None;
    }
    let root = Rational::new(x.numer().sqrt(), x.denom().sqrt());
    (&root * &root == *x).then_some(root)
}
