//! Derivatives at 0 of states, drives and polynomials along the trajectory, against hand-computed ones.
#![allow(
    clippy::unwrap_used,
    clippy::panic,
    clippy::indexing_slicing,
    clippy::default_numeric_fallback,
    clippy::as_conversions,
    reason = "a test fails by panicking"
)]

mod sample;

use keepout_checker::limits::Budget;
use keepout_checker::number::Rational;
use keepout_checker::polynomial::Polynomial;
use keepout_checker::sequence::{Flow, Sequence};
use keepout_checker::statement::{Expression, Statement, Term, Variable};
use keepout_checker::{Limits, Rejection};
use sample::{FULL_STATEMENT, ROTATION, Source, certificate, changed, rational, statement};

fn monomial(coefficient: &str, powers: &[(Variable, u32)]) -> Term {
    Term { coefficient: rational(coefficient), powers: powers.to_vec() }
}

fn derivatives(statement: &Statement, terms: Vec<Term>, count: usize) -> Vec<Rational> {
    let limits = Limits::default();
    let (order, sequence) =
        Flow::new(statement, &limits).trace(&Expression { terms }, &mut Budget::new(&limits)).unwrap();
    assert_eq!(sequence.count(), 2 * order);
    sequence.derivatives(count)
}

fn integers(values: &[i64]) -> Vec<Rational> {
    values.iter().map(|v| Rational::from_integer((*v).into())).collect()
}

/// The derivatives at 0 of the product of functions, each given by its Taylor coefficients.
fn product_of_series(factors: &[Vec<Rational>]) -> Vec<Rational> {
    let length = factors[0].len();
    let mut product = vec![rational("0"); length];
    product[0] = rational("1");
    for factor in factors {
        product = (0..length).map(|k| (0..=k).map(|i| &product[i] * &factor[k - i]).sum()).collect();
    }
    let mut factorial = rational("1");
    for (k, c) in product.iter_mut().enumerate() {
        if k > 0 {
            factorial *= Rational::from_integer(k.into());
        }
        *c *= &factorial;
    }
    product
}

/// Taylor coefficients of exp(r t), cos(w t), sin(w t), t^k.
fn series(kind: &str, x: &str, length: usize) -> Vec<Rational> {
    let mut term = rational("1");
    let mut coefficients = Vec::new();
    for k in 0..length {
        let sign = match (kind, k % 4) {
            ("exp", _) | ("cos", 0) | ("sin", 1) => 1,
            ("cos", 2) | ("sin", 3) => -1,
            _ => 0,
        };
        coefficients.push(&term * Rational::from_integer(sign.into()));
        term = term * rational(x) / Rational::from_integer((k + 1).into());
    }
    if kind == "t" {
        return (0..length).map(|k| rational(if k.to_string() == x { "1" } else { "0" })).collect();
    }
    coefficients
}

#[test]
fn derivatives_of_a_rotation_are_those_of_cosine_and_sine() {
    let rotation = certificate(ROTATION).statement;
    let (x, y) = (Variable::State(0), Variable::State(1));
    assert_eq!(derivatives(&rotation, vec![monomial("1", &[(x, 1)])], 6), integers(&[1, 0, -1, 0, 1, 0]));
    assert_eq!(derivatives(&rotation, vec![monomial("1", &[(y, 1)])], 6), integers(&[0, -1, 0, 1, 0, -1]));
    // cos t (- sin t) = - sin(2 t) / 2
    assert_eq!(derivatives(&rotation, vec![monomial("1", &[(x, 1), (y, 1)])], 6), integers(&[0, -1, 0, 4, 0, -16]));
    let circle = vec![monomial("1", &[(x, 2)]), monomial("1", &[(y, 2)]), monomial("-1", &[])];
    assert_eq!(derivatives(&rotation, circle, 6), integers(&[0; 6]));
    // t cos t
    assert_eq!(
        derivatives(&rotation, vec![monomial("1", &[(x, 1), (Variable::Time, 1)])], 6),
        integers(&[0, 1, 0, -3, 0, 5])
    );
}

#[test]
fn derivatives_of_a_drive_are_those_of_its_formula() {
    let full = statement(FULL_STATEMENT);
    let count = 8;
    let found = derivatives(&full, vec![monomial("1", &[(Variable::Drive(0), 1)])], count);
    let part = |factors: &[(&str, &str)]| {
        product_of_series(&factors.iter().map(|(kind, x)| series(kind, x, count)).collect::<Vec<_>>())
    };
    let (a, b, c) = (
        part(&[("t", "2"), ("exp", "-2")]),
        part(&[("sin", "12")]),
        part(&[("t", "1"), ("exp", "-1/2"), ("cos", "1")]),
    );
    for k in 0..count {
        let constant = rational(if k == 0 { "1/2" } else { "0" });
        let expected = constant - &a[k] + &b[k] * rational("1/50") + &c[k] * rational("3");
        assert_eq!(found[k], expected, "derivative {k}");
    }
}

#[test]
fn derivatives_of_states_follow_the_equations() {
    let full = statement(FULL_STATEMENT);
    let of = |variable| derivatives(&full, vec![monomial("1", &[(variable, 1)])], 8);
    let (angle, speed, torque) = (of(Variable::State(0)), of(Variable::State(1)), of(Variable::Drive(0)));
    assert_eq!((&angle[0], &speed[0]), (&rational("0"), &rational("-1/3")));
    for k in 0..7 {
        assert_eq!(angle[k + 1], speed[k]);
        let offset = rational(if k == 0 { "-7" } else { "0" });
        assert_eq!(speed[k + 1], offset - &angle[k] * rational("75/2") + &torque[k] * rational("25"));
    }
    // load = 3/2 angle - speed^2 torque: its value and its first derivative.
    let load = of(Variable::Output(0));
    assert_eq!(load[0], rational("3/2") * &angle[0] - &speed[0] * &speed[0] * &torque[0]);
    let product = rational("2") * &speed[0] * &speed[1] * &torque[0] + &speed[0] * &speed[0] * &torque[1];
    assert_eq!(load[1], rational("3/2") * &angle[1] - product);
}

#[test]
fn products_obey_the_leibniz_rule() {
    let mut source = Source(9);
    for _ in 0..50 {
        let [f, g] = [(); 2].map(|()| (0..7).map(|_| source.rational()).collect::<Vec<_>>());
        let product = Sequence::from_rationals(&f).mul(&Sequence::from_rationals(&g)).derivatives(7);
        for (k, found) in product.iter().enumerate() {
            let mut binomial = rational("1");
            let mut expected = rational("0");
            for j in 0..=k {
                expected += &binomial * &f[j] * &g[k - j];
                binomial = binomial * Rational::from_integer((k - j).into()) / Rational::from_integer((j + 1).into());
            }
            assert_eq!(*found, expected);
        }
    }
}

#[test]
fn an_annihilator_is_proved_by_all_its_equations_and_by_no_fewer() {
    let rotation = certificate(ROTATION).statement;
    let limits = Limits::default();
    let x = Expression { terms: vec![monomial("1", &[(Variable::State(0), 1)])] };
    // 1, x, y: order bound 3.
    let (order, sequence) = Flow::new(&rotation, &limits).trace(&x, &mut Budget::new(&limits)).unwrap();
    assert_eq!(order, 3);
    let polynomial = |text: &str| Polynomial::new(text.split_whitespace().map(rational).collect());
    assert!(sequence.is_annihilated(&polynomial("1 0 1"), order));
    assert!(!sequence.is_annihilated(&polynomial("1 0 2"), order));
    assert!(!sequence.is_annihilated(&polynomial("1 1"), order));
    // z^4 + z^2 is an annihilator too, but of a degree that the known derivatives do not prove.
    assert!(!sequence.is_annihilated(&polynomial("0 0 1 0 1"), order));
    // 0, 0, 0, 0, 0, 1: five zeros do not make it zero.
    let late = Sequence::from_rationals(&integers(&[0, 0, 0, 0, 0, 1]));
    assert!(late.is_annihilated(&Polynomial::one(), 5));
    assert!(!late.is_annihilated(&Polynomial::one(), 6));
    assert!(!late.is_annihilated(&Polynomial::one(), 7));
}

#[test]
fn order_bounds_count_states_and_exponents_once() {
    let full = statement(FULL_STATEMENT);
    let limits = Limits::default();
    let order = |terms| {
        Flow::new(&full, &limits).trace(&Expression { terms }, &mut Budget::new(&limits)).map(|(order, _)| order)
    };
    // Exponents of the torque: 0 (1), -2 (t^2: 3), +-12 i (2), -1/2 +- i (t: 4); with two states 12.
    assert_eq!(order(vec![monomial("1", &[(Variable::Drive(0), 1)])]), Ok(10));
    assert_eq!(order(vec![monomial("1", &[(Variable::State(0), 1)])]), Ok(12));
    assert_eq!(order(vec![monomial("1", &[(Variable::State(0), 2)])]), Ok(78));
    assert_eq!(order(vec![monomial("1", &[(Variable::Time, 2)])]), Ok(3));
    assert_eq!(order(vec![]), Ok(1));
    let beyond = order(vec![monomial("1", &[(Variable::State(0), 5)])]);
    assert!(matches!(beyond, Err(Rejection::LimitExceeded { limit: "derivatives", .. })), "{beyond:?}");
}

#[test]
fn names_that_are_not_declared_have_no_trace() {
    let full = statement(FULL_STATEMENT);
    let limits = Limits::default();
    for variable in [Variable::State(2), Variable::Drive(1), Variable::Output(1)] {
        let trace = Flow::new(&full, &limits)
            .trace(&Expression { terms: vec![monomial("1", &[(variable, 1)])] }, &mut Budget::new(&limits));
        assert!(matches!(trace, Err(Rejection::Malformed { .. })), "{variable:?}");
    }
    // An offset counts once, at the first derivative.
    let ramp = statement(&changed(FULL_STATEMENT, r#""offset": "0""#, r#""offset": "5""#));
    let angle = derivatives(&ramp, vec![monomial("1", &[(Variable::State(0), 1)])], 2);
    assert_eq!(angle[1], rational("14/3"));
}
