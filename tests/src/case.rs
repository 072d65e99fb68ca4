//! Cases of the corpus: a file whose first line says what the checker must answer, then the certificate.

use keepout_checker::certificate::Certificate;
use keepout_checker::error::{Obligation, Rejection, Rule};
use keepout_checker::{Limits, check};
use std::fs;
use std::path::{Path, PathBuf};

/// The answer of the checker in one line: `verified`, or the kind of refusal with rule and obligation.
pub fn answer(certificate: &Certificate) -> String {
    match check(&certificate.statement, certificate, &Limits::default()) {
        Ok(_) => "verified".into(),
        Err(rejection) => refusal(&rejection),
    }
}

/// The answer to the text of a certificate.
pub fn answer_to_text(text: &str) -> String {
    match Certificate::from_json(text, &Limits::default()) {
        Ok(certificate) => answer(&certificate),
        Err(rejection) => refusal(&rejection),
    }
}

/// A refusal in one line.
pub fn refusal(rejection: &Rejection) -> String {
    let line = |word: &str, rule: &Rule, obligation: &Obligation| format!("{word} {rule} {obligation:?}");
    match rejection {
        Rejection::Refuted { rule, obligation, .. } => line("refuted", rule, obligation),
        Rejection::Inconclusive { rule, obligation, .. } => line("inconclusive", rule, obligation),
        Rejection::LimitExceeded { limit, .. } => format!("limit {limit}"),
        Rejection::Malformed { expected, .. } => format!("malformed {expected}"),
        Rejection::OtherStatement => "other statement".into(),
        other => format!("{other:?}"),
    }
}

/// The folder of the corpus.
pub fn corpus() -> PathBuf {
    Path::new(env!("CARGO_MANIFEST_DIR")).join("corpus")
}

/// All case files below a folder of the corpus, in order of their paths.
///
/// # Panics
/// If the folder cannot be read.
pub fn files(folder: &str) -> Vec<PathBuf> {
    let mut files = Vec::new();
    let mut open = vec![corpus().join(folder)];
    while let Some(path) = open.pop() {
        for entry in fs::read_dir(&path).expect("a readable folder") {
            let path = entry.expect("a readable entry").path();
            if path.is_dir() { open.push(path) } else { files.push(path) }
        }
    }
    files.sort();
    files
}

/// The expected answer and the certificate's text in a case file.
///
/// # Panics
/// If the file cannot be read or has no first line.
pub fn read(path: &Path) -> (String, String) {
    let text = fs::read_to_string(path).expect("a readable file");
    let (first, rest) = text.split_once('\n').expect("a first line");
    (first.to_string(), rest.to_string())
}
