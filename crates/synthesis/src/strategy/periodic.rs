//! Factors of a periodic function (times an exponential).
//!
//! With C = cos(w t/2), S = sin(w t/2) / w and d = w^2: cos(k w t) and sin(k w t) / w are the even and the odd part in S of
//! (C + i w S)^(2k), and C^2 + d S^2 = 1 makes all terms homogeneous of one degree. A homogeneous polynomial in two variables
//! factors as a polynomial in one, S / C; each factor is again a function with rational derivatives at 0.

use crate::strategy::wave::{Wave, Waves, square_root_of, waves};
use keepout_checker::number::Rational;
use keepout_core::{ExponentialPolynomial, IntegerPolynomial, factorize};
use num_bigint::BigInt;
use num_integer::Integer;
use num_traits::{One, ToPrimitive, Zero};

/// The greatest degree in S and C that is looked at.
const MAX_DEGREE: usize = 48;

/// The factors with their powers, if there is more than one factor that may vanish, or one more than once.
pub(crate) fn periodic_factors(function: &ExponentialPolynomial) -> Option<Vec<(ExponentialPolynomial, u32)>> {
    let Waves { rate, constant, waves } = waves(function)?;
    let (square, multiples) = common_frequency(&waves)?;
    let top = *multiples.iter().max()?;
    if 2 * top > MAX_DEGREE {
        return None;
    }
    let mut form = scaled(&unit_power(&square, top), &constant);
    for (wave, k) in waves.iter().zip(&multiples) {
        let filler = unit_power(&square, top - k);
        let (cosine, slope) = wave.parts();
        let (even, odd) = rotation(&square, 2 * k);
        // b sin(k w t) / (k w): the odd part is sin(k w t) / w.
        let slope = slope / Rational::from_integer(BigInt::from(*k));
        let part: Vec<Rational> = scaled(&even, cosine).iter().zip(scaled(&odd, &slope)).map(|(x, y)| x + y).collect();
        form.iter_mut().zip(product(&part, &filler)).for_each(|(slot, x)| *slot += x);
    }
    let polynomial = IntegerPolynomial::from_rationals(&form);
    let factors = factorize(&polynomial).factors;
    let missing = 2 * top - polynomial.degree();
    if factors.len() + usize::from(missing > 0) < 2 && factors.iter().all(|f| f.multiplicity == 1) && missing < 2 {
        return None;
    }
    let unit = factors.iter().fold(form[polynomial.degree()].clone(), |c, f| {
        c / num_traits::pow(Rational::from_integer(f.polynomial.leading()), f.multiplicity)
    });
    let mut list = vec![(ExponentialPolynomial::exponential(&rate).scaled(&unit), 1)];
    for factor in factors {
        list.push((function_of(&factor.polynomial, &square)?, u32::try_from(factor.multiplicity).ok()?));
    }
    if missing > 0 {
        list.push((half_waves(&square)?.0, u32::try_from(missing).ok()?));
    }
    Some(list)
}

/// The square of the greatest frequency of which all are integer multiples, and these integers.
fn common_frequency(waves: &[Wave]) -> Option<(Rational, Vec<usize>)> {
    let first = &waves.first()?.square;
    let ratios: Vec<Rational> =
        waves.iter().map(|wave| square_root_of(&(&wave.square / first))).collect::<Option<_>>()?;
    let denominator = ratios.iter().fold(BigInt::one(), |l, q| l.lcm(q.denom()));
    let whole: Vec<BigInt> =
        ratios.iter().map(|q| (q * Rational::from_integer(denominator.clone())).to_integer()).collect();
    let divisor = whole.iter().fold(BigInt::zero(), |g, n| g.gcd(n));
    let step = Rational::new(divisor.clone(), denominator);
    let multiples = whole.iter().map(|n| (n / &divisor).to_usize()).collect::<Option<_>>()?;
    Some((first * &step * &step, multiples))
}

/// C = cos(w t/2) and S = sin(w t/2) / w.
fn half_waves(square: &Rational) -> Option<(ExponentialPolynomial, ExponentialPolynomial)> {
    let quarter = square / Rational::from_integer(4.into());
    let m = IntegerPolynomial::from_rationals(&[quarter, Rational::zero(), Rational::one()]);
    let cosine = ExponentialPolynomial::new(&m, &[Rational::one(), Rational::zero()]).ok()?;
    let sine = ExponentialPolynomial::new(&m, &[Rational::zero(), Rational::new(1.into(), 2.into())]).ok()?;
    Some((cosine, sine))
}

/// sum_l f_l S^l C^(deg f - l).
fn function_of(f: &IntegerPolynomial, square: &Rational) -> Option<ExponentialPolynomial> {
    let (cosine, sine) = half_waves(square)?;
    // Horner's rule in S, with the powers of C made up.
    let mut value = ExponentialPolynomial::zero();
    let mut power = ExponentialPolynomial::constant(Rational::one());
    for l in (0..=f.degree()).rev() {
        let term = power.scaled(&Rational::from_integer(f.coefficient(l)));
        value = &(&value * &sine) + &term;
        power = &power * &cosine;
    }
    Some(value)
}

/// The even and the odd part in S of (C + i w S)^n, by powers of S.
fn rotation(square: &Rational, n: usize) -> (Vec<Rational>, Vec<Rational>) {
    let mut parts = (vec![Rational::zero(); n + 1], vec![Rational::zero(); n + 1]);
    let mut binomial = BigInt::one();
    let mut power = Rational::one();
    for m in 0..=n {
        let value = Rational::from_integer(binomial.clone()) * &power;
        if m % 2 == 0 {
            parts.0[m] = value;
        } else {
            parts.1[m] = value;
            power = -(power * square);
        }
        binomial = binomial * BigInt::from(n - m) / BigInt::from(m + 1);
    }
    parts
}

/// (C^2 + d S^2)^k by powers of S.
fn unit_power(square: &Rational, k: usize) -> Vec<Rational> {
    let one = vec![Rational::one(), Rational::zero(), square.clone()];
    (0..k).fold(vec![Rational::one()], |power, _| product(&power, &one))
}

fn scaled(p: &[Rational], factor: &Rational) -> Vec<Rational> {
    p.iter().map(|c| c * factor).collect()
}

/// The product of two polynomials; the length says the degree, zeros included.
fn product(p: &[Rational], q: &[Rational]) -> Vec<Rational> {
    let mut result = vec![Rational::zero(); p.len() + q.len() - 1];
    for (i, a) in p.iter().enumerate() {
        for (j, b) in q.iter().enumerate() {
            result[i + j] += a * b;
        }
    }
    result
}
