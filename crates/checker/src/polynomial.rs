//! Univariate polynomials with rational coefficients, in ascending order of degree.
//!
//! The last coefficient is not 0; the zero polynomial has no coefficient. All operations are exact, except
//! [`Polynomial::taylor`], which encloses.

use crate::number::{Complex, Interval, Rational};
use num_bigint::BigInt;
use num_integer::Integer;
use num_traits::{One, Zero};

/// A polynomial over the rationals.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Polynomial {
    coefficients: Vec<Rational>,
}

impl Polynomial {
    /// The polynomial with these coefficients, constant term first; leading zeros are dropped.
    pub fn new(mut coefficients: Vec<Rational>) -> Self {
        while coefficients.last().is_some_and(Zero::is_zero) {
            coefficients.pop();
        }
        Self { coefficients }
    }

    /// The constant polynomial 1.
    pub fn one() -> Self {
        Self { coefficients: vec![Rational::one()] }
    }

    /// Coefficients, constant term first; the last one is not 0.
    pub fn coefficients(&self) -> &[Rational] {
        &self.coefficients
    }

    /// The degree; 0 for the zero polynomial.
    pub fn degree(&self) -> usize {
        self.coefficients.len().saturating_sub(1)
    }

    /// Whether the leading coefficient is 1.
    pub fn is_monic(&self) -> bool {
        self.coefficients.last().is_some_and(One::is_one)
    }

    /// The mean of the roots of a monic polynomial; `None` for a constant.
    pub fn mean(&self) -> Option<Rational> {
        let second = self.coefficients.get(self.degree().checked_sub(1)?)?;
        Some(-second / Rational::from_integer(self.degree().into()))
    }

    /// The bits of all coefficients.
    pub fn length(&self) -> usize {
        self.coefficients.iter().map(length).fold(0, usize::saturating_add)
    }

    /// Bits of the longest numerator over the common denominator and of this, at most.
    pub fn common_length(&self) -> usize {
        let common = self.coefficients.iter().fold(BigInt::one(), |d, c| d.lcm(c.denom()));
        let longest = self.coefficients.iter().map(|c| c.numer().bits()).max().unwrap_or(0);
        usize::try_from(longest.saturating_add(common.bits().saturating_mul(2))).unwrap_or(usize::MAX)
    }

    /// self * other.
    pub fn mul(&self, other: &Self) -> Self {
        let length = (self.coefficients.len() + other.coefficients.len()).saturating_sub(1);
        let mut product = vec![Rational::zero(); length];
        for (i, a) in self.coefficients.iter().enumerate() {
            for (slot, b) in product.iter_mut().skip(i).zip(&other.coefficients) {
                *slot += a * b;
            }
        }
        Self::new(product)
    }

    /// self^exponent.
    pub fn power(&self, exponent: u32) -> Self {
        (0..exponent).fold(Self::one(), |product, _| product.mul(self))
    }

    /// The polynomial p(c - z).
    pub fn reflected(&self, c: &Rational) -> Self {
        let line = Self::new(vec![c.clone(), -Rational::one()]);
        self.coefficients.iter().rev().fold(Self::new(Vec::new()), |sum, a| {
            let mut next = sum.mul(&line).coefficients;
            match next.first_mut() {
                Some(constant) => *constant += a,
                None => next.push(a.clone()),
            }
            Self::new(next)
        })
    }

    /// Encloses the first `count` Taylor coefficients p^(k)(z) / k! at the members z of a rectangle.
    pub fn taylor(&self, at: &Complex, count: usize, bits: u32) -> Vec<Complex> {
        let mut row: Vec<Complex> =
            self.coefficients.iter().map(|c| Complex::real(Interval::rational(c, bits))).collect();
        // Repeated synthetic division by (z - at): after pass k, entry k is the coefficient of (z - at)^k.
        for done in 0..count.min(row.len()) {
            let mut carry = Complex::zero();
            for slot in row.iter_mut().skip(done).rev() {
                carry = slot.add(&carry.mul(at, bits), bits);
                *slot = carry.clone();
            }
        }
        row.resize(count, Complex::zero());
        row
    }

    /// The power sums s_0, s_1, ..., s_last of the roots of a monic polynomial, with multiplicity.
    ///
    /// Source: Newton's identities.
    pub fn power_sums(&self, last: usize) -> Vec<Rational> {
        let degree = self.degree();
        // e_k with sign: p = z^d + c_1 z^(d-1) + ... + c_d.
        let c: Vec<&Rational> = self.coefficients.iter().rev().skip(1).collect();
        let mut sums = vec![Rational::from_integer(degree.into())];
        for k in 1..=last {
            let mut s = c.get(k - 1).map_or_else(Rational::zero, |ck| -(*ck * Rational::from_integer(k.into())));
            for (ci, previous) in c.iter().zip(sums.iter().skip(1).rev()) {
                s -= *ci * previous;
            }
            sums.push(s);
        }
        sums
    }
}

/// The bits of a number.
pub fn length(x: &Rational) -> usize {
    usize::try_from(x.numer().bits().saturating_add(x.denom().bits())).unwrap_or(usize::MAX)
}
