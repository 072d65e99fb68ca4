//! Integer relations among the frequencies (imaginary parts) of the eigenvalues.
//!
//! Lattice reduction proposes; a proposal sum n_j omega_j = 0 is proved if the terms cancel within classes of frequencies whose ratios are
//! proved rational. A ratio p/q is proved by one common disc: 2i q omega_1 and 2i p omega_2 are roots of known square-free polynomials
//! (a factor shifted by its rational real part, or the differences of its roots), whose least common multiple has exactly one root there.
//! All other proposals, relations of three unrelated frequencies above all, are reported as open.

use super::equality::{may_vanish, one_root_near, simplest_rational};
use super::pair_sum::pair_difference_polynomial;
use super::{Eigenvalue, Evidence, RateClass, SpectralFactor};
use crate::error::CoreError;
use crate::integer_polynomial::IntegerPolynomial;
use crate::lattice::approx_integer_relations;
use crate::root::enclose_roots;
use keepout_checker::number::{Complex, Dyadic, Interval, Rational};
use num_bigint::BigInt;
use num_traits::Zero;

/// Frequencies up to which relations are looked for.
const FREQUENCY_LIMIT: usize = 16;

/// Degrees up to which the pair-difference polynomial of a factor is formed.
const PAIR_DIFFERENCE_DEGREE: usize = 12;

/// Ratios of frequencies with more bits than this in numerator and denominator are not tried.
const RATIO_BITS: u64 = 32;

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
            let proved = proved_by_ratios(&used, bits);
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

/// Whether the terms cancel class by class, a class being frequencies with proved rational ratios.
fn proved_by_ratios(used: &[(&Frequency<'_>, BigInt)], bits: u32) -> bool {
    // (first member, sum of coefficients in units of its frequency)
    let mut classes: Vec<(&Frequency<'_>, Rational)> = Vec::new();
    for (frequency, coefficient) in used {
        let coefficient = Rational::from_integer(coefficient.clone());
        match classes.iter_mut().find_map(|(base, sum)| Some((proved_ratio(frequency, base, bits)?, sum))) {
            Some((ratio, sum)) => *sum += ratio * coefficient,
            None => classes.push((frequency, coefficient)),
        }
    }
    classes.iter().all(|(_, sum)| sum.is_zero())
}

/// The proved rational value of omega / omega_base, if there is one of small size.
fn proved_ratio(frequency: &Frequency<'_>, base: &Frequency<'_>, bits: u32) -> Option<Rational> {
    let quotient = frequency.im.mul(&base.im.recip(bits)?, bits);
    let ratio = simplest_rational(&quotient)?;
    if ratio.numer().bits() + ratio.denom().bits() > RATIO_BITS {
        return None;
    }
    let terms = [(frequency, ratio.denom().clone()), (base, -ratio.numer())];
    proved_by_common_root(&terms, bits).then_some(ratio)
}

/// Two terms: 2i n_1 omega_1 = -2i n_2 omega_2 as roots of one polynomial.
fn proved_by_common_root(used: &[(&Frequency<'_>, BigInt)], bits: u32) -> bool {
    let [(f, n), (g, m)] = used else { return false };
    let (Some(first), Some(second)) = (doubled_frequency(f, n, bits), doubled_frequency(g, &-m, bits)) else {
        return false;
    };
    // Both polynomials are square-free: so is their least common multiple, and it vanishes at both numbers.
    one_root_near(&first.0.lcm(&second.0), &first.1, &second.1, bits)
}

/// A square-free polynomial that vanishes at 2i n omega, and an enclosure of that number.
fn doubled_frequency(f: &Frequency<'_>, n: &BigInt, bits: u32) -> Option<(IntegerPolynomial, Complex)> {
    let twice: BigInt = n * 2;
    let factor = Interval::rational(&Rational::from_integer(twice.clone()), bits);
    let value = Complex { re: Interval::integer(0), im: f.im.mul(&factor, bits) };
    if let Some(rate) = &f.rate {
        return Some((scaled_imaginary(f.polynomial, rate, &twice).square_free_part(), value));
    }
    if f.polynomial.degree() > PAIR_DIFFERENCE_DEGREE {
        return None;
    }
    let differences = scaled_imaginary(&pair_difference_polynomial(f.polynomial), &Rational::zero(), n);
    let parts = differences.square_free_decomposition().into_iter().map(|(part, _)| part);
    let mut possible = parts.filter(|part| may_vanish(part, &value, bits));
    let part = possible.next()?;
    possible.next().is_none().then_some((part, value))
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
