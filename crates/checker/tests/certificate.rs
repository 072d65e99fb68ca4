//! Small certificates built by hand, and what is answered when one thing in them is changed.
#![allow(
    clippy::unwrap_used,
    clippy::panic,
    clippy::indexing_slicing,
    clippy::default_numeric_fallback,
    clippy::as_conversions,
    clippy::wildcard_enum_match_arm,
    reason = "a test fails by panicking"
)]

mod sample;

use keepout_checker::certificate::Certificate;
use keepout_checker::error::{Obligation, Rule};
use keepout_checker::{Limits, Rejection, check};
use sample::{DECAY, ROTATION, SQUARE, START, certificate, changed, statement};

fn answer(text: &str) -> Result<(), Rejection> {
    let certificate = certificate(text);
    check(&certificate.statement, &certificate, &Limits::default()).map(|_| ())
}

fn refuted(rule: Rule, obligation: Obligation) -> (u8, Rule, Obligation) {
    (1, rule, obligation)
}

fn inconclusive(rule: Rule, obligation: Obligation) -> (u8, Rule, Obligation) {
    (2, rule, obligation)
}

/// The refusal of a certificate in which one part is changed.
fn refusal(text: &str, from: &str, to: &str) -> (u8, Rule, Obligation) {
    match answer(&changed(text, from, to)).unwrap_err() {
        Rejection::Refuted { rule, obligation, .. } => (1, rule, obligation),
        Rejection::Inconclusive { rule, obligation, .. } => (2, rule, obligation),
        other => panic!("{other}"),
    }
}

#[test]
fn certificates_built_by_hand_are_verified() {
    for text in [DECAY, ROTATION, START, SQUARE] {
        assert_eq!(answer(text), Ok(()));
    }
}

#[test]
fn a_proof_holds_its_statement() {
    let certificate = certificate(DECAY);
    let proof = check(&certificate.statement, &certificate, &Limits::default()).unwrap();
    assert_eq!(*proof.statement(), certificate.statement);
}

#[test]
fn a_certificate_for_another_statement_is_refused() {
    let evidence = certificate(DECAY);
    for (from, to) in [
        (r#""title": "decay""#, r#""title": "decoy""#),
        (r#""start": "1""#, r#""start": "2""#),
        (r#"{"times": "-1", "of": "x"}"#, r#"{"times": "-2", "of": "x"}"#),
        (r#""is": "> 0""#, r#""is": ">= 0""#),
        (r#""margin": "0""#, r#""margin": "1/1000""#),
    ] {
        let claim = certificate(&changed(DECAY, from, to)).statement;
        assert_eq!(check(&claim, &evidence, &Limits::default()), Err(Rejection::OtherStatement), "{to}");
    }
    let other = statement(sample::FULL_STATEMENT);
    assert_eq!(check(&other, &evidence, &Limits::default()), Err(Rejection::OtherStatement));
}

#[test]
fn a_decay_touched_at_its_start_is_refused_where_one_thing_is_wrong() {
    use Obligation::{
        CellsCoverWindow, EvidenceFitsClaim, FactorsAnnihilateTrace, LeavesCoverTorus, LowerRealPartIsLess,
        RealPartsAreEqual, RootsAreSeparated, SignOnCell, SignOnLeaf, VanishesAtStart, ZoneIsRefutedOnCell,
        ZoneIsRefutedOnLeaf,
    };
    let cell = r#"{"sign": "0:-", "power": "1"}"#;
    let cases = [
        (r#""is": "> 0""#, r#""is": ">= 0""#, refuted(Rule::Cover, ZoneIsRefutedOnCell)),
        (r#""start": "1""#, r#""start": "2""#, refuted(Rule::Cover, VanishesAtStart)),
        (r#""start": "1""#, r#""start": "1000001/1000000""#, refuted(Rule::Cover, VanishesAtStart)),
        (
            r#"{"times": "-1", "of": "x"}"#,
            r#"{"times": "-2", "of": "x"}"#,
            refuted(Rule::Trace, FactorsAnnihilateTrace),
        ),
        (r#"{"times": "-1", "of": "x"}"#, r#"{"times": "1", "of": "x"}"#, refuted(Rule::Trace, FactorsAnnihilateTrace)),
        (cell, r#"{"sign": "0:+", "power": "1"}"#, refuted(Rule::Cover, SignOnCell)),
        (cell, r#"{"sign": "0:-", "power": "2"}"#, refuted(Rule::Cover, VanishesAtStart)),
        (cell, "", refuted(Rule::Cover, ZoneIsRefutedOnCell)),
        (r#"{"to": "1/2""#, r#"{"to": "1/3""#, refuted(Rule::Cover, CellsCoverWindow)),
        (r#""far": {"from": "1/2""#, r#""far": {"from": "2/3""#, refuted(Rule::Cover, CellsCoverWindow)),
        (
            r#""from": "0"
    }"#,
            r#""from": "1"
    }"#,
            refuted(Rule::Cover, EvidenceFitsClaim),
        ),
        (r#""roots": ["0"]"#, r#""roots": ["1"]"#, inconclusive(Rule::Cone, LowerRealPartIsLess)),
        (r#""roots": ["0"]"#, r#""roots": ["0", "1"]"#, refuted(Rule::Cone, RealPartsAreEqual)),
        (r#"{"function": "0", "roots": ["0"]}"#, "", refuted(Rule::Cone, SignOnLeaf)),
        (r#"[{"signs": ["0:-"]}]"#, r#"[{"signs": ["0:+"]}]"#, refuted(Rule::Cone, SignOnLeaf)),
        (r#"[{"signs": ["0:-"]}]"#, r#"[{"signs": []}]"#, refuted(Rule::Cone, ZoneIsRefutedOnLeaf)),
        (r#"[{"signs": ["0:-"]}]"#, "[]", refuted(Rule::Cone, LeavesCoverTorus)),
        (
            r#"[{"signs": ["0:-"]}]"#,
            r#"[{"signs": ["0:-"]}, {"signs": ["0:-"]}]"#,
            refuted(Rule::Cone, LeavesCoverTorus),
        ),
        (r#"{"re": "0", "im": "0"}"#, r#"{"re": "-1", "im": "0"}"#, inconclusive(Rule::Trace, RootsAreSeparated)),
        (
            r#"[[{"family": "0", "multiplicity": "1"}, {"family": "1", "multiplicity": "1"}]]"#,
            r#"[[{"family": "1", "multiplicity": "1"}]]"#,
            refuted(Rule::Trace, FactorsAnnihilateTrace),
        ),
        (
            r#"[[{"family": "0", "multiplicity": "1"}, {"family": "1", "multiplicity": "1"}]]"#,
            r#"[[{"family": "0", "multiplicity": "1"}, {"family": "0", "multiplicity": "1"}]]"#,
            refuted(Rule::Trace, FactorsAnnihilateTrace),
        ),
        (r#"{"never": {"margin": "0"}}"#, r#"{"never": {"margin": "1/1000"}}"#, refuted(Rule::Cover, VanishesAtStart)),
        (
            r#"{"never": {"margin": "0"}}"#,
            r#"{"enters": {"from": "0", "to": "1", "first": false}}"#,
            refuted(Rule::Cover, EvidenceFitsClaim),
        ),
    ];
    for (from, to, expected) in cases {
        assert_eq!(refusal(DECAY, from, to), expected, "{to}");
    }
}

#[test]
fn an_annihilator_beyond_the_order_bound_is_refused_and_a_poor_centre_is_not() {
    // z (z + 1)^2 annihilates the trace as well, but the derivatives up to the order bound 2 do not prove it.
    let found = refusal(DECAY, r#"{"family": "1", "multiplicity": "1"}"#, r#"{"family": "1", "multiplicity": "2"}"#);
    assert_eq!(found, refuted(Rule::Trace, Obligation::FactorsAnnihilateTrace));
    // A centre that is a little off costs width alone.
    assert_eq!(answer(&changed(DECAY, r#"{"re": "-1", "im": "0"}"#, r#"{"re": "-1025p-10", "im": "0"}"#)), Ok(()));
}

#[test]
fn a_rotation_is_refused_where_one_thing_is_wrong() {
    use Obligation::{
        AngleIsCombination, CellsCoverWindow, FactorsAnnihilateTrace, LeavesCoverTorus, RealPartsAreEqual,
        RootIsOnLine, SignOnCell, SignOnLeaf,
    };
    let angle = r#"{"root": "1", "turns": ["1"]}"#;
    let last = r#"{"split": "0"}, {"signs": ["0:-"]}, {"signs": ["0:-"]}
      ]"#;
    let cases = [
        (r#""title": "rotation""#, r#""title": "faster""#, None),
        (r#"{"times": "-2", "of": []}"#, r#"{"times": "-1/2", "of": []}"#, Some(refuted(Rule::Cover, SignOnCell))),
        (r#"{"times": "-2", "of": []}"#, r#"{"times": "-1", "of": []}"#, Some(inconclusive(Rule::Cover, SignOnCell))),
        (r#"{"times": "-2", "of": []}"#, r#"{"times": "-3/2", "of": []}"#, Some(inconclusive(Rule::Cone, SignOnLeaf))),
        (
            r#"{"times": "-1", "of": "x"}"#,
            r#"{"times": "-4", "of": "x"}"#,
            Some(refuted(Rule::Trace, FactorsAnnihilateTrace)),
        ),
        (angle, r#"{"root": "1", "turns": ["2"]}"#, Some(refuted(Rule::Cone, AngleIsCombination))),
        (angle, r#"{"root": "1", "turns": ["-1"]}"#, Some(refuted(Rule::Cone, AngleIsCombination))),
        (angle, r#"{"root": "0", "turns": ["0"]}"#, Some(refuted(Rule::Cone, AngleIsCombination))),
        (angle, "", Some(refuted(Rule::Cone, AngleIsCombination))),
        (r#""line": "0""#, r#""line": "1/1000""#, Some(refuted(Rule::Equality, RootIsOnLine))),
        (r#", "line": "0""#, "", Some(refuted(Rule::Cone, RealPartsAreEqual))),
        (last, r#"{"signs": ["0:-"]}]"#, Some(inconclusive(Rule::Cone, SignOnLeaf))),
        (last, r#"{"split": "0"}, {"signs": ["0:-"]}]"#, Some(refuted(Rule::Cone, LeavesCoverTorus))),
        (
            r#""far": {
        "from": "1/2""#,
            r#""far": {
        "from": "1""#,
            Some(refuted(Rule::Cover, CellsCoverWindow)),
        ),
        (r#"{"to": "1/2", "order": "8", "signs": ["0:-"]}"#, r#"{"to": "1/2", "order": "1", "signs": ["0:-"]}"#, None),
    ];
    for (from, to, expected) in cases {
        match expected {
            Some(expected) => assert_eq!(refusal(ROTATION, from, to), expected, "{to}"),
            None => assert_eq!(answer(&changed(ROTATION, from, to)), Ok(()), "{to}"),
        }
    }
}

#[test]
fn an_entry_at_the_start_is_refused_where_one_thing_is_wrong() {
    use Obligation::{EvidenceFitsClaim, InstantIsInWindow, SignOnCell, ZoneIsProvedAtInstant};
    let cases = [
        (r#""is": ">= 0""#, r#""is": "> 0""#, refuted(Rule::Entry, ZoneIsProvedAtInstant)),
        (r#""start": "1""#, r#""start": "999999/1000000""#, refuted(Rule::Entry, SignOnCell)),
        (r#""signs": ["0:0"]"#, r#""signs": ["0:+"]"#, refuted(Rule::Entry, SignOnCell)),
        (r#""signs": ["0:0"]"#, r#""signs": []"#, refuted(Rule::Entry, ZoneIsProvedAtInstant)),
        (r#"{"to": "0""#, r#"{"to": "1/1000""#, refuted(Rule::Entry, InstantIsInWindow)),
        (
            r#""before": []"#,
            r#""before": [{"to": "0", "order": "1", "signs": ["0:0"]}]"#,
            refuted(Rule::Cover, EvidenceFitsClaim),
        ),
        (
            r#"{"from": "0", "to": "0", "first": true}"#,
            r#"{"from": "1", "to": "2", "first": true}"#,
            refuted(Rule::Entry, InstantIsInWindow),
        ),
    ];
    for (from, to, expected) in cases {
        assert_eq!(refusal(START, from, to), expected, "{to}");
    }
    // The window begins later than the instant.
    let later = START.replace(
        r#""from": "0"
    }"#,
        r#""from": "1"
    }"#,
    );
    assert!(matches!(answer(&later), Err(Rejection::Refuted { obligation: InstantIsInWindow, .. })));
}

#[test]
fn a_square_of_a_pivot_is_refused_where_one_thing_is_wrong() {
    use Obligation::{CellsCoverWindow, EvidenceFitsClaim, IdentityHolds, SignOnCell, ZoneIsRefutedOnCell};
    let cases = [
        (r#""traces": ["#, r#""traces": [[], "#, refuted(Rule::Trace, EvidenceFitsClaim)),
        (r#""is": "< 0""#, r#""is": "<= 0""#, refuted(Rule::Cover, ZoneIsRefutedOnCell)),
        (r#""1^2""#, r#""1^1""#, refuted(Rule::Trace, IdentityHolds)),
        (r#""1^2""#, r#""1^3""#, refuted(Rule::Trace, IdentityHolds)),
        (r#", "2^1""#, r#", "2^1", "1^1""#, refuted(Rule::Trace, IdentityHolds)),
        (r#"["1^2", "2^1"]"#, r#"["1^2"], ["2^1"]"#, refuted(Rule::Trace, IdentityHolds)),
        (r#"["1^2", "2^1"]"#, "", refuted(Rule::Trace, IdentityHolds)),
        (r#""derivatives": ["-1", "1"]"#, r#""derivatives": ["-1", "2"]"#, refuted(Rule::Trace, IdentityHolds)),
        (r#""derivatives": ["1"]"#, r#""derivatives": ["2"]"#, refuted(Rule::Trace, IdentityHolds)),
        (r#""start": "-2""#, r#""start": "-2000001/1000000""#, refuted(Rule::Trace, IdentityHolds)),
        (r#""signs": ["2:+"]"#, r#""signs": ["2:-"]"#, refuted(Rule::Cover, SignOnCell)),
        (r#""signs": ["2:+"]"#, r#""signs": []"#, refuted(Rule::Cover, ZoneIsRefutedOnCell)),
        (r#""signs": ["2:+"]"#, r#""signs": ["1:+"]"#, inconclusive(Rule::Cover, SignOnCell)),
        (r#"{"to": "2""#, r#"{"to": "1""#, refuted(Rule::Cover, CellsCoverWindow)),
        (r#""until": "2""#, r#""until": "3""#, refuted(Rule::Cover, CellsCoverWindow)),
    ];
    for (from, to, expected) in cases {
        assert_eq!(refusal(SQUARE, from, to), expected, "{to}");
    }
}

#[test]
fn a_touch_is_an_entry_where_the_pivot_changes_its_sign() {
    let claim = |text: &str, from: &str, to: &str| {
        let text = changed(
            text,
            r#"{"never": {"margin": "0"}}"#,
            r#"{"enters": {"from": "1/2", "to": "3/2", "first": true}}"#,
        );
        let text = changed(&text, r#""is": "< 0""#, r#""is": "<= 0""#);
        let old = r#"{"never": {"cells": [{"to": "2", "order": "4", "signs": ["2:+"], "pivot": "1"}]}}"#;
        let cell = format!(r#"{{"to": "{to}", "order": "4", "signs": ["2:+"], "pivot": "1"}}"#);
        let before = r#"[{"to": "1/2", "order": "4", "signs": ["0:+"]}]"#;
        changed(&text, old, &format!(r#"{{"enters": {{"before": {before}, "from": "{from}", "cell": {cell}}}}}"#))
    };
    assert_eq!(answer(&claim(SQUARE, "1/2", "3/2")), Ok(()));
    assert_eq!(answer(&claim(SQUARE, "3/4", "5/4")), Ok(()));
    for (from, to, obligation) in [
        ("1/2", "3/4", Obligation::PivotChangesSign),
        ("5/4", "3/2", Obligation::PivotChangesSign),
        ("1/2", "7/4", Obligation::InstantIsInWindow),
        ("1/4", "3/2", Obligation::InstantIsInWindow),
        ("5/4", "3/4", Obligation::InstantIsInWindow),
    ] {
        let found = answer(&claim(SQUARE, from, to));
        assert!(
            matches!(&found, Err(Rejection::Refuted { obligation: o, .. }) if *o == obligation),
            "{from} {to} {found:?}"
        );
    }
    // The pivot is exactly 0 at the end: no enclosure gives it a sign.
    let end = answer(&claim(SQUARE, "1/2", "1"));
    assert!(end.is_err(), "{end:?}");
}

#[test]
fn verified_statements_need_no_particular_precision() {
    for bits in ["20", "32", "100", "1000"] {
        assert_eq!(answer(&changed(DECAY, r#""bits": "64""#, &format!(r#""bits": "{bits}""#))), Ok(()), "{bits}");
    }
    // Two bits do not decide; they never decide wrongly.
    let coarse =
        Certificate::from_json(&changed(DECAY, r#""bits": "64""#, r#""bits": "2""#), &Limits::default()).unwrap();
    let found = check(&coarse.statement, &coarse, &Limits::default());
    assert!(matches!(found, Ok(_) | Err(Rejection::Inconclusive { .. })), "{found:?}");
}

/// The decay with a further function: a root of this many digits and multiplicity, and an identity that it is its own 24th power.
fn with_long_numbers(digits: usize, multiplicity: usize, identity: bool) -> String {
    let root = format!("1{}", "0".repeat(digits));
    let family = r#"{"polynomial": ["1", "1"], "centres": [{"re": "-1", "im": "0"}]}"#;
    let further =
        format!(r#"{family}, {{"polynomial": ["-{root}", "1"], "centres": [{{"re": "{root}", "im": "0"}}]}}"#);
    let derivatives = vec![r#""1""#; multiplicity].join(", ");
    let factors = format!(r#"[{{"family": "2", "multiplicity": "{multiplicity}"}}]"#);
    let auxiliaries = format!(r#""auxiliaries": [{{"factors": {factors}, "derivatives": [{derivatives}]}}]"#);
    let text = changed(&changed(DECAY, family, &further), r#""auxiliaries": []"#, &auxiliaries);
    let identities = r#""identities": [{"target": "1", "summands": [["1^24"]]}]"#;
    if identity { changed(&text, r#""identities": []"#, identities) } else { text }
}

#[test]
fn long_numbers_count_as_work() {
    let is_beyond = |text: &str| matches!(answer(text), Err(Rejection::LimitExceeded { limit: "work", .. }));
    // A product of families.
    assert_eq!(answer(&with_long_numbers(1, 4, false)), Ok(()));
    assert!(is_beyond(&with_long_numbers(9_000, 600, false)));
    // The derivatives that prove an identity.
    assert!(matches!(answer(&with_long_numbers(1, 2, true)), Err(Rejection::Refuted { .. })));
    assert!(is_beyond(&with_long_numbers(9_000, 4, true)));
    // The reflection about a line that is not the mean of the roots.
    let line = format!(r#""roots": ["0"], "line": "1/1{}""#, "0".repeat(9_000));
    let on_line = refuted(Rule::Equality, Obligation::RootIsOnLine);
    assert_eq!(refusal(DECAY, r#""roots": ["0"]"#, &line), on_line);
}
