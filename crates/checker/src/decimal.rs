//! Rational numbers for people: the exact fraction, with a decimal beside it.
//!
//! The fraction is what counts. The decimal is the same number where it has at most 15 digits after the point; else it
//! is marked `about` and cut off after six significant digits. Integers stand alone. All arithmetic is on integers.

use crate::number::Rational;
use num_bigint::BigInt;
use num_integer::Integer;
use num_traits::{One, Signed};

/// The most digits after the point of an exact decimal.
const EXACT_DIGITS: u32 = 15;

/// The significant digits of a decimal that is cut off.
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

/// The first six significant digits of a number, with a power of ten where it is large or small.
pub fn rounded_decimal(value: &Rational) -> String {
    let length = |x: &BigInt| i64::try_from(x.magnitude().to_string().len()).unwrap_or(i64::MAX);
    // 10^(e-1) < |value| < 10^(e+1) for the difference e of the lengths, so six or seven digits stand before the point.
    let mut shift = ROUNDED_DIGITS + length(value.denom()) - length(value.numer());
    let power = Rational::from_integer(BigInt::from(10_u32)).pow(i32::try_from(shift).unwrap_or(i32::MAX));
    let mut digits = (value * power).to_integer();
    if digits.magnitude().to_string().len() > 6 {
        digits /= 10_u32;
        shift -= 1;
    }
    match usize::try_from(shift) {
        Ok(after) if after <= 10 => point(&digits, after),
        Ok(_) | Err(_) => format!("{}e{}", point(&digits, 5), ROUNDED_DIGITS - 1 - shift),
    }
}

/// scaled / 10^after in decimal digits, without closing zeros after the point.
fn point(scaled: &BigInt, after: usize) -> String {
    let sign = if scaled.is_negative() { "-" } else { "" };
    let digits = format!("{:0>width$}", scaled.abs().to_string(), width = after + 1);
    let (whole, part) = digits.split_at(digits.len().saturating_sub(after));
    let part = part.trim_end_matches('0');
    if part.is_empty() { format!("{sign}{whole}") } else { format!("{sign}{whole}.{part}") }
}
