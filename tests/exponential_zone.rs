//! Zones with exp of states, against mpmath (reference/exponential_zone.py), from a model's text to the checker.

use keepout::model::{Model, Need, load_text};
use keepout::number::decimal;
use keepout_checker::number::Rational;
use keepout_checker::statement::Claim;
use keepout_synthesis::{Options, Outcome, certify};
use keepout_tests::reference::group;
use std::path::Path;

fn exact(text: &str) -> Rational {
    decimal(text).expect("a decimal")
}

/// x and T of the reference, and one zone.
fn model(inside: &str, window: &str) -> Model {
    let text = format!(
        r#"
        [state.x]
        start = 0
        rate = "v"
        [state.v]
        start = 0
        rate = "25 - 25*x - 6*v"
        [state.T]
        start = 2
        rate = "-T/2"
        [[zone]]
        name = "zone"
        inside = "{inside}"
        {window}
        "#
    );
    load_text(&text, "model.toml", "exponentials", Path::new("."), Need::Zones).expect("a model")
}

fn outcome(inside: &str, window: &str) -> Outcome {
    certify(&model(inside, window).statement(0), &Options::default()).expect("an outcome")
}

#[test]
fn first_entries_are_those_of_the_reference() {
    let cases = group("exponential_zones");
    assert_eq!(cases.len(), 4);
    for case in &cases {
        let (inside, first) = (case["inside"].as_str().unwrap(), exact(case["first"].as_str().unwrap()));
        let Outcome::Enters { proof } = outcome(inside, "") else { panic!("{inside}: not entered") };
        let Claim::Enters { from, to, first: true } = &proof.statement().claim else {
            panic!("{inside}: not the first")
        };
        // The reference is cut off at 25 digits.
        let slack = exact("1e-20");
        assert!(*from <= &first + &slack && first <= to + &slack, "{inside}: {from} {first} {to}");
        let just_before = &first * (Rational::from_integer(1.into()) - exact("1e-9"));
        let window = format!("until = \"{just_before}\"");
        assert!(matches!(outcome(inside, &window), Outcome::Clear { .. }), "{inside}: entered before");
    }
}

#[test]
fn greatest_values_are_told_apart_from_both_sides() {
    let mut compared = 0;
    for case in group("exponential_zones").iter().filter(|c| !c["greatest"].is_null()) {
        let (inside, greatest) = (case["inside"].as_str().unwrap(), exact(case["greatest"].as_str().unwrap()));
        let raised = |by: Rational| format!("{inside} + \"{by}\"").replace('"', "");
        let close = exact("1e-7");
        let above = outcome(&raised(&greatest + &close), "");
        assert!(matches!(above, Outcome::Clear { .. }), "{inside}: {above:?}");
        let below = outcome(&raised(&greatest - &close), "");
        assert!(matches!(below, Outcome::Enters { .. }), "{inside}: {below:?}");
        compared += 1;
    }
    assert_eq!(compared, 2);
}

#[test]
fn the_far_field_is_settled_where_the_argument_tends_to_a_limit_or_to_infinity() {
    // x -> 1, T -> 0; x T -> 0; -t -> -infinity.
    for (inside, verdict) in [
        ("exp(x) >= 3", "clear"),
        ("exp(x + T) + x <= 3.75", "enters"),
        ("exp(x + T) + x <= 3.5 and x > 1.2", "clear"),
        ("x*exp(1 - t) > 1.6", "clear"),
        ("exp(t - 10*T) < -0.1*x - 0.01", "clear"),
        ("exp(t) <= T", "enters"),
    ] {
        let found = match outcome(inside, "") {
            Outcome::Clear { .. } => "clear",
            Outcome::Enters { .. } => "enters",
            _ => "unsettled",
        };
        assert_eq!(found, verdict, "{inside}");
    }
}

#[test]
fn time_alone_is_a_known_input() {
    let model = model("x > 3*exp(-t/5) + 1.1", "");
    assert_eq!((model.drives.len(), model.exponentials.len()), (1, 0));
    assert_eq!(model.drives[0].name, "exp_1");
}
