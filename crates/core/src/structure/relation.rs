//! Integer relations among the frequencies (imaginary parts) of the eigenvalues.
//!
//! Lattice reduction proposes; a proposal sum n_j omega_j = 0 is proved if it splits into cases that can be decided:
//! *square roots* - every omega_j^2 is rational, then the terms of each class of Q*/Q*^2 must cancel; *two terms* with rational real parts - then
//! n_1 (lambda_1 - a_1) and -n_2 (lambda_2 - a_2) are roots of known polynomials, and one common disc proves them equal.
//! All other proposals are reported as open.

use super::equality::one_root_near;
use super::{Eigenvalue, Evidence, RateClass, SpectralFactor};
use crate::error::CoreError;
use crate::integer_polynomial::IntegerPolynomial;
use crate::lattice::approx_integer_relations;
use crate::root::enclose_roots;
use keepout_checker::number::{Complex, Dyadic, Interval, Rational};
use num_bigint::BigInt;
use num_traits::{Signed, Zero};

/// Frequencies up to which relations are looked for.
const FREQUENCY_LIMIT: usize = 16;

/// sum_k coefficient_k Im(lambda_k) = 0, proposed or proved.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct FrequencyRelation {
    /// Pairs (place in [`super::SpectralStructure::eigenvalues`], coefficient != 0).
    pub terms: Vec<(usize, BigInt)>,
    /// Whether the relation is proved.
    pub evidence: Evidence,
}

struct Frequency<'a> {
    place: usize,
    polynomial: &'a IntegerPolynomial,
    /// The exact real part, if it is a known rational number.
    rate: Option<Rational>,
    im: Interval,
}

pub(super) fn relations(
    factors: &[SpectralFactor],
    eigenvalues: &[Eigenvalue],
    rates: &[RateClass],
    size: u32,
) -> Result<Vec<FrequencyRelation>, CoreError> {
    let places: Vec<usize> = (0..eigenvalues.len()).filter(|i| !eigenvalues[*i].disc.is_real()).collect();
    if places.len() < 2 || places.len() > FREQUENCY_LIMIT {
        return Ok(Vec::new());
    }
    // Well above count * log2(size), so that exact relations stand out.
    let bits = 64 + 2 * places.len() as u32 * (32 - size.leading_zeros());
    let mut frequencies = Vec::with_capacity(places.len());
    for place in places {
        let eigenvalue = &eigenvalues[place];
        let polynomial = &factors[eigenvalue.factor].polynomial;
        let class = rates.iter().find(|c| c.eigenvalues.contains(&place));
        let rate = class.and_then(|c| c.rational.clone());
        let coarse = eigenvalue.disc.enclose();
        let fine = enclose_roots(polynomial, bits)?.into_iter().find(|d| {
            let d = d.enclose();
            !d.re.is_disjoint(&coarse.re) && !d.im.is_disjoint(&coarse.im)
        });
        let im = fine.map_or(coarse.im, |d| d.enclose_im());
        frequencies.push(Frequency { place, polynomial, rate, im });
    }
    // In units in which the largest frequency has bits - 8 bits: each is then in error by about one unit.
    let top = frequencies.iter().map(|f| f.im.hi().top()).max().unwrap_or(0);
    let scaled: Vec<BigInt> = frequencies.iter().map(|f| approx_scaled(f.im.lo(), i64::from(bits) - 8 - top)).collect();
    let proposals = approx_integer_relations(&scaled, size);
    Ok(proposals
        .into_iter()
        .map(|coefficients| {
            let used: Vec<(&Frequency<'_>, BigInt)> =
                frequencies.iter().zip(coefficients).filter(|(_, c)| !c.is_zero()).collect();
            let proved = proved_by_square_roots(&used) || proved_by_common_root(&used, bits);
            FrequencyRelation {
                terms: used.into_iter().map(|(f, c)| (f.place, c)).collect(),
                evidence: if proved { Evidence::Proved } else { Evidence::Open },
            }
        })
        .collect())
}

/// The integer nearest below value * 2^scale.
fn approx_scaled(value: &Dyadic, scale: i64) -> BigInt {
    let shift = value.exponent() + scale;
    if shift >= 0 { value.mantissa() << shift.unsigned_abs() } else { value.mantissa() >> shift.unsigned_abs() }
}

/// omega^2 for the roots of a quadratic c z^2 + b z + a with negative discriminant.
fn rational_square(f: &IntegerPolynomial) -> Option<Rational> {
    if f.degree() != 2 {
        return None;
    }
    let (a, b, c) = (f.coefficient(0), f.coefficient(1), f.coefficient(2));
    let discriminant: BigInt = &a * &c * 4 - &b * &b;
    Some(Rational::new(discriminant, &c * &c * 4)).filter(Signed::is_positive)
}

/// The positive square root of a positive rational number, if it is rational.
fn rational_root(value: &Rational) -> Option<Rational> {
    let (n, d) = (value.numer().sqrt(), value.denom().sqrt());
    (&n * &n == *value.numer() && &d * &d == *value.denom()).then(|| Rational::new(n, d))
}

/// Square roots of positive rationals in distinct square classes are linearly independent: each class must cancel.
fn proved_by_square_roots(used: &[(&Frequency<'_>, BigInt)]) -> bool {
    let squares: Option<Vec<Rational>> = used.iter().map(|(f, _)| rational_square(f.polynomial)).collect();
    let Some(squares) = squares else { return false };
    let mut sums: Vec<(Rational, Rational)> = Vec::new();
    for (square, (_, c)) in squares.iter().zip(used) {
        let c = Rational::from_integer(c.clone());
        match sums.iter_mut().find_map(|(class, sum)| Some((rational_root(&(square / &*class))?, sum))) {
            Some((ratio, sum)) => *sum += ratio * c,
            None => sums.push((square.clone(), c)),
        }
    }
    sums.iter().all(|(_, sum)| sum.is_zero())
}

/// Two terms with rational real parts: n_1 i omega_1 = -n_2 i omega_2 as roots of one polynomial.
fn proved_by_common_root(used: &[(&Frequency<'_>, BigInt)], bits: u32) -> bool {
    let [(f, n), (g, m)] = used else { return false };
    let (Some(a), Some(b)) = (&f.rate, &g.rate) else { return false };
    let common = scaled_imaginary(f.polynomial, a, n).lcm(&scaled_imaginary(g.polynomial, b, &-m)).square_free_part();
    let value = |frequency: &Frequency<'_>, factor: &BigInt| {
        let factor = Interval::rational(&Rational::from_integer(factor.clone()), bits);
        Complex { re: Interval::integer(0), im: frequency.im.mul(&factor, bits) }
    };
    one_root_near(&common, &value(f, n), &value(g, &-m), bits)
}

/// The primitive polynomial with roots n (lambda - a).
fn scaled_imaginary(f: &IntegerPolynomial, a: &Rational, n: &BigInt) -> IntegerPolynomial {
    // den^d f((w + num)/den) has the roots den (lambda - a); then w = den z / n.
    let centred = f.dilate_down(a.denom()).shift(a.numer()).dilate_up(a.denom());
    let d = centred.degree();
    let coefficients = (0..=d).map(|k| {
        let c = centred.coefficient(k);
        c * n.pow((d - k) as u32)
    });
    IntegerPolynomial::new(coefficients.collect()).primitive_part()
}
