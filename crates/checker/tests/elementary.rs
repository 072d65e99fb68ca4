//! exp, cos and sin against outside values, and against each other.
#![allow(
    clippy::unwrap_used,
    clippy::panic,
    clippy::indexing_slicing,
    clippy::default_numeric_fallback,
    clippy::as_conversions,
    reason = "a test fails by panicking"
)]

mod sample;

use keepout_checker::Limits;
use keepout_checker::json::{Value, read};
use keepout_checker::number::{Complex, Interval, Rational};
use sample::{Source, exact, rational};
use std::path::Path;

fn real(x: &Rational, bits: u32) -> Complex {
    Complex::real(Interval::rational(x, bits))
}

fn imaginary(x: &Rational, bits: u32) -> Complex {
    Complex { re: Interval::integer(0), im: Interval::rational(x, bits) }
}

/// The value of a function lies between these.
type Bounds = (Rational, Rational);

/// The group `functions` of the reference values: a function, an argument, and bounds of the value.
fn reference() -> Vec<(String, Rational, Bounds)> {
    let path = Path::new(env!("CARGO_MANIFEST_DIR")).join("../../tests/reference/values.json");
    let text = std::fs::read_to_string(path).unwrap();
    let start = text.find("\"functions\": ").unwrap() + "\"functions\": ".len();
    let mut depth = 0;
    let end = text[start..].find(|c| {
        depth += i32::from(c == '[') - i32::from(c == ']');
        depth == 0
    });
    let Value::List(cases) = read(&text[start..=start + end.unwrap()], &Limits::default()).unwrap() else { panic!() };
    let number = |value: &Value| {
        let Value::Text(text) = value else { panic!("not a number: {value:?}") };
        rational(text)
    };
    let mut found = Vec::new();
    for case in &cases {
        let Value::Object(fields) = case else { panic!() };
        let x = &fields.iter().find(|(key, _)| key == "x").unwrap().1;
        // Where exp x is too large or small to be written out, the file has no bounds of it.
        for (key, value) in fields.iter().filter(|(key, _)| ["exp", "cos", "sin"].contains(&key.as_str())) {
            let Value::List(ends) = value else { panic!() };
            found.push((key.clone(), number(x), (number(&ends[0]), number(&ends[1]))));
        }
    }
    found
}

fn value(function: &str, x: &Rational, bits: u32) -> Interval {
    match function {
        "exp" => real(x, bits).exp(bits).unwrap().re,
        "cos" => imaginary(x, bits).exp(bits).unwrap().re,
        "sin" => imaginary(x, bits).exp(bits).unwrap().im,
        _ => panic!("{function}"),
    }
}

#[test]
fn enclosures_meet_the_reference_values_at_2_to_300_bits() {
    let cases = reference();
    assert!(cases.len() >= 60);
    for (function, x, (low, high)) in &cases {
        for bits in (2..=16).chain([24, 53, 64, 100, 128, 200, 300]) {
            let value = value(function, x, bits);
            // The truth lies between the bounds and in the enclosure, so the two have a number in common.
            let meets = exact(value.lo()) <= *high && *low <= exact(value.hi());
            assert!(meets, "{function} {x} at {bits} bits: {value:?}");
        }
    }
}

fn width(function: &str, x: &Rational, bits: u32) -> Rational {
    let value = value(function, x, bits);
    exact(value.hi()) - exact(value.lo())
}

fn unit(bits: u32) -> Rational {
    Rational::new(1.into(), num_bigint::BigInt::from(1) << bits)
}

#[test]
fn enclosures_at_dyadic_arguments_are_a_few_units_wide() {
    for (function, x, (_, high)) in &reference() {
        let is_dyadic = x.denom().trailing_zeros() == Some(x.denom().bits() - 1);
        for bits in [53, 100, 200, 300] {
            let size = if function == "exp" { high.clone() } else { rational("1") };
            let narrow = width(function, x, bits) <= size * unit(bits) * rational("4");
            assert!(narrow || !is_dyadic, "{function} {x} at {bits} bits");
        }
    }
}

#[test]
fn enclosures_get_narrower_as_the_bits_grow() {
    for (function, x, _) in &reference() {
        let (coarse, fine) = (width(function, x, 100), width(function, x, 200));
        assert!(fine <= coarse * unit(90), "{function} {x}");
    }
}

#[test]
fn functional_equations_hold() {
    let mut source = Source(5);
    for _ in 0..100 {
        let (a, b) = (source.rational(), source.rational());
        for bits in (2..=12).chain([64, 200]) {
            let number = |x: &Rational, y: &Rational| Complex {
                re: Interval::rational(x, bits),
                im: Interval::rational(y, bits),
            };
            let exp = |x: &Rational, y: &Rational| number(x, y).exp(bits).unwrap();
            let product = exp(&a, &b).mul(&exp(&b, &a), bits);
            let sum = exp(&(&a + &b), &(&a + &b));
            assert!(!product.re.is_disjoint(&sum.re) && !product.im.is_disjoint(&sum.im), "{a} {b} at {bits}");
            let size = exp(&rational("0"), &b).abs_squared(bits);
            assert!(!size.is_disjoint(&Interval::integer(1)), "cos^2 + sin^2 at {b}, {bits} bits");
            let inverse = exp(&a, &rational("0")).mul(&exp(&-&a, &rational("0")), bits);
            assert!(!inverse.re.is_disjoint(&Interval::integer(1)), "exp {a} exp {}", -&a);
        }
    }
}

#[test]
fn arguments_up_to_two_to_the_forty_are_answered() {
    let below = rational("1099511627775");
    let beyond = rational("1099511627776");
    assert!(real(&below, 64).exp(64).is_some());
    assert!(real(&beyond, 64).exp(64).is_none());
    assert!(imaginary(&-&below, 64).exp(64).is_some());
    assert!(imaginary(&-beyond, 64).exp(64).is_none());
    // exp(-2^40 + 1) is positive and tiny.
    let tiny = real(&-below, 64).exp(64).unwrap().re;
    assert!(*tiny.hi() < keepout_checker::number::Dyadic::power_of_two(-1_000_000_000_000));
    assert!(tiny.lo().sign() == std::cmp::Ordering::Greater);
}
