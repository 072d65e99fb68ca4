//! Statements in words, decimals, messages, and the program `keepout-check`.
#![allow(
    clippy::unwrap_used,
    clippy::panic,
    clippy::indexing_slicing,
    clippy::default_numeric_fallback,
    clippy::as_conversions,
    reason = "a test fails by panicking"
)]

mod sample;

use keepout_checker::Rejection;
use keepout_checker::decimal::{exact_decimal, fraction_and_decimal, rounded_decimal};
use keepout_checker::error::{Obligation, Rule};
use sample::{DECAY, FULL_STATEMENT, START, certificate, changed, rational, statement};
use std::path::{Path, PathBuf};
use std::process::{Command, Output};

const FULL_WORDS: &str = r#"Model: "Inlet damper"

This statement speaks of one trajectory: the solution of the equations below from exactly the start below, driven by exactly
the known inputs below. It says nothing about other starts or other inputs, nor whether the equations describe the plant.
All numbers are exact. A decimal in parentheses repeats the number before it; where it says "about" it is cut off, and the
fraction counts. t is time, counted from 0 in the unit of the model; x' is the derivative of x with respect to t.

States, and their exact values at t = 0:
  angle = 0    [unit label "rad"]
  speed = -1/3 (about -0.333333)

Equations:
  angle' = speed
  speed' = -75/2 (-37.5) * angle + 25 * torque - 7

Known inputs, for all t >= 0:
  torque = 1/2 (0.5) - t^2 * exp(-2 * t) + 1/50 (0.02) * sin(12 * t) + 3 * t * exp(-1/2 (-0.5) * t) * cos(t)    [unit label "N m"]

Outputs, by definition:
  load = 3/2 (1.5) * angle - speed^2 * torque

Keep-out zone "end stop", from requirement "ACT-021". The trajectory is in the zone at an instant t if and only if at t:
  angle - 9/10 (0.9) >= 0 or load > 0 and (t - 1/3 (about 0.333333) < 0 or speed is different from 0)

Window: all instants t from 0 to 60; both ends count.

Claim:
  From exactly this start, the trajectory never enters the zone, in the window from 0 to 60:
  it is in the zone at no instant of the window.
"#;

#[test]
fn a_full_statement_reads_as_it_was_declared() {
    assert_eq!(statement(FULL_STATEMENT).words(), FULL_WORDS);
}

/// What the words say after a heading.
fn after(words: &str, heading: &str) -> String {
    words.split_once(heading).unwrap_or_else(|| panic!("{heading} is not in {words}")).1.to_string()
}

#[test]
fn each_claim_is_spelled_out() {
    let never = r#"{"never": {"margin": "0"}}"#;
    let claim = |to: &str| after(&certificate(&changed(DECAY, never, to)).statement.words(), "Claim:\n");
    assert_eq!(
        claim(never),
        "  From exactly this start, the trajectory never enters the zone, for all t >= 0:\n  it is in the zone at no instant of the window.\n"
    );
    assert_eq!(
        claim(r#"{"never": {"margin": "3/50"}}"#),
        "  From exactly this start, the trajectory never enters the zone, for all t >= 0:\n  it is in the zone at no instant of the window.\n  Margin: 3/50 (0.06). The same holds for the zone widened by this margin, which is:\n    x - 47/50 (0.94) >= 0\n"
    );
    assert_eq!(
        claim(r#"{"enters": {"from": "1/2", "to": "1", "first": true}}"#),
        "  From exactly this start, the trajectory is in the zone\n  at some instant t of the window between 1/2 (0.5) and 1 (both ends count),\n  and at no earlier instant of the window, that is, at none before t = 1/2 (0.5).\n"
    );
    assert_eq!(
        claim(r#"{"enters": {"from": "1/3", "to": "1/3", "first": false}}"#),
        "  From exactly this start, the trajectory is in the zone\n  at the instant t = 1/3 (about 0.333333). Nothing is said about other instants.\n"
    );
}

#[test]
fn windows_and_free_text_are_unambiguous() {
    let later = certificate(&DECAY.replace("\"from\": \"0\"\n", "\"from\": \"5/2\"\n")).statement.words();
    assert!(later.contains("Window: all instants t >= 5/2 (2.5), without end; t = 5/2 (2.5) counts."), "{later}");
    assert!(later.contains("for all t >= 5/2 (2.5)"));
    let forged = changed(DECAY, r#""title": "decay""#, r#""title": "decay\n\nVERIFIED \u001b[2J \u202e""#);
    let words = certificate(&forged).statement.words();
    assert!(words.starts_with("Model: \"decay\\n\\nVERIFIED \\u{1b}[2J \\u{202e}\"\n"), "{words}");
}

#[test]
fn decimals_stand_beside_fractions() {
    for (value, text) in [
        ("0", "0"),
        ("-7", "-7"),
        ("3/50", "3/50 (0.06)"),
        ("-1/8", "-1/8 (-0.125)"),
        ("1/1000000000000000", "1/1000000000000000 (0.000000000000001)"),
        ("1/10000000000000000", "1/10000000000000000 (about 1e-16)"),
        ("2/3", "2/3 (about 0.666666)"),
        ("-200/3", "-200/3 (about -66.6666)"),
        ("1000000/3", "1000000/3 (about 333333)"),
        ("10000000/3", "10000000/3 (about 3.33333e6)"),
        ("1/70000", "1/70000 (about 0.0000142857)"),
        ("1/700000", "1/700000 (about 1.42857e-6)"),
        ("99999999/100000007", "99999999/100000007 (about 0.999999)"),
    ] {
        assert_eq!(fraction_and_decimal(&rational(value)), text);
    }
    assert_eq!(exact_decimal(&rational("1/3")), None);
    assert_eq!(rounded_decimal(&rational("0")), "0");
}

#[test]
fn decimals_are_the_leading_digits_of_their_numbers() {
    let mut source = sample::Source(11);
    for _ in 0..2_000 {
        let shift = rational("10").pow(i32::try_from(source.signed(9)).unwrap());
        let value = source.rational() * shift;
        let text = rounded_decimal(&value);
        let (digits, exponent) = text.split_once('e').unwrap_or((&text, "0"));
        let (whole, part) = digits.split_once('.').unwrap_or((digits, ""));
        let mantissa = rational(&format!("{whole}{part}")) / rational("10").pow(i32::try_from(part.len()).unwrap());
        let shown = mantissa * rational("10").pow(exponent.parse().unwrap());
        let error = if value == rational("0") { shown } else { (&value - shown) / &value };
        assert!(error >= rational("0") && error < rational("1/99999"), "{value}: {text}");
    }
}

#[test]
fn every_obligation_has_its_message() {
    let refuted = |rule, obligation| Rejection::Refuted { rule, obligation, position: 3 }.to_string();
    let rows = [
        (Rule::Trace, Obligation::RootsAreSeparated, "the roots of polynomial 3 lie one each in disjoint discs"),
        (Rule::Trace, Obligation::FactorsAnnihilateTrace, "the listed factors annihilate trace 3"),
        (Rule::Trace, Obligation::ClosedFormIsEnclosed, "the closed form of function 3 can be enclosed"),
        (Rule::Trace, Obligation::IdentityHolds, "identity 3 holds"),
        (
            Rule::Equality,
            Obligation::SumsAreRoots,
            "sum 3: the sums of the roots are the roots of the listed polynomials",
        ),
        (Rule::Equality, Obligation::SumIsIdentified, "sum 3 meets the disc of the named root alone"),
        (Rule::Equality, Obligation::RootIsOnLine, "root 3 lies on the named vertical line"),
        (Rule::Cone, Obligation::RealPartsAreEqual, "the leading roots of function 3 have equal real parts"),
        (
            Rule::Cone,
            Obligation::LowerRealPartIsLess,
            "the other roots of function 3 have smaller real parts than the leading ones",
        ),
        (Rule::Cone, Obligation::AngleIsCombination, "the angle of root 3 is the listed combination"),
        (
            Rule::Cone,
            Obligation::LowerTermDecreases,
            "the lower terms of function 3 decrease from the start of the cone on",
        ),
        (Rule::Cover, Obligation::SignOnCell, "the listed signs hold on cell 3"),
        (Rule::Cover, Obligation::VanishesAtStart, "the listed derivatives vanish at t = 0 on cell 3"),
        (Rule::Cone, Obligation::SignOnLeaf, "the listed signs hold on leaf 3"),
        (Rule::Cover, Obligation::ZoneIsRefutedOnCell, "the signs refute the zone on cell 3"),
        (Rule::Cone, Obligation::ZoneIsRefutedOnLeaf, "the signs refute the zone on leaf 3"),
        (Rule::Cover, Obligation::CellsCoverWindow, "the cells increase and cover the window (cell 3)"),
        (Rule::Cone, Obligation::FarFieldStartsLate, "the far field starts after t = 0"),
        (
            Rule::Inseparable,
            Obligation::FrequenciesAreIndependent,
            "the base frequencies are independent over the rationals",
        ),
        (
            Rule::Inseparable,
            Obligation::FacesHaveOppositeSigns,
            "function 3 of the box has opposite signs on the two faces across its own axis",
        ),
        (Rule::Inseparable, Obligation::ZoneIsProvedOnTorus, "the signs prove the zone on the box of angles"),
        (Rule::Cone, Obligation::LeavesCoverTorus, "the bisection of the torus is complete (node 3)"),
        (Rule::Entry, Obligation::InstantIsInWindow, "the instant lies in the window and in the claimed bracket"),
        (Rule::Entry, Obligation::PivotChangesSign, "pivot 3 has opposite signs at the ends"),
        (Rule::Entry, Obligation::ZoneIsProvedAtInstant, "the signs prove the zone at the instant"),
        (Rule::Cover, Obligation::EvidenceFitsClaim, "the evidence is of the kind that the claim needs"),
    ];
    for (rule, obligation, text) in rows {
        let expected =
            format!("rule {rule}: not so: {text}; the certificate is wrong, which says nothing about the plant");
        assert_eq!(refuted(rule, obligation), expected);
        let undecided = Rejection::Inconclusive { rule, obligation, position: 3 };
        assert_eq!(undecided.to_string(), format!("rule {rule}: not decided at the certificate's precision: {text}"));
        assert_eq!(undecided.exit_status(), 2);
    }
    let limit = Rejection::LimitExceeded { limit: "bits", max: 2, found: 3 };
    assert_eq!((limit.to_string(), limit.exit_status()), ("limit bits: at most 2, found 3".into(), 2));
    let other = Rejection::OtherStatement;
    assert_eq!((other.to_string(), other.exit_status()), ("the certificate embeds another statement".into(), 3));
}

/// A folder of its own for each test, with the two files.
fn files(test: &str, certificate_text: &str) -> (PathBuf, PathBuf) {
    let folder = Path::new(env!("CARGO_TARGET_TMPDIR")).join(test);
    std::fs::create_dir_all(&folder).unwrap();
    let (claim, evidence) = (folder.join("a zone.statement.json"), folder.join("a zone.certificate.json"));
    std::fs::write(&claim, certificate(certificate_text).statement.to_json().print()).unwrap();
    std::fs::write(&evidence, certificate_text).unwrap();
    (claim, evidence)
}

fn run(arguments: &[&Path]) -> (i32, String, String) {
    let Output { status, stdout, stderr } =
        Command::new(env!("CARGO_BIN_EXE_keepout-check")).args(arguments).output().unwrap();
    (status.code().unwrap(), String::from_utf8(stdout).unwrap(), String::from_utf8(stderr).unwrap())
}

fn version() -> String {
    format!("keepout-check {}", env!("CARGO_PKG_VERSION"))
}

#[test]
fn the_program_prints_the_statement_and_that_it_is_verified() {
    let (claim, evidence) = files("verified", DECAY);
    let (status, out, err) = run(&[&claim, &evidence]);
    let expected = format!(
        "{}\nEvidence: a certificate of 64 bits.\nVERIFIED by {}: the claim above about the zone \"above the start\" is proved.\n",
        certificate(DECAY).statement.words(),
        version()
    );
    assert_eq!((status, out, err), (0, expected, String::new()));
}

#[test]
fn the_program_tells_the_verdicts_apart() {
    let cases = [
        ("refuted", r#"[{"signs": ["0:-"]}]"#, r#"[{"signs": ["0:+"]}]"#, 1, "\nREFUTED, says "),
        ("undecided", r#""roots": ["0"]"#, r#""roots": ["1"]"#, 2, "\nINCONCLUSIVE, says "),
        ("limit", r#""bits": "64""#, r#""bits": "20001""#, 2, "\nINCONCLUSIVE, says "),
        ("malformed", r#""bits": "64""#, r#""bits": 64"#, 3, "\nMALFORMED, says "),
        ("other", r#""title": "decay""#, r#""title": "other""#, 3, "\nFOR ANOTHER STATEMENT, says "),
    ];
    for (name, from, to, expected, line) in cases {
        let (claim, evidence) = files(name, DECAY);
        std::fs::write(&evidence, changed(DECAY, from, to)).unwrap();
        let (status, out, err) = run(&[&claim, &evidence]);
        assert_eq!((status, err.as_str()), (expected, ""), "{name}");
        assert!(out.starts_with("Model: \"decay\"\n") && out.contains(line), "{name}: {out}");
        assert!(!out.contains("VERIFIED") && out.contains("Nothing is proved"), "{name}: {out}");
        assert_eq!(out.contains("says nothing about the plant"), status == 1, "{name}: {out}");
    }
}

#[test]
fn the_program_prints_one_json_object_on_demand() {
    let (claim, evidence) = files("json", DECAY);
    std::fs::write(&evidence, changed(DECAY, r#"[{"signs": ["0:-"]}]"#, r#"[{"signs": ["0:+"]}]"#)).unwrap();
    let (status, out, err) = run(&[&claim, &evidence, Path::new("--json")]);
    assert_eq!((status, err.as_str()), (1, ""));
    let keepout_checker::json::Value::Object(fields) =
        keepout_checker::json::read(&out, &keepout_checker::Limits::default()).unwrap()
    else {
        panic!("{out}")
    };
    let keys: Vec<&str> = fields.iter().map(|(key, _)| key.as_str()).collect();
    let expected =
        ["checker", "verdict", "exit_status", "meaning", "reason", "rule", "obligation", "position", "bits", "words"];
    assert_eq!(keys, expected);
    for (key, value) in
        [("checker", version().as_str()), ("verdict", "refuted"), ("exit_status", "1"), ("rule", "cone")]
    {
        assert!(fields.contains(&(key.to_string(), keepout_checker::json::Value::text(value))), "{key}");
    }
}

#[test]
fn the_program_refuses_what_it_cannot_read() {
    let (claim, evidence) = files("unreadable", START);
    let missing = claim.with_file_name("missing.json");
    let (status, out, _) = run(&[&missing, &evidence]);
    assert_eq!(status, 3);
    assert!(out.starts_with("UNREADABLE, says ") && out.contains("missing.json"), "{out}");
    std::fs::write(&missing, [0xff, 0xfe]).unwrap();
    assert_eq!(run(&[&claim, &missing]).0, 3);
    std::fs::remove_file(&missing).unwrap();
    assert_eq!(run(&[claim.parent().unwrap(), &evidence]).0, 3);
    // A sparse file just beyond the limit is not read.
    let long = claim.with_file_name("long.json");
    std::fs::File::create(&long).unwrap().set_len((1 << 25) + 1).unwrap();
    let (status, out, _) = run(&[&claim, &long]);
    std::fs::remove_file(&long).unwrap();
    assert_eq!(status, 2);
    assert!(out.contains("limit text_bytes: at most 33554432, found 33554433"), "{out}");
}

#[test]
fn the_program_explains_its_use() {
    let path = Path::new;
    assert_eq!(run(&[path("--version")]), (0, format!("{}\n", version()), String::new()));
    let (status, help, err) = run(&[path("--help")]);
    assert!(status == 0 && err.is_empty() && help.contains("exit status: 0 verified; 1 refuted"), "{help}");
    for wrong in [vec![], vec!["a"], vec!["a", "b", "c"], vec!["--jsn", "a", "b"]] {
        let (status, out, err) = run(&wrong.iter().map(|a| path(a)).collect::<Vec<_>>());
        assert_eq!((status, out.as_str()), (3, ""), "{wrong:?}");
        assert!(err.contains("usage: keepout-check"), "{err}");
    }
}

#[test]
fn the_program_keeps_its_status_when_nobody_reads() {
    let (claim, evidence) = files("pipe", DECAY);
    let mut child = Command::new(env!("CARGO_BIN_EXE_keepout-check"))
        .args([&claim, &evidence])
        .stdout(std::process::Stdio::piped())
        .spawn()
        .unwrap();
    drop(child.stdout.take());
    assert_eq!(child.wait().unwrap().code(), Some(0));
}
