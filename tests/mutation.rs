//! Damaged certificates: every number, position and sign of an accepted certificate is changed in turn.
//!
//! A change may leave a certificate valid (a shorter cell, one more bit, a sign that is not needed). It is then verified for the
//! statement that it embeds, which is unchanged: the claim was true before and still is. What may never happen is that
//! a *statement* is changed so that its claim becomes false, and is verified all the same. So two things are tested: no change makes
//! the checker panic; and each accepted certificate is refused for statements whose claim is false by an independent argument.

use keepout_checker::certificate::Certificate;
use keepout_checker::{Limits, Rejection, check};
use keepout_tests::case::{answer_to_text, files, read};

/// Each occurrence of a quoted string that looks like a number, a root, a dyadic or a sign.
fn numbers(text: &str) -> Vec<(usize, usize)> {
    let mut found = Vec::new();
    let mut start = None;
    for (i, c) in text.char_indices() {
        if c != '"' {
            continue;
        }
        match start.take() {
            None => start = Some(i + 1),
            Some(s) => {
                let inner = &text[s..i];
                if inner.starts_with(|c: char| c.is_ascii_digit() || c == '-') {
                    found.push((s, i));
                }
            }
        }
    }
    found
}

/// A few different values in place of a number.
fn variants(value: &str) -> Vec<String> {
    let mut list = vec![
        "0".to_string(),
        "1".into(),
        "-1".into(),
        "123456789/1000".into(),
        format!("-{value}"),
        format!("{value}0"),
    ];
    if let Some((position, sign)) = value.split_once(':') {
        list = ["-", "0", "+"].iter().filter(|s| **s != sign).map(|s| format!("{position}:{s}")).collect();
        list.push(format!("99:{sign}"));
    }
    list.retain(|v| v != value);
    list
}

#[test]
fn damaged_certificates_never_panic_and_keep_their_statement() {
    let mut changed = 0;
    let mut accepted = 0;
    for path in files("accept") {
        let (_, text) = read(&path);
        let statement = Certificate::from_json(&text, &Limits::default()).unwrap().statement;
        let evidence = text.find("\"bits\"").unwrap();
        let places: Vec<(usize, usize)> = numbers(&text).into_iter().filter(|(s, _)| *s > evidence).collect();
        // All places of short certificates, an even selection of long ones.
        let step = places.len().div_ceil(60);
        for (s, e) in places.into_iter().step_by(step) {
            for variant in variants(&text[s..e]) {
                let damaged = format!("{}{variant}{}", &text[..s], &text[e..]);
                changed += 1;
                let Ok(certificate) = Certificate::from_json(&damaged, &Limits::default()) else { continue };
                assert_eq!(certificate.statement, statement);
                accepted += usize::from(check(&statement, &certificate, &Limits::default()).is_ok());
            }
        }
    }
    println!("{changed} damaged certificates, {accepted} still proofs of the same true claim");
    assert!(changed > 1_000);
    assert!(accepted * 4 < changed, "most changes must be noticed: {accepted} of {changed} were not");
}

#[test]
fn certificates_are_refused_for_every_other_statement_of_the_corpus() {
    let statements: Vec<_> =
        files("accept").iter().map(|path| Certificate::from_json(&read(path).1, &Limits::default()).unwrap()).collect();
    for a in &statements {
        for b in statements.iter().filter(|b| b.statement != a.statement) {
            assert_eq!(check(&b.statement, a, &Limits::default()), Err(Rejection::OtherStatement));
        }
    }
}

#[test]
fn truncated_certificates_are_malformed() {
    for path in files("accept") {
        let (_, text) = read(&path);
        for part in 1..8 {
            let cut = text.len() * part / 8;
            let cut = (0..=cut).rev().find(|i| text.is_char_boundary(*i)).unwrap();
            assert!(answer_to_text(&text[..cut]).starts_with("malformed"));
        }
    }
}
