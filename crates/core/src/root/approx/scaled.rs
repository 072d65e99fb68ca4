//! Complex doubles with an exponent of their own: products of many factors neither overflow nor vanish.

use super::{ApproxComplex, approx_parts, approx_power_of_two};
use num_bigint::BigInt;
use num_traits::{ToPrimitive, Zero};

/// mantissa * 2^exponent, nearly.
#[derive(Clone, Copy, Debug)]
pub(crate) struct ScaledComplex {
    mantissa: ApproxComplex,
    exponent: i64,
}

impl ScaledComplex {
    pub(crate) fn approx_from(re: &BigInt, im: &BigInt, exponent: i64) -> Self {
        let ((a, e), (b, g)) = (approx_parts(re), approx_parts(im));
        let top = e.max(g);
        let mantissa = ApproxComplex { re: a * approx_power_of_two(e - top), im: b * approx_power_of_two(g - top) };
        Self { mantissa, exponent: exponent + top }
    }

    pub(crate) fn approx_mul(self, other: Self) -> Self {
        let product = self.mantissa.mul(other.mantissa);
        Self { mantissa: product, exponent: self.exponent + other.exponent }.normal()
    }

    pub(crate) fn approx_div(self, other: Self) -> Self {
        let quotient = self.mantissa.mul(other.mantissa.recip());
        Self { mantissa: quotient, exponent: self.exponent - other.exponent }.normal()
    }

    fn normal(self) -> Self {
        let size = self.mantissa.re.abs().max(self.mantissa.im.abs());
        if size == 0.0 || !size.is_finite() || (1e-3..1e3).contains(&size) {
            return self;
        }
        let shift = size.log2().ceil() as i64;
        Self { mantissa: self.mantissa.scale(approx_power_of_two(-shift)), exponent: self.exponent + shift }
    }

    /// Integers (re, im) and an exponent with about 53 bits of this number; `None` if it is not finite.
    pub(crate) fn to_integers(self) -> Option<(BigInt, BigInt, i64)> {
        let unit = approx_power_of_two(54);
        let part = |x: f64| (x * unit).to_i128().map(BigInt::from);
        let (re, im) = (part(self.mantissa.re)?, part(self.mantissa.im)?);
        if re.is_zero() && im.is_zero() {
            return Some((re, im, 0));
        }
        Some((re, im, self.exponent - 54))
    }
}
