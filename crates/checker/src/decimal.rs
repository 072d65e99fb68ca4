//! Rational numbers for people: the exact fraction, with a decimal beside it.
//!
//! The fraction is what counts. The decimal is the same number where it has at most 15 digits after the point; else it
//! is marked `about` and has six significant digits. Integers stand alone. All arithmetic is on integers.

use crate::number::Rational;
use num_bigint::BigInt;
use num_integer::Integer;
use num_traits::{One, Signed, Zero};

/// The most digits after the point of an exact decimal.
const EXACT_DIGITS: u32 = 15;

/// The significant digits of a rounded decimal.
const ROUNDED_DIGITS: i64 = 6;

/// The number as `7`, `3/50 (0.06)` or `1/3 (about 0.333333)`.
pub fn fraction_and_decimal(value: &Rational) -> String {
    if value.is_integer() {
        return value.to_string();
    }
    match exact_decimal(value) {
        Some(decimal) => format!("{value} ({decimal})"),
        None => format!("{value} (about {})", rounded_decimal(value)),
    }
}

/// The number in decimal digits; `None` if that takes more than 15 digits after the point.
pub fn exact_decimal(value: &Rational) -> Option<String> {
    let mut power = BigInt::one();
    for digits in 0..=EXACT_DIGITS {
        if power.is_multiple_of(value.denom()) {
            let scaled = value.numer() * (&power / value.denom());
            return Some(point(&scaled, usize::try_from(digits).ok()?));
        }
        power *= 10_u32;
    }
    None
}

/// The number rounded to six significant digits, ties away from zero; with a power of ten where it is large or small.
pub fn rounded_decimal(value: &Rational) -> String {
    if value.is_zero() {
        return "0".into();
    }
    let length = |x: &BigInt| i64::try_from(x.abs().to_string().len()).unwrap_or(i64::MAX);
    // 10^(exponent - 1) < |value| < 10^(exponent + 1).
    let exponent = length(value.numer()) - length(value.denom());
    let top = BigInt::from(10_u32).pow(6);
    let mut shift = ROUNDED_DIGITS - exponent;
    let mut digits = rounded_integer(&value.abs(), shift);
    if digits >= top {
        shift -= 1;
        digits = rounded_integer(&value.abs(), shift);
    }
    if digits == top {
        // The rounding carried into a seventh digit.
        shift -= 1;
        digits = BigInt::from(10_u32).pow(5);
    }
    let sign = if value.is_negative() { "-" } else { "" };
    match usize::try_from(shift) {
        Ok(after) if after <= 10 => format!("{sign}{}", point(&digits, after)),
        Ok(_) | Err(_) => format!("{sign}{}e{}", point(&digits, 5), ROUNDED_DIGITS - 1 - shift),
    }
}

/// value 10^shift, rounded to an integer; value > 0.
fn rounded_integer(value: &Rational, shift: i64) -> BigInt {
    let power = BigInt::from(10_u32).pow(u32::try_from(shift.unsigned_abs()).unwrap_or(u32::MAX));
    let (top, bottom) = if shift >= 0 {
        (value.numer() * power, value.denom().clone())
    } else {
        (value.numer().clone(), value.denom() * power)
    };
    (top * 2_u32 + &bottom).div_floor(&(bottom * 2_u32))
}

/// scaled / 10^after in decimal digits, without closing zeros after the point.
fn point(scaled: &BigInt, after: usize) -> String {
    let sign = if scaled.is_negative() { "-" } else { "" };
    let digits = format!("{:0>width$}", scaled.abs().to_string(), width = after + 1);
    let (whole, part) = digits.split_at(digits.len().saturating_sub(after));
    let part = part.trim_end_matches('0');
    if part.is_empty() { format!("{sign}{whole}") } else { format!("{sign}{whole}.{part}") }
}
