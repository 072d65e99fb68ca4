//! Typed reading of JSON values: each accessor says what the format has there.

use crate::error::Rejection;
use crate::json::Value;
use crate::limits::{Limits, within};
use crate::number::{Dyadic, Rational};
use num_bigint::BigInt;
use num_traits::Zero;
use std::str::FromStr;

/// A value, and the path of keys that leads to it.
#[derive(Clone)]
pub(crate) struct Field<'a> {
    value: &'a Value,
    path: String,
    limits: &'a Limits,
}

impl<'a> Field<'a> {
    pub(crate) fn root(value: &'a Value, limits: &'a Limits) -> Self {
        Self { value, path: String::new(), limits }
    }

    pub(crate) fn limits(&self) -> &'a Limits {
        self.limits
    }

    pub(crate) fn value(&self) -> &'a Value {
        self.value
    }

    /// The refusal of this value.
    pub(crate) fn refuse(&self, expected: &'static str) -> Rejection {
        let found = match self.value {
            Value::Bool(b) => b.to_string(),
            Value::Text(text) => format!("{:?}", text.chars().take(60).collect::<String>()),
            Value::List(items) => format!("an array of length {}", items.len()),
            Value::Object(fields) => {
                let keys: Vec<&str> = fields.iter().map(|(key, _)| key.as_str()).take(8).collect();
                format!("an object with the keys {}", keys.join(", "))
            }
        };
        let place = if self.path.is_empty() { "the top level".into() } else { self.path.clone() };
        Rejection::Malformed { place, expected, found }
    }

    /// Refuses an object with keys other than these, and anything that is not an object.
    pub(crate) fn only(&self, keys: &[&str], expected: &'static str) -> Result<(), Rejection> {
        match self.value {
            Value::Object(fields) if fields.iter().all(|(key, _)| keys.contains(&key.as_str())) => Ok(()),
            Value::Object(_) | Value::Bool(_) | Value::Text(_) | Value::List(_) => Err(self.refuse(expected)),
        }
    }

    /// The value under a key, if there.
    pub(crate) fn optional(&self, key: &'static str) -> Option<Field<'a>> {
        let Value::Object(fields) = self.value else { return None };
        let value = fields.iter().find(|(k, _)| k == key).map(|(_, v)| v)?;
        Some(Field { value, path: format!("{}.{key}", self.path), limits: self.limits })
    }

    /// The value under a key.
    pub(crate) fn get(&self, key: &'static str) -> Result<Field<'a>, Rejection> {
        self.optional(key).ok_or_else(|| Rejection::Malformed {
            place: format!("{}.{key}", self.path),
            expected: "this key",
            found: "no such key".into(),
        })
    }

    pub(crate) fn text(&self) -> Result<&'a str, Rejection> {
        match self.value {
            Value::Text(text) => Ok(text),
            Value::Bool(_) | Value::List(_) | Value::Object(_) => Err(self.refuse("a string")),
        }
    }

    pub(crate) fn flag(&self) -> Result<bool, Rejection> {
        match self.value {
            Value::Bool(value) => Ok(*value),
            Value::Text(_) | Value::List(_) | Value::Object(_) => Err(self.refuse("true or false")),
        }
    }

    pub(crate) fn list(&self) -> Result<Vec<Field<'a>>, Rejection> {
        let Value::List(items) = self.value else { return Err(self.refuse("an array")) };
        let field = |(i, value)| Field { value, path: format!("{}[{i}]", self.path), limits: self.limits };
        Ok(items.iter().enumerate().map(field).collect())
    }

    /// Reads every entry of an array.
    pub(crate) fn each<T>(&self, read: impl Fn(&Field<'a>) -> Result<T, Rejection>) -> Result<Vec<T>, Rejection> {
        self.list()?.iter().map(read).collect()
    }

    fn integer_text(&self, text: &str) -> Option<BigInt> {
        let digits = text.strip_prefix('-').unwrap_or(text);
        let plain = !digits.is_empty() && digits.bytes().all(|b| b.is_ascii_digit());
        plain.then(|| BigInt::from_str(text).ok()).flatten()
    }

    /// A rational `p` or `p/q` with q > 0, not necessarily in lowest terms.
    pub(crate) fn rational(&self) -> Result<Rational, Rejection> {
        let text = self.text()?;
        within("number_length", text.len(), self.limits.number_length)?;
        let (top, bottom) = text.split_once('/').unwrap_or((text, "1"));
        match (self.integer_text(top), self.integer_text(bottom)) {
            (Some(p), Some(q)) if !q.is_zero() && !bottom.starts_with('-') => Ok(Rational::new(p, q)),
            _ => Err(self.refuse("a rational number \"p\" or \"p/q\"")),
        }
    }

    /// A dyadic number `MpE`: M 2^E.
    pub(crate) fn dyadic(&self) -> Result<Dyadic, Rejection> {
        let text = self.text()?;
        within("number_length", text.len(), self.limits.number_length)?;
        let (mantissa, exponent) = text.split_once('p').unwrap_or((text, "0"));
        let exponent = exponent.parse::<i64>().ok().filter(|e| e.unsigned_abs() <= 1 << 24_u32);
        match (self.integer_text(mantissa), exponent) {
            (Some(m), Some(e)) => Ok(Dyadic::new(m, e)),
            _ => Err(self.refuse("a dyadic number \"MpE\" with |E| <= 2^24")),
        }
    }

    /// A small non-negative integer.
    pub(crate) fn count(&self) -> Result<u32, Rejection> {
        self.text()?.parse().map_err(|_| self.refuse("a non-negative integer"))
    }

    /// A small non-negative integer within a limit.
    pub(crate) fn count_within(&self, limit: &'static str, max: u64) -> Result<u32, Rejection> {
        let count = self.count()?;
        within(limit, usize::try_from(count).unwrap_or(usize::MAX), max)?;
        Ok(count)
    }

    /// A small integer, at most `max` either way.
    pub(crate) fn integer_within(&self, max: i32) -> Result<i32, Rejection> {
        let value = self.text()?.parse::<i32>().ok().filter(|n| (-max..=max).contains(n));
        value.ok_or_else(|| self.refuse("a small integer"))
    }

    /// A position in a list of this length.
    pub(crate) fn position(&self, length: usize) -> Result<usize, Rejection> {
        let position = self.text()?.parse::<usize>().ok().filter(|p| *p < length);
        position.ok_or_else(|| self.refuse("the position of an entry of a list above"))
    }
}

/// The text of a dyadic number that [`Field::dyadic`] reads.
pub(crate) fn dyadic_text(value: &Dyadic) -> String {
    format!("{}p{}", value.mantissa(), value.exponent())
}
