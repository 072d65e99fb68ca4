//! Texts: JSON, statements and certificates; each refusal, and each limit from both sides.
#![allow(
    clippy::unwrap_used,
    clippy::panic,
    clippy::indexing_slicing,
    clippy::default_numeric_fallback,
    clippy::as_conversions,
    reason = "a test fails by panicking"
)]

mod sample;

use keepout_checker::certificate::Certificate;
use keepout_checker::json::{Value, read};
use keepout_checker::statement::{Formula, Phase, Statement, Variable};
use keepout_checker::{Limits, Rejection, check};
use sample::{DECAY, FULL_STATEMENT, ROTATION, SQUARE, START, certificate, changed, rational, statement};

fn refusal(text: &str) -> String {
    match read(text, &Limits::default()) {
        Ok(value) => format!("accepted {value:?}"),
        Err(rejection) => rejection.to_string(),
    }
}

#[test]
fn json_values_are_read_as_they_stand() {
    let value = read(r#" {"a": ["x", true, {}], "b": [], "c": "\n\u0041\"\\\/é"} "#, &Limits::default()).unwrap();
    let expected = Value::Object(vec![
        ("a".into(), Value::List(vec![Value::text("x"), Value::Bool(true), Value::Object(vec![])])),
        ("b".into(), Value::List(vec![])),
        ("c".into(), Value::text("\nA\"\\/é")),
    ]);
    assert_eq!(value, expected);
    assert_eq!(read(&value.print(), &Limits::default()), Ok(value));
}

#[test]
fn json_that_is_not_of_the_formats_is_refused() {
    let cases = [
        (r#"{"a": "1", "a": "1"}"#, "each key once"),
        (r#"{"a": "1", "\u0061": "2"}"#, "each key once"),
        (r#"{"a": 1}"#, "numbers are strings"),
        (r"[null]", "numbers are strings"),
        (r#""a" "b""#, "the end of the text"),
        (r"{} ,", "the end of the text"),
        (r#"["a",]"#, "an array, a string"),
        (r#"["a""#, "',' or ']'"),
        (r#"{"a" "b"}"#, "':'"),
        (r#"{"a": "b""#, "',' or '}'"),
        (r"{a: true}", "a string"),
        (r"[tru]", "true"),
        (r#""abc"#, "the rest of a string"),
        ("\"a\nb\"", "the rest of a string"),
        (r#""\x""#, "an escape sequence"),
        (r#""\u00g0""#, "four hexadecimal digits"),
        (r#""\ud83d\ude00""#, "not a surrogate"),
        ("", "an object"),
        ("// comment\n{}", "an object"),
        ("\u{feff}{}", "an object"),
    ];
    for (text, expected) in cases {
        let found = refusal(text);
        assert!(found.contains(expected), "{text:?}: {found}");
    }
    assert_eq!(refusal("{\n\n\"a\": 1}").split(':').next(), Some("at line 3"));
}

#[test]
fn statements_survive_writing_and_reading() {
    let full = statement(FULL_STATEMENT);
    assert_eq!(statement(&full.to_json().print()), full);
    assert_eq!(full.outputs[0].value.terms[1].powers, [(Variable::State(1), 2), (Variable::Drive(0), 1)]);
    for text in [DECAY, ROTATION, START, SQUARE] {
        let certificate = certificate(text);
        assert_eq!(sample::certificate(&certificate.to_json().print()), certificate);
    }
}

#[test]
fn every_defect_of_a_statement_is_refused_with_its_place() {
    let cases = [
        ("keepout-statement/1", "keepout-statement/2", ".format"),
        (r#""title": "Inlet damper","#, "", ".title"),
        (r#""title": "Inlet damper","#, r#""title": "", "extra": "","#, "top level"),
        (r#""name": "angle""#, r#""name": "2angle""#, ".states[0].name"),
        (r#""name": "angle""#, r#""name": """#, ".states[0].name"),
        (r#""name": "angle""#, r#""name": "t""#, ".states[0].name"),
        (r#""name": "angle""#, r#""name": "exp""#, ".states[0].name"),
        (r#"{"name": "speed", "start""#, r#"{"name": "angle", "start""#, ".states[1].name"),
        (r#""name": "load""#, r#""name": "torque""#, ".outputs[0].name"),
        (r#""start": "-1/3""#, r#""start": "-0.33""#, ".states[1].start"),
        (r#""start": "-1/3""#, r#""start": "1/0""#, ".states[1].start"),
        (r#""start": "-1/3""#, r#""start": "1/-3""#, ".states[1].start"),
        (r#""start": "-1/3""#, r#""start": "+1""#, ".states[1].start"),
        (r#""start": "-1/3""#, r#""start": " 1""#, ".states[1].start"),
        (r#""start": "-1/3""#, r#""start": true"#, ".states[1].start"),
        (r#""sin": "12""#, r#""sin": "0""#, ".signal[2].sin"),
        (r#""sin": "12""#, r#""sin": "-12""#, ".signal[2].sin"),
        (r#""sin": "12""#, r#""sin": "12", "cos": "12""#, ".signal[2]"),
        (r#""power": "2", "rate""#, r#""power": "-2", "rate""#, ".signal[1].power"),
        (r#"{"times": "1", "of": "speed"}"#, r#"{"times": "0", "of": "speed"}"#, ".rates[0].terms[0]"),
        (r#"{"times": "1", "of": "speed"}"#, r#"{"times": "1", "of": "t"}"#, ".rates[0].terms[0].of"),
        (r#"{"times": "1", "of": "speed"}"#, r#"{"times": "1", "of": "load"}"#, ".rates[0].terms[0].of"),
        (r#""of": "torque"}"#, r#""of": "angle"}"#, ".rates[1].terms[1]"),
        (r#"{"of": "angle", "terms""#, r#"{"of": "speed", "terms""#, ".rates[0].of"),
        (r#"{"name": "speed", "power": "2"}"#, r#"{"name": "speed", "power": "0"}"#, ".of[0]"),
        (r#"{"name": "speed", "power": "2"}, "torque""#, r#""torque", "speed""#, ".of[1]"),
        (r#"{"name": "speed", "power": "2"}, "torque""#, r#""speed", "speed""#, ".of[1]"),
        (r#"{"name": "speed", "power": "2"}, "torque""#, r#""angle""#, ".value[1]"),
        (r#"{"name": "speed", "power": "2"}, "torque""#, r#""load""#, ".value[1].of[0]"),
        (r#""is": ">= 0""#, r#""is": "== 0""#, ".is"),
        (r#""is": ">= 0""#, r#""is": ">=0""#, ".is"),
        (
            r#"{"any": [
      {"poly"#,
            r#"{"all": [], "any": [
      {"poly"#,
            ".inside",
        ),
        (r#""from": "0", "until": "60""#, r#""from": "61", "until": "60""#, ".zone"),
        (r#""from": "0", "until": "60""#, r#""from": "-1""#, ".zone"),
        (r#"{"never": {"margin": "0"}}"#, r#"{"never": {"margin": "-1"}}"#, ".claim.never"),
        (r#"{"never": {"margin": "0"}}"#, r#"{"always": {}}"#, ".claim"),
        (r#"{"never": {"margin": "0"}}"#, r#"{"enters": {"from": "2", "to": "1", "first": true}}"#, ".claim.enters"),
        (r#"{"never": {"margin": "0"}}"#, r#"{"enters": {"from": "1", "to": "2", "first": "true"}}"#, ".first"),
    ];
    for (from, to, place) in cases {
        match Statement::from_json(&changed(FULL_STATEMENT, from, to), &Limits::default()) {
            Err(Rejection::Malformed { place: found, .. }) => assert!(found.ends_with(place), "{to}: at {found}"),
            other => panic!("{to}: {other:?}"),
        }
    }
}

#[test]
fn every_defect_of_a_certificate_is_refused_with_its_place() {
    let cases = [
        (DECAY, "keepout-certificate/1", "keepout-certificate/0", ".format"),
        (DECAY, r#""bits": "64""#, r#""bits": "1""#, ".bits"),
        (DECAY, r#"["1", "1"]"#, r#"["1", "2"]"#, ".families[1].polynomial"),
        (DECAY, r#"["1", "1"]"#, r#"["1"]"#, ".families[1].polynomial"),
        (DECAY, r#"{"re": "-1", "im": "0"}"#, "", ".families[1].centres"),
        (DECAY, r#"{"re": "-1", "im": "0"}"#, r#"{"re": "-1", "im": "1"}"#, ".families[1].centres"),
        (DECAY, r#"{"re": "-1", "im": "0"}"#, r#"{"re": "-1", "im": "-1"}"#, ".families[1].centres[0]"),
        (DECAY, r#"{"re": "-1", "im": "0"}"#, r#"{"re": "-1p16777217", "im": "0"}"#, ".centres[0].re"),
        (DECAY, r#"{"re": "-1", "im": "0"}"#, r#"{"re": "1p-9223372036854775808", "im": "0"}"#, ".centres[0].re"),
        (DECAY, r#"{"re": "-1", "im": "0"}"#, r#"{"re": "1.5", "im": "0"}"#, ".centres[0].re"),
        (DECAY, r#"{"family": "1", "multiplicity": "1"}"#, r#"{"family": "2", "multiplicity": "1"}"#, ".family"),
        (DECAY, r#"{"family": "1", "multiplicity": "1"}"#, r#"{"family": "1", "multiplicity": "0"}"#, ".multiplicity"),
        (DECAY, r#""order": "8""#, r#""order": "0""#, ".order"),
        (DECAY, r#""sign": "0:-""#, r#""sign": "1:-""#, ".sign"),
        (DECAY, r#""sign": "0:-""#, r#""sign": "0:x""#, ".sign"),
        (DECAY, r#""signs": [], "start""#, r#""signs": [], "pivot": "0", "start""#, ".cells[0]"),
        (DECAY, r#""function": "0""#, r#""function": "1""#, ".leads[0].function"),
        (DECAY, r#""roots": ["0"]"#, r#""roots": ["2"]"#, ".leads[0].roots[0]"),
        (DECAY, r#"{"function": "0", "roots": ["0"]}"#, "true", ".leads[0]"),
        (DECAY, r#""nodes": [{"signs": ["0:-"]}]"#, r#""nodes": [{"split": "0"}]"#, ".split"),
        (DECAY, r#""nodes": [{"signs": ["0:-"]}]"#, r#""nodes": [["0:-"]]"#, ".nodes[0]"),
        (DECAY, r#""nodes": [{"signs": ["0:-"]}]"#, r#""nodes": [{"signs": [], "pivot": "1"}]"#, ".pivot"),
        (SQUARE, r#""1^2""#, r#""1^0""#, ".summands[0][0]"),
        (SQUARE, r#""1^2""#, r#""3^2""#, ".summands[0][0]"),
        (SQUARE, r#""1^2""#, r#""1:2""#, ".summands[0][0]"),
        (SQUARE, r#""target": "0""#, r#""target": "3""#, ".target"),
        (SQUARE, r#""pivot": "1""#, r#""pivot": "3""#, ".pivot"),
        (START, r#""evidence": {"enters""#, r#""evidence": {"leaves""#, ".evidence"),
    ];
    for (text, from, to, place) in cases {
        match Certificate::from_json(&changed(text, from, to), &Limits::default()) {
            Err(Rejection::Malformed { place: found, .. }) => assert!(found.ends_with(place), "{to}: at {found}"),
            other => panic!("{to}: {other:?}"),
        }
    }
}

#[test]
fn values_built_in_memory_obey_the_same_rules() {
    let spoil = |change: &dyn Fn(&mut Certificate)| {
        let mut certificate = certificate(DECAY);
        change(&mut certificate);
        check(&certificate.statement, &certificate, &Limits::default()).unwrap_err().exit_status()
    };
    assert_eq!(spoil(&|c| c.statement.phases.push(c.statement.phases[0].clone())), 3);
    assert_eq!(spoil(&|c| c.statement.phases.clear()), 3);
    assert_eq!(spoil(&|c| c.statement.phases[0] = Phase { rates: vec![], uncertain: vec![] }), 3);
    assert_eq!(spoil(&|c| c.statement.phases[0].rates[0].terms.push((rational("1"), Variable::Time))), 3);
    assert_eq!(spoil(&|c| c.statement.states[0].name = "x y".into()), 3);
    assert_eq!(spoil(&|c| c.statement.zone.from = rational("-1")), 3);
    assert_eq!(spoil(&|c| c.families[0].centres.clear()), 3);
    assert_eq!(spoil(&|c| c.bits = 0), 3);
    assert_eq!(spoil(&|c| c.bits = u32::MAX), 2);
    assert_eq!(spoil(&|c| c.statement.zone.inside = Formula::And(vec![Formula::Or(vec![]); 10_001])), 2);
}

/// The limits with one of them changed.
fn limited(change: impl FnOnce(&mut Limits)) -> Limits {
    let mut limits = Limits::default();
    change(&mut limits);
    limits
}

/// The answer to a certificate for its own statement: `None` verified, else the name of the limit.
fn limit(text: &str, limits: &Limits) -> Option<&'static str> {
    let result = Certificate::from_json(text, limits).and_then(|c| check(&c.statement.clone(), &c, limits));
    match result {
        Ok(_) => None,
        Err(Rejection::LimitExceeded { limit, max, found }) => {
            assert!(found > max);
            Some(limit)
        }
        Err(other) => panic!("{other}"),
    }
}

#[test]
fn each_limit_passes_its_value_and_refuses_one_more() {
    type Set = fn(&mut Limits, u64);
    // The name, how to set it, a certificate, and the least value that suffices for it.
    let cases: [(&str, Set, &str, u64); 13] = [
        ("text_bytes", |l, v| l.text_bytes = v, DECAY, DECAY.len() as u64),
        ("nesting", |l, v| l.nesting = v, DECAY, 8),
        ("number_length", |l, v| l.number_length = v, DECAY, 4),
        ("statement_entries", |l, v| l.statement_entries = v, DECAY, 9),
        ("degree", |l, v| l.degree = v, SQUARE, 2),
        ("derivatives", |l, v| l.derivatives = v, ROTATION, 3),
        ("roots", |l, v| l.roots = v, ROTATION, 3),
        ("bits", |l, v| l.bits = v, DECAY, 64),
        ("order", |l, v| l.order = v, DECAY, 8),
        ("cells", |l, v| l.cells = v, ROTATION, 1),
        ("depth", |l, v| l.depth = v, ROTATION, 2),
        ("nodes", |l, v| l.nodes = v, ROTATION, 7),
        ("dimension", |l, v| l.dimension = v, ROTATION, 1),
    ];
    for (name, set, text, least) in cases {
        assert_eq!(limit(text, &limited(|l| set(l, least))), None, "{name} = {least}");
        assert_eq!(limit(text, &limited(|l| set(l, least - 1))), Some(name), "{name} = {}", least - 1);
    }
    assert_eq!(limit(ROTATION, &limited(|l| l.multiplier_bits = 1)), None);
    assert_eq!(limit(ROTATION, &limited(|l| l.multiplier_bits = 0)), Some("multiplier_bits"));
}

#[test]
fn work_is_limited() {
    let mut bounds = (1_u64, 1_u64 << 40);
    while bounds.1 - bounds.0 > 1 {
        let middle = u64::midpoint(bounds.0, bounds.1);
        if limit(ROTATION, &limited(|l| l.work = middle)).is_none() { bounds.1 = middle } else { bounds.0 = middle }
    }
    assert_eq!(limit(ROTATION, &limited(|l| l.work = bounds.0)), Some("work"));
    assert_eq!(limit(ROTATION, &limited(|l| l.work = bounds.1)), None);
    assert!(bounds.1 > 100, "{} steps", bounds.1);
}

#[test]
fn default_limits_are_pinned() {
    let l = Limits::default();
    let found = [
        l.text_bytes,
        l.nesting,
        l.number_length,
        l.statement_entries,
        l.degree,
        l.derivatives,
        l.roots,
        l.bits,
        l.order,
        l.cells,
        l.depth,
        l.nodes,
        l.dimension,
        l.multiplier_bits,
        l.work,
    ];
    let expected =
        [33_554_432, 64, 10_000, 10_000, 24, 4_000, 3_000, 20_000, 400, 200_000, 200, 400_000, 8, 16, 5_000_000_000];
    assert_eq!(found, expected, "docs/certificate-format.md lists these");
}
