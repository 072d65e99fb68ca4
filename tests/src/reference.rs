//! The outside values in `reference/values.json`.

use keepout_checker::number::Rational;
use serde_json::Value;
use std::path::Path;

/// A group of values.
///
/// # Panics
/// If the file or the group is not there.
pub fn group(name: &str) -> Vec<Value> {
    let path = Path::new(env!("CARGO_MANIFEST_DIR")).join("reference/values.json");
    let text = std::fs::read_to_string(path).expect("the reference values");
    let values: Value = serde_json::from_str(&text).expect("JSON");
    values[name].as_array().expect("a group").clone()
}

/// The exact rational in a string.
///
/// # Panics
/// If it is none.
pub fn rational(value: &Value) -> Rational {
    value.as_str().expect("a string").parse().expect("a rational")
}

/// Lower and upper bound of an outside value.
pub fn bounds(value: &Value) -> (Rational, Rational) {
    (rational(&value[0]), rational(&value[1]))
}

/// A list of rationals given as decimals, integers or fractions.
///
/// # Panics
/// If the value is not such a list.
pub fn list(value: &Value) -> Vec<Rational> {
    value.as_array().expect("a list").iter().map(rational).collect()
}
