//! Univariate polynomials with integer coefficients: the ring, evaluation and changes of variable.
//!
//! Coefficients are stored in ascending order and trimmed: the last one is not 0, and the zero polynomial has none.
//! Everything is exact. Greatest common divisors and square-free parts are in [`gcd`](self) files beside this one;
//! factorisation is in [`crate::factor`]. A rational polynomial is represented by its primitive integer multiple with
//! positive leading coefficient, [`IntegerPolynomial::from_rationals`].

mod division;
mod gcd;

use keepout_checker::number::Rational;
use keepout_checker::polynomial::Polynomial;
use num_bigint::BigInt;
use num_integer::Integer;
use num_traits::{One, Signed, Zero};
use std::fmt;
use std::ops::{Add, Mul, Neg, Sub};

/// A polynomial over the integers.
///
/// ```
/// use keepout_core::IntegerPolynomial;
/// let p = IntegerPolynomial::from_small(&[-1, 0, 1]); // z^2 - 1
/// let q = IntegerPolynomial::from_small(&[1, 1]); // z + 1
/// assert_eq!(p.divide_exact(&q), Some(IntegerPolynomial::from_small(&[-1, 1])));
/// assert_eq!(p.gcd(&(&q * &q)), q);
/// ```
#[derive(Clone, Debug, PartialEq, Eq, Hash, Default)]
pub struct IntegerPolynomial {
    coefficients: Vec<BigInt>,
}

impl IntegerPolynomial {
    /// The polynomial with these coefficients, constant term first; leading zeros are dropped.
    pub fn new(mut coefficients: Vec<BigInt>) -> Self {
        while coefficients.last().is_some_and(Zero::is_zero) {
            coefficients.pop();
        }
        Self { coefficients }
    }

    /// The polynomial with these coefficients, constant term first.
    pub fn from_small(coefficients: &[i64]) -> Self {
        Self::new(coefficients.iter().map(|c| BigInt::from(*c)).collect())
    }

    /// The primitive integer polynomial with positive leading coefficient that is a rational multiple of the
    /// given one; 0 for 0.
    pub fn from_rationals(coefficients: &[Rational]) -> Self {
        let denominator = coefficients.iter().fold(BigInt::one(), |l, c| l.lcm(c.denom()));
        Self::new(coefficients.iter().map(|c| c.numer() * (&denominator / c.denom())).collect()).primitive_part()
    }

    /// The zero polynomial.
    pub fn zero() -> Self {
        Self::default()
    }

    /// The constant 1.
    pub fn one() -> Self {
        Self { coefficients: vec![BigInt::one()] }
    }

    /// The variable z.
    pub fn variable() -> Self {
        Self { coefficients: vec![BigInt::zero(), BigInt::one()] }
    }

    /// The constant polynomial.
    pub fn constant(value: BigInt) -> Self {
        Self::new(vec![value])
    }

    /// Coefficients, constant term first; the last one is not 0.
    pub fn coefficients(&self) -> &[BigInt] {
        &self.coefficients
    }

    /// The coefficient of z^k.
    pub fn coefficient(&self, k: usize) -> BigInt {
        self.coefficients.get(k).cloned().unwrap_or_default()
    }

    /// The degree; 0 for the zero polynomial.
    pub fn degree(&self) -> usize {
        self.coefficients.len().saturating_sub(1)
    }

    /// The leading coefficient; 0 for the zero polynomial.
    pub fn leading(&self) -> BigInt {
        self.coefficients.last().cloned().unwrap_or_default()
    }

    /// Whether this is the zero polynomial.
    pub fn is_zero(&self) -> bool {
        self.coefficients.is_empty()
    }

    /// Whether this is a constant (0 included).
    pub fn is_constant(&self) -> bool {
        self.coefficients.len() <= 1
    }

    /// Whether the leading coefficient is 1.
    pub fn is_monic(&self) -> bool {
        self.coefficients.last().is_some_and(One::is_one)
    }

    /// The largest bit length of a coefficient.
    pub fn bits(&self) -> u64 {
        self.coefficients.iter().map(BigInt::bits).max().unwrap_or(0)
    }

    /// The non-negative greatest common divisor of the coefficients.
    pub fn content(&self) -> BigInt {
        let mut content = BigInt::zero();
        for c in &self.coefficients {
            content = content.gcd(c);
            if content.is_one() {
                break;
            }
        }
        content
    }

    /// The polynomial divided by its content, with positive leading coefficient.
    pub fn primitive_part(&self) -> Self {
        let mut content = self.content();
        if self.leading().is_negative() {
            content = -content;
        }
        if self.is_zero() || content.is_one() {
            return self.clone();
        }
        Self { coefficients: self.coefficients.iter().map(|c| c / &content).collect() }
    }

    /// c times the polynomial.
    pub fn scale(&self, c: &BigInt) -> Self {
        Self::new(self.coefficients.iter().map(|a| a * c).collect())
    }

    /// self^exponent.
    pub fn power(&self, exponent: usize) -> Self {
        (0..exponent).fold(Self::one(), |product, _| &product * self)
    }

    /// The derivative.
    pub fn derivative(&self) -> Self {
        Self::new(self.coefficients.iter().enumerate().skip(1).map(|(k, c)| c * BigInt::from(k)).collect())
    }

    /// The value at an integer.
    pub fn value(&self, at: &BigInt) -> BigInt {
        self.coefficients.iter().rev().fold(BigInt::zero(), |sum, c| sum * at + c)
    }

    /// The value at a rational number.
    pub fn value_rational(&self, at: &Rational) -> Rational {
        Rational::new(self.homogeneous_value(at.numer(), at.denom()), at.denom().pow(self.degree() as u32))
    }

    /// den^degree p(num/den).
    pub fn homogeneous_value(&self, num: &BigInt, den: &BigInt) -> BigInt {
        let mut power = BigInt::one();
        let mut sum = BigInt::zero();
        for (k, c) in self.coefficients.iter().rev().enumerate() {
            if k > 0 {
                power *= den;
            }
            sum = sum * num + c * &power;
        }
        sum
    }

    /// p(z + a), by repeated synthetic division.
    pub fn shift(&self, a: &BigInt) -> Self {
        let mut row = self.coefficients.clone();
        for done in 0..row.len().saturating_sub(1) {
            for k in (done..row.len() - 1).rev() {
                let carry = &row[k + 1] * a;
                row[k] += carry;
            }
        }
        Self::new(row)
    }

    /// den^degree p(z/den) for a positive integer.
    pub fn dilate_down(&self, den: &BigInt) -> Self {
        let mut power = BigInt::one();
        let mut row: Vec<BigInt> = Vec::with_capacity(self.coefficients.len());
        for c in self.coefficients.iter().rev() {
            row.push(c * &power);
            power *= den;
        }
        row.reverse();
        Self::new(row)
    }

    /// p(num z).
    pub fn dilate_up(&self, num: &BigInt) -> Self {
        let mut power = BigInt::one();
        let mut row: Vec<BigInt> = Vec::with_capacity(self.coefficients.len());
        for c in &self.coefficients {
            row.push(c * &power);
            power *= num;
        }
        Self::new(row)
    }

    /// The primitive integer multiple of p(c - z), with positive leading coefficient.
    ///
    /// If p is primitive with positive leading coefficient, p(c - z) = +-p(z) holds up to a rational factor exactly
    /// if the result equals p (the roots are then symmetric about c/2).
    pub fn reflected(&self, c: &Rational) -> Self {
        // With w = den z: den^d p((num - w)/den), then w back to den z.
        let mut row = self.dilate_down(c.denom()).shift(c.numer()).coefficients;
        for odd in row.iter_mut().skip(1).step_by(2) {
            *odd = -std::mem::take(odd);
        }
        Self::new(row).dilate_up(c.denom()).primitive_part()
    }

    /// The same polynomial divided by its leading coefficient, over the rationals.
    pub fn to_monic(&self) -> Polynomial {
        let lead = self.leading();
        Polynomial::new(self.coefficients.iter().map(|c| Rational::new(c.clone(), lead.clone())).collect())
    }
}

impl From<&Polynomial> for IntegerPolynomial {
    /// The primitive integer multiple with positive leading coefficient.
    fn from(polynomial: &Polynomial) -> Self {
        Self::from_rationals(polynomial.coefficients())
    }
}

impl Add for &IntegerPolynomial {
    type Output = IntegerPolynomial;
    fn add(self, other: Self) -> IntegerPolynomial {
        let (long, short) =
            if self.coefficients.len() >= other.coefficients.len() { (self, other) } else { (other, self) };
        let mut sum = long.coefficients.clone();
        for (slot, c) in sum.iter_mut().zip(&short.coefficients) {
            *slot += c;
        }
        IntegerPolynomial::new(sum)
    }
}

impl Neg for &IntegerPolynomial {
    type Output = IntegerPolynomial;
    fn neg(self) -> IntegerPolynomial {
        IntegerPolynomial { coefficients: self.coefficients.iter().map(|c| -c).collect() }
    }
}

impl Sub for &IntegerPolynomial {
    type Output = IntegerPolynomial;
    fn sub(self, other: Self) -> IntegerPolynomial {
        self + &-other
    }
}

impl Mul for &IntegerPolynomial {
    type Output = IntegerPolynomial;
    fn mul(self, other: Self) -> IntegerPolynomial {
        if self.is_zero() || other.is_zero() {
            return IntegerPolynomial::zero();
        }
        let mut product = vec![BigInt::zero(); self.coefficients.len() + other.coefficients.len() - 1];
        for (i, a) in self.coefficients.iter().enumerate().filter(|(_, a)| !a.is_zero()) {
            for (slot, b) in product[i..].iter_mut().zip(&other.coefficients) {
                *slot += a * b;
            }
        }
        IntegerPolynomial::new(product)
    }
}

impl fmt::Display for IntegerPolynomial {
    /// Descending powers of z, for example `3z^2 - z + 1`.
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        if self.is_zero() {
            return f.write_str("0");
        }
        let mut first = true;
        for (k, c) in self.coefficients.iter().enumerate().rev().filter(|(_, c)| !c.is_zero()) {
            match (first, c.is_negative()) {
                (true, false) => {}
                (true, true) => f.write_str("-")?,
                (false, false) => f.write_str(" + ")?,
                (false, true) => f.write_str(" - ")?,
            }
            first = false;
            let magnitude = c.abs();
            if k == 0 || !magnitude.is_one() {
                write!(f, "{magnitude}")?;
            }
            match k {
                0 => {}
                1 => f.write_str("z")?,
                _ => write!(f, "z^{k}")?,
            }
        }
        Ok(())
    }
}
