//! The value of an integer polynomial at a dyadic complex point, with a proven error bound.
//!
//! The point is written z = 2^s w with |w| < 1 and the coefficients A_k = a_k 2^(s k); Horner's rule runs on integers
//! in units of 2^(M - g), M the top of the largest A_k. Each step drops less than one unit in each part, and |w| < 1
//! never enlarges an earlier error.

use super::magnitude::Magnitude;
use num_bigint::BigInt;
use num_traits::Zero;

/// The point (re + i im) 2^exponent.
#[derive(Clone, Debug)]
pub(crate) struct Point {
    pub(crate) re: BigInt,
    pub(crate) im: BigInt,
    pub(crate) exponent: i64,
}

impl Point {
    /// The least k with |re|, |im| < 2^k.
    pub(crate) fn top(&self) -> i64 {
        self.exponent + self.re.bits().max(self.im.bits()) as i64
    }

    pub(crate) fn is_zero(&self) -> bool {
        self.re.is_zero() && self.im.is_zero()
    }

    /// The point rounded (to nearest or below) to multiples of 2^exponent, if it is finer.
    pub(crate) fn coarsened(mut self, exponent: i64) -> Self {
        if self.exponent < exponent {
            let shift = self.exponent.abs_diff(exponent);
            self.re >>= shift;
            self.im >>= shift;
            self.exponent = exponent;
        }
        self
    }
}

/// A value (re + i im) 2^exponent, in error by at most `error`.
pub(crate) struct Value {
    pub(crate) re: BigInt,
    pub(crate) im: BigInt,
    pub(crate) exponent: i64,
    pub(crate) error: Magnitude,
}

impl Value {
    /// Not below the modulus of the true value.
    pub(crate) fn modulus_hi(&self) -> Magnitude {
        let re = Magnitude::integer_hi(&self.re, self.exponent);
        let im = Magnitude::integer_hi(&self.im, self.exponent);
        re.mul_hi(re).add_hi(im.mul_hi(im)).sqrt_hi().add_hi(self.error)
    }

    /// The least k with |re|, |im| < 2^k for the value as computed.
    pub(crate) fn top(&self) -> i64 {
        match self.re.bits().max(self.im.bits()) {
            0 => i64::MIN / 4,
            bits => self.exponent + bits as i64,
        }
    }
}

/// a 2^shift, rounded down.
fn shifted(a: &BigInt, shift: i64) -> BigInt {
    if shift >= 0 { a << shift.unsigned_abs() } else { a >> shift.unsigned_abs() }
}

/// The value at a point with `guard` bits below the largest term.
///
/// # Guarantee
/// The error is at most 3 (d + 1) units of 2^(M - guard).
pub(crate) fn evaluate(coefficients: &[BigInt], at: &Point, guard: u64) -> Value {
    let count = coefficients.len();
    if at.is_zero() {
        let re = coefficients.first().cloned().unwrap_or_default();
        return Value { re, im: BigInt::zero(), exponent: 0, error: Magnitude::zero() };
    }
    // SOUND: |re|, |im| < 2^(s-1), so |w| < 1/sqrt 2 < 1.
    let s = at.top() + 1;
    let fraction = s - at.exponent;
    let top = |(k, a): (usize, &BigInt)| a.bits() as i64 + s * k as i64;
    let largest = coefficients.iter().enumerate().filter(|(_, a)| !a.is_zero()).map(top).max().unwrap_or(0);
    let unit = largest - guard as i64;
    let real = at.im.is_zero();
    let (mut re, mut im) = (BigInt::zero(), BigInt::zero());
    for (k, a) in coefficients.iter().enumerate().rev() {
        if real {
            re = (re * &at.re) >> fraction;
        } else {
            let next = (&re * &at.re - &im * &at.im) >> fraction;
            im = (re * &at.im + im * &at.re) >> fraction;
            re = next;
        }
        re += shifted(a, s * k as i64 - unit);
    }
    // SOUND(hi): per step the floors drop less than 1 unit of re, 1 of im, and 1 of the coefficient: less than 3 in
    // modulus; d + 1 = count steps, each error multiplied by powers of |w| < 1 only.
    Value { re, im, exponent: unit, error: Magnitude::exact(3 * count as u32, unit) }
}
