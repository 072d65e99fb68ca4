//! Rigorous enclosures of exp(A t) for rational A and t.
//!
//! Scaling and squaring: X = A t / 2^s with |X| <= 2^-r, the Taylor polynomial of degree K by baby and giant steps,
//! then s squarings, all in fixed-point integer matrices that carry a proven error in the row-sum norm. The remainder
//! is at most 2 |X|^(K+1)/(K+1)!. If the error turns out too large, the computation is repeated with more bits: the
//! first run tells how many are missing. Source: Moler and Van Loan, SIAM Rev. 45 (2003) 3-49,
//! doi:10.1137/S00361445024180, methods 1 and 3; Paterson and Stockmeyer, SIAM J. Comput. 2 (1973) 60-66.

mod fixed_matrix;
mod limb;

use crate::error::CoreError;
use crate::matrix::RationalMatrix;
use crate::root::magnitude::Magnitude;
use fixed_matrix::Ball;
use keepout_checker::number::{Direction, Dyadic, Interval, Rational};
use num_bigint::{BigInt, BigUint};
use num_traits::{One, Signed, ToPrimitive, Zero};
use std::ops::Index;

/// Working precision beyond which [`enclose_exponential`] gives up.
pub const FRACTION_LIMIT: u64 = 1 << 18;

/// A matrix of intervals.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct IntervalMatrix {
    rows: usize,
    columns: usize,
    entries: Vec<Interval>,
}

impl IntervalMatrix {
    /// Number of rows.
    pub fn rows(&self) -> usize {
        self.rows
    }

    /// Number of columns.
    pub fn columns(&self) -> usize {
        self.columns
    }

    /// One row.
    pub fn row(&self, i: usize) -> &[Interval] {
        &self.entries[i * self.columns..(i + 1) * self.columns]
    }

    /// Encloses the product with each member of a box.
    ///
    /// # Errors
    /// [`CoreError::Shape`] if x has not one entry for each column.
    ///
    /// # Guarantee
    /// P x lies in the result for each member P of the matrix and x of the box.
    pub fn apply(&self, x: &[Interval], bits: u32) -> Result<Vec<Interval>, CoreError> {
        if x.len() != self.columns {
            return Err(CoreError::Shape { what: "vector", expected: self.columns, found: x.len() });
        }
        let dot = |row: &[Interval]| {
            row.iter().zip(x).fold(Interval::integer(0), |sum, (a, b)| sum.add(&a.mul(b, bits), bits))
        };
        Ok((0..self.rows).map(|i| dot(self.row(i))).collect())
    }

    /// Encloses the products of members.
    ///
    /// # Errors
    /// [`CoreError::Shape`] if the inner dimensions differ.
    ///
    /// # Guarantee
    /// P Q lies in the result for all members P, Q.
    pub fn product(&self, other: &Self, bits: u32) -> Result<Self, CoreError> {
        if self.columns != other.rows {
            return Err(CoreError::Shape { what: "rows of a factor", expected: self.columns, found: other.rows });
        }
        let entry = |(i, j): (usize, usize)| {
            (0..self.columns)
                .fold(Interval::integer(0), |sum, k| sum.add(&self[(i, k)].mul(&other[(k, j)], bits), bits))
        };
        let places = (0..self.rows).flat_map(|i| (0..other.columns).map(move |j| (i, j)));
        Ok(Self { rows: self.rows, columns: other.columns, entries: places.map(entry).collect() })
    }
}

impl Index<(usize, usize)> for IntervalMatrix {
    type Output = Interval;
    fn index(&self, (i, j): (usize, usize)) -> &Interval {
        &self.entries[i * self.columns + j]
    }
}

/// Encloses exp(A t).
///
/// # Guarantee
/// Every entry of exp(A t) lies in its interval. The half-width of every entry is at most 2^-bits times the largest
/// entry's modulus (the accuracy is relative to the matrix, not to each entry).
///
/// # Errors
/// [`CoreError::NotSquare`]; [`CoreError::LimitExceeded`] if more than [`FRACTION_LIMIT`] bits of working precision
/// are needed: |A t| is huge.
///
/// # Cost
/// About (log2 |A t| + 10) products of n x n matrices of `bits` + (growth) bits.
///
/// ```
/// use keepout_core::ToRational;
/// use keepout_core::{RationalMatrix, enclose_exponential};
/// use num_rational::BigRational;
/// let nilpotent = RationalMatrix::from_integers(&[vec![0, 6], vec![0, 0]])?;
/// let exp = enclose_exponential(&nilpotent, &BigRational::new(1.into(), 2.into()), 53)?;
/// assert!(exp[(0, 1)].lo().to_rational() <= Some(BigRational::from_integer(3.into())));
/// # Ok::<(), keepout_core::CoreError>(())
/// ```
pub fn enclose_exponential(a: &RationalMatrix, t: &Rational, bits: u32) -> Result<IntervalMatrix, CoreError> {
    let n = a.order()?;
    let (denominator, scaled) = a.common_scaled();
    let denominator = denominator * t.denom();
    let entries: Vec<BigInt> = scaled.entries().iter().map(|e| e * t.numer()).collect();
    // SOUND(hi): |A t| < 2^top, from the bit lengths of numerator and denominator.
    let norm = scaled.row_sum_norm() * t.numer().abs();
    let top = norm.bits() as i64 - denominator.bits() as i64 + 1;
    let reduction = 2 + i64::from(bits.isqrt() / 8);
    let halvings = u64::try_from(top + reduction).unwrap_or(0);
    let mut fraction = u64::from(bits) + 2 * halvings + 24 + 2 * u64::from((n as u32).max(1).ilog2());
    loop {
        if fraction > FRACTION_LIMIT {
            return Err(CoreError::LimitExceeded { what: "bits of a matrix exponential", limit: FRACTION_LIMIT });
        }
        let start = Ball::from_integers(n, &entries, &denominator, halvings, fraction);
        let mut result = taylor(&start, n, fraction);
        for _ in 0..halvings {
            result = result.product(&result);
        }
        // One bit for the distance of `top` from the largest entry, one for rounding the ends outwards.
        let missing = result.error.top() + i64::from(bits) + 2 - result.top();
        if missing <= 0 || n == 0 || result.error.top() < i64::MIN / 8 {
            return Ok(to_intervals(&result, n, fraction, bits));
        }
        // The error scales with 2^-fraction; if the result has no correct digit yet, more than that may be missing.
        fraction += u64::try_from(missing).unwrap_or(0).clamp(8, fraction) + 4;
    }
}

/// exp(X) for |X| <= 1/2.
fn taylor(x: &Ball, n: usize, fraction: u64) -> Ball {
    let norm = x.norm_hi().add_hi(x.error);
    let (degree, remainder) = taylor_degree(norm, fraction);
    let step = (degree + 1).isqrt().max(1);
    // X^1 .. X^step
    let mut powers = vec![x.clone()];
    while powers.len() < step {
        powers.push(powers[powers.len() - 1].product(x));
    }
    // 2^fraction / k!, rounded down: in error by less than one unit.
    let mut reciprocals = vec![BigUint::one() << fraction];
    for k in 1..=degree {
        reciprocals.push(&reciprocals[k - 1] / k);
    }
    let mut sum: Option<Ball> = None;
    for start in (0..=degree).step_by(step).collect::<Vec<_>>().into_iter().rev() {
        let block: Vec<(&BigUint, &Ball)> =
            (1..step).filter(|i| start + i <= degree).map(|i| (&reciprocals[start + i], &powers[i - 1])).collect();
        let part = Ball::combination(n, fraction, &reciprocals[start], &block);
        sum = Some(match sum {
            Some(higher) => higher.product(&powers[step - 1]).sum(&part),
            None => part,
        });
    }
    let mut result = sum.unwrap_or_else(|| x.clone());
    result.error = result.error.add_hi(remainder);
    result
}

/// A degree K, and a bound of the norm of sum over k > K of X^k / k! for |X| <= norm <= 1/2.
fn taylor_degree(norm: Magnitude, fraction: u64) -> (usize, Magnitude) {
    let mut degree = 0;
    let mut term = norm;
    // SOUND(hi): `term` is norm^(K+1)/(K+1)! rounded up; later terms at least halve, so the tail is at most twice the
    // term.
    while term.top() > -(fraction as i64) {
        degree += 1;
        let ratio = norm.div_hi(Magnitude::exact(degree as u32 + 1, 0)).unwrap_or_else(Magnitude::zero);
        term = term.mul_hi(ratio);
    }
    (degree, term.shifted(1))
}

fn to_intervals(result: &Ball, n: usize, fraction: u64, bits: u32) -> IntervalMatrix {
    let radius = result.error.to_dyadic();
    let unit = fraction.to_i64().unwrap_or(i64::MAX);
    let keep = bits + 64;
    let places = (0..n).flat_map(|i| (0..n).map(move |j| (i, j)));
    let entries = places.map(|(i, j)| {
        let centre = Dyadic::new(result.entry(i, j), -unit);
        if radius.mantissa().is_zero() {
            return Interval::point(centre);
        }
        // SOUND(lo,hi): |true entry - centre| <= norm of the error matrix <= radius; both ends are rounded outwards.
        Interval::hull(centre.add(&radius.neg(), keep, Direction::Down), centre.add(&radius, keep, Direction::Up))
    });
    IntervalMatrix { rows: n, columns: n, entries: entries.collect() }
}
