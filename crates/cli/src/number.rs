//! Exact numbers from their text: 0.1 is one tenth, never the nearest double.

use num_bigint::BigInt;
use num_rational::BigRational;
use num_traits::{Signed, Zero};

/// The most characters of a number.
pub const MAX_LENGTH: usize = 10_000;

/// The greatest decimal exponent, either sign.
pub const MAX_EXPONENT: i64 = 10_000;

/// Why a text is not an exact number.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum NumberError {
    /// Not digits with an optional point and exponent.
    Form,
    /// A digit separator that is not between digits.
    Separator,
    /// More than [`MAX_LENGTH`] characters.
    TooLong,
    /// An exponent beyond [`MAX_EXPONENT`].
    Exponent,
}

impl NumberError {
    /// What was expected, for people.
    pub fn message(self) -> String {
        match self {
            Self::Form => "expected a finite number such as 12, 0.05 or 1.2e-3".into(),
            Self::Separator => "a digit separator `_` stands between two digits".into(),
            Self::TooLong => format!("a number has at most {MAX_LENGTH} characters"),
            Self::Exponent => format!("the exponent of a number is at most {MAX_EXPONENT}, either sign"),
        }
    }
}

impl NumberError {
    /// How to mend it.
    pub fn help(self) -> &'static str {
        match self {
            Self::Form => "numbers are finite; for all time, leave `until` out",
            Self::Separator => "write 1_000 or 1000",
            Self::TooLong => "round it; a certificate holds every digit",
            Self::Exponent => "choose a unit in which the number is neither so large nor so small",
        }
    }
}

/// Reads an integer or decimal with optional sign, point, exponent and digit separators `_`.
///
/// # Errors
/// See [`NumberError`].
pub fn decimal(text: &str) -> Result<BigRational, NumberError> {
    if text.len() > MAX_LENGTH {
        return Err(NumberError::TooLong);
    }
    let bytes = text.as_bytes();
    let is_digit = |i: Option<usize>| i.and_then(|i| bytes.get(i)).is_some_and(u8::is_ascii_digit);
    if (0..bytes.len()).any(|i| bytes[i] == b'_' && !(is_digit(i.checked_sub(1)) && is_digit(Some(i + 1)))) {
        return Err(NumberError::Separator);
    }
    let plain = text.replace('_', "");
    let (mantissa, exponent) = match plain.find(['e', 'E']) {
        Some(at) => (&plain[..at], &plain[at + 1..]),
        None => (plain.as_str(), "0"),
    };
    let (whole, fraction) = mantissa.split_once('.').unwrap_or((mantissa, ""));
    let unsigned = whole.strip_prefix(['-', '+']).unwrap_or(whole);
    let digits = |s: &str| s.bytes().all(|b| b.is_ascii_digit());
    if (unsigned.is_empty() && fraction.is_empty()) || !digits(unsigned) || !digits(fraction) {
        return Err(NumberError::Form);
    }
    let exponent_digits = exponent.strip_prefix(['-', '+']).unwrap_or(exponent);
    if exponent_digits.is_empty() || !digits(exponent_digits) {
        return Err(NumberError::Form);
    }
    let exponent: i64 = exponent.parse().map_err(|_| NumberError::Exponent)?;
    if exponent.abs() > MAX_EXPONENT {
        return Err(NumberError::Exponent);
    }
    let sign = if whole.starts_with('-') { "-" } else { "" };
    let value: BigInt = format!("{sign}{unsigned}{fraction}").parse().map_err(|_| NumberError::Form)?;
    let shift = exponent - i64::try_from(fraction.len()).map_err(|_| NumberError::TooLong)?;
    let power = BigInt::from(10).pow(u32::try_from(shift.unsigned_abs()).map_err(|_| NumberError::Exponent)?);
    Ok(if shift >= 0 { BigRational::from_integer(value * power) } else { BigRational::new(value, power) })
}

/// A rational for people: exact if it is an integer or a short decimal, else to `digits` significant digits with "about".
pub fn for_people(value: &BigRational, digits: usize) -> String {
    let text = to_decimal(value, digits);
    match decimal(&text) {
        Ok(back) if back == *value => text,
        _ => format!("about {text}"),
    }
}

/// A decimal of at most `digits` significant digits, rounded to nearest.
pub fn nearest_decimal(value: &BigRational, digits: usize) -> String {
    let shown = to_decimal(value, digits + 1);
    let Ok(cut) = decimal(&shown) else { return shown };
    let last = BigRational::new(5.into(), BigInt::from(10).pow(digits as u32 + 1));
    let nudge = &cut * (BigRational::from_integer(1.into()) + last * BigRational::from_integer(2.into()));
    to_decimal(&nudge, digits)
}

/// A decimal of at most `digits` significant digits, rounded towards zero.
pub fn to_decimal(value: &BigRational, digits: usize) -> String {
    cut(value, digits, false)
}

/// Which way a bound is rounded.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Rounding {
    /// To a value not below.
    Up,
    /// To a value not above.
    Down,
}

/// A decimal of at most `digits` significant digits on the side of the value that is named.
pub fn rounded(value: &BigRational, digits: usize, rounding: Rounding) -> String {
    cut(value, digits, value.is_negative() == (rounding == Rounding::Down))
}

/// A finite double on the side of the value that is named, next to it or nearly so; `None` beyond their range.
pub fn rounded_float(value: &BigRational, rounding: Rounding) -> Option<f64> {
    let mut near: f64 = to_decimal(value, 17).parse().ok()?;
    // The nearest double to a decimal that is cut off after 17 digits is at most a few doubles away from the value.
    for _ in 0..8 {
        let exact = BigRational::from_float(near)?;
        let is_there = match rounding {
            Rounding::Up => exact >= *value,
            Rounding::Down => exact <= *value,
        };
        if is_there {
            return Some(near);
        }
        near = match rounding {
            Rounding::Up => near.next_up(),
            Rounding::Down => near.next_down(),
        };
    }
    None
}

/// A decimal of at most `digits` significant digits, rounded towards zero, or away from it.
fn cut(value: &BigRational, digits: usize, is_away: bool) -> String {
    if value.is_zero() {
        return "0".into();
    }
    let ten = BigInt::from(10);
    let magnitude = BigRational::new(value.numer().magnitude().clone().into(), value.denom().clone());
    let estimate = (value.numer().bits() as f64 - value.denom().bits() as f64) * std::f64::consts::LOG10_2;
    let exact = |shift: i64| {
        let power = BigRational::from_integer(ten.pow(shift.unsigned_abs() as u32));
        if shift >= 0 { &magnitude * power } else { &magnitude / power }
    };
    let scaled = |shift: i64| exact(shift).floor().to_integer();
    let mut shift = digits as i64 - 1 - estimate.floor() as i64;
    while scaled(shift) >= ten.pow(digits as u32) {
        shift -= 1;
    }
    while scaled(shift) < ten.pow(digits as u32 - 1) {
        shift += 1;
    }
    let whole = if is_away { exact(shift).ceil().to_integer() } else { scaled(shift) };
    let text = whole.to_string();
    let sign = if value.numer().sign() == num_bigint::Sign::Minus { "-" } else { "" };
    let point = text.len() as i64 - shift;
    format!("{sign}{}", place_point(&text, point))
}

fn place_point(digits: &str, point: i64) -> String {
    let trimmed = digits.trim_end_matches('0');
    let length = trimmed.len() as i64;
    if !(-4..=15).contains(&point) {
        let (first, rest) = trimmed.split_at(1);
        let rest = if rest.is_empty() { String::new() } else { format!(".{rest}") };
        return format!("{first}{rest}e{}", point - 1);
    }
    if point <= 0 {
        return format!("0.{}{trimmed}", "0".repeat(point.unsigned_abs() as usize));
    }
    if length <= point {
        return format!("{trimmed}{}", "0".repeat((point - length) as usize));
    }
    let (whole, fraction) = trimmed.split_at(point as usize);
    format!("{whole}.{fraction}")
}

#[cfg(test)]
mod tests {
    use super::*;

    fn q(p: i64, d: i64) -> BigRational {
        BigRational::new(p.into(), d.into())
    }

    #[test]
    fn rounded_decimals_and_doubles_are_on_their_side_and_close() {
        for value in
            [q(1, 3), q(-1, 3), q(2, 3), q(-2, 3), q(999_999_999_999, 1_000_000_000_000), q(1, 10), q(-7, 1), q(0, 1)]
        {
            for digits in [1, 3, 9] {
                let up = decimal(&rounded(&value, digits, Rounding::Up)).expect("a decimal");
                let down = decimal(&rounded(&value, digits, Rounding::Down)).expect("a decimal");
                assert!(down <= value && value <= up, "{value}, {digits}");
                let width = value.abs() * q(10, 1) / BigRational::from_integer(BigInt::from(10).pow(digits as u32));
                assert!(&up - &down <= width, "{value}, {digits}");
            }
            let float = |r| rounded_float(&value, r).and_then(BigRational::from_float).expect("a double");
            let (up, down) = (float(Rounding::Up), float(Rounding::Down));
            assert!(down <= value && value <= up && &up - &down <= value.abs() * q(1, 1 << 49), "{value}");
        }
        assert_eq!(rounded(&q(9_999, 10_000), 3, Rounding::Up), "1");
        assert_eq!(rounded(&q(-9_999, 10_000), 3, Rounding::Up), "-0.999");
        assert_eq!(rounded_float(&decimal("1e400").expect("a number"), Rounding::Up), None);
    }
}
