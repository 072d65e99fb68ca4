//! Dyadic numbers as rational ones.

use keepout_checker::number::{Dyadic, Rational};
use num_bigint::BigInt;
use num_traits::One;

/// The value of a number as a rational one.
pub trait ToRational {
    /// The exact value.
    ///
    /// # Errors
    /// `None` for exponents beyond 2^20: such rationals would be too long to work with.
    fn to_rational(&self) -> Option<Rational>;
}

impl ToRational for Dyadic {
    fn to_rational(&self) -> Option<Rational> {
        let shift = self.exponent().unsigned_abs();
        if shift > 1 << 20 {
            return None;
        }
        let power = BigInt::one() << shift;
        Some(if self.exponent() >= 0 {
            Rational::from_integer(self.mantissa() * power)
        } else {
            Rational::new(self.mantissa().clone(), power)
        })
    }
}
