//! The polynomials whose roots are the sums, or the differences, of two roots of another one.
//!
//! With power sums p_k of the roots of f, the sums lambda_i + lambda_j over all ordered pairs have power sums
//! s_k = sum_l binom(k,l) p_l p_(k-l), and over i <= j (s_k + 2^k p_k)/2. Newton's identities give the polynomial. For
//! 2 Re lambda = lambda + conj lambda. Computed exactly, for the monic integer polynomial lead^(d-1) f(z/lead), and
//! scaled back.

use crate::integer_polynomial::IntegerPolynomial;
use num_bigint::BigInt;
use num_traits::{One, Zero};

/// The primitive polynomial prod_(i <= j) (z - lambda_i - lambda_j), up to a constant; degree d (d + 1)/2.
///
/// # Cost
/// O(d^4) integer products; meant for d <= 20.
///
/// ```
/// use keepout_core::{IntegerPolynomial, structure::pair_sum_polynomial};
/// // roots 1, 2: sums 2, 3, 4
/// let sums = pair_sum_polynomial(&IntegerPolynomial::from_small(&[2, -3, 1]));
/// assert_eq!(sums, IntegerPolynomial::from_small(&[-24, 26, -9, 1]));
/// ```
pub fn pair_sum_polynomial(f: &IntegerPolynomial) -> IntegerPolynomial {
    let d = f.degree();
    let count = d * (d + 1) / 2;
    let sums = power_sums(&integral(f), count);
    let mut pair_sums = vec![BigInt::from(count)];
    let mut binomials = vec![BigInt::one()];
    for k in 1..=count {
        binomials = next_row(&binomials);
        let ordered: BigInt = (0..=k).map(|l| &binomials[l] * &sums[l] * &sums[k - l]).sum();
        pair_sums.push((ordered + (&sums[k] << k)) >> 1u32);
    }
    assemble(&pair_sums, f)
}

/// The primitive polynomial prod_(i != j) (z - lambda_i + lambda_j), up to a constant; degree d (d - 1).
///
/// 2i Im lambda = lambda - conj lambda is one of its roots for each non-real root lambda.
///
/// # Cost
/// O(d^4) integer products; meant for d <= 12.
///
/// ```
/// use keepout_core::{IntegerPolynomial, structure::pair_difference_polynomial};
/// // roots 1, 4: differences 3, -3
/// let differences = pair_difference_polynomial(&IntegerPolynomial::from_small(&[4, -5, 1]));
/// assert_eq!(differences, IntegerPolynomial::from_small(&[-9, 0, 1]));
/// ```
pub fn pair_difference_polynomial(f: &IntegerPolynomial) -> IntegerPolynomial {
    let d = f.degree();
    let count = d * d.saturating_sub(1);
    let sums = power_sums(&integral(f), count);
    let mut differences = vec![BigInt::from(count)];
    let mut binomials = vec![BigInt::one()];
    for k in 1..=count {
        binomials = next_row(&binomials);
        let term = |l: usize| {
            let term = &binomials[l] * &sums[l] * &sums[k - l];
            if (k - l) % 2 == 1 { -term } else { term }
        };
        differences.push((0..=k).map(term).sum());
    }
    assemble(&differences, f)
}

/// c_1..c_d of the monic integer polynomial with the roots lead * lambda: a_(d-k) lead^(k-1).
fn integral(f: &IntegerPolynomial) -> Vec<BigInt> {
    let (d, lead) = (f.degree(), f.leading());
    let mut power = BigInt::one();
    (1..=d)
        .map(|k| {
            let c = f.coefficient(d - k) * &power;
            power *= &lead;
            c
        })
        .collect()
}

/// The primitive polynomial with roots s / lead(f), s having the power sums given.
fn assemble(sums: &[BigInt], f: &IntegerPolynomial) -> IntegerPolynomial {
    let mut coefficients = from_power_sums(sums);
    coefficients.reverse();
    coefficients.push(BigInt::one());
    IntegerPolynomial::new(coefficients).dilate_up(&f.leading()).primitive_part()
}

fn next_row(row: &[BigInt]) -> Vec<BigInt> {
    let inner = row.windows(2).map(|w| &w[0] + &w[1]);
    std::iter::once(BigInt::one()).chain(inner).chain(std::iter::once(BigInt::one())).collect()
}

/// p_0..p_last for z^d + c_1 z^(d-1) + ... + c_d.
fn power_sums(c: &[BigInt], last: usize) -> Vec<BigInt> {
    let mut sums = vec![BigInt::from(c.len())];
    for k in 1..=last {
        let mut s = c.get(k - 1).map_or_else(BigInt::zero, |ck| -(ck * BigInt::from(k)));
        for (j, cj) in c.iter().enumerate().take(k - 1) {
            s -= cj * &sums[k - 1 - j];
        }
        sums.push(s);
    }
    sums
}

/// c_1..c_m from p_0 = m, p_1..p_m; the divisions are exact for power sums of algebraic integers.
fn from_power_sums(sums: &[BigInt]) -> Vec<BigInt> {
    let mut c: Vec<BigInt> = Vec::with_capacity(sums.len());
    for k in 1..sums.len() {
        let mut total = sums[k].clone();
        for (j, cj) in c.iter().enumerate() {
            total += cj * &sums[k - 1 - j];
        }
        c.push(-total / BigInt::from(k));
    }
    c
}
