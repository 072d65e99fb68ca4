//! The program `keepout-check`: reads a statement and a certificate, says in words what is claimed and whether the certificate
//! proves it.
//!
//! Results go to standard output, messages to standard error. Exit status: 0 verified, 1 refuted, 2 inconclusive or beyond a
//! limit, 3 malformed, unreadable, for another statement, or wrong usage. Only the library decides; here is no mathematics.

use keepout_checker::certificate::Certificate;
use keepout_checker::json::Value;
use keepout_checker::statement::Statement;
use keepout_checker::{Limits, Rejection, Verified, check};
use std::ffi::OsString;
use std::fmt;
use std::fs::File;
use std::io::{self, ErrorKind, Read, Write};
use std::path::Path;
use std::process::ExitCode;

const PROGRAM: &str = concat!("keepout-check ", env!("CARGO_PKG_VERSION"));

const USAGE: &str = "\
Re-verifies a certificate for a statement, and says in words what has been proved.

usage: keepout-check STATEMENT CERTIFICATE [--json]

  STATEMENT     the statement, a JSON file (keepout-statement/1)
  CERTIFICATE   the certificate, a JSON file (keepout-certificate/1)
  --json        print one JSON object instead of text
  --help        print this text
  --version     print name and version

exit status: 0 verified; 1 refuted: an obligation of this certificate is exactly false, which says nothing about the plant;
2 inconclusive at the certificate's precision, or a limit exceeded; 3 malformed, unreadable, wrong usage, or the
certificate is for another statement
";

/// What the command line asks for.
enum Task {
    Help,
    Version,
    Check { statement: OsString, certificate: OsString, json: bool },
}

/// Why there is no proof.
enum Failure {
    /// The file cannot be read.
    Unreadable { path: String, cause: io::Error },
    /// The text of the file is refused.
    Refused { path: String, rejection: Rejection },
    /// The certificate does not prove the statement.
    Rejected(Rejection),
}

/// All that is known when the program ends.
struct Report {
    statement: Option<Statement>,
    bits: Option<u32>,
    result: Result<Verified, Failure>,
}

fn main() -> ExitCode {
    match task(std::env::args_os().skip(1)) {
        Some(Task::Help) => finish(0, USAGE),
        Some(Task::Version) => finish(0, &format!("{PROGRAM}\n")),
        Some(Task::Check { statement, certificate, json }) => {
            let report = verify(Path::new(&statement), Path::new(&certificate), &Limits::default());
            let text = if json { report.to_json().print() } else { report.to_words() };
            finish(report.exit_status(), &text)
        }
        None => {
            complain(USAGE);
            ExitCode::from(3)
        }
    }
}

fn task(arguments: impl Iterator<Item = OsString>) -> Option<Task> {
    let (mut paths, mut json, mut options) = (Vec::new(), false, true);
    for argument in arguments {
        match argument.to_str() {
            Some("--help" | "-h") if options => return Some(Task::Help),
            Some("--version" | "-V") if options => return Some(Task::Version),
            Some("--json") if options => json = true,
            Some("--") if options => options = false,
            Some(text) if options && text.starts_with('-') => return None,
            Some(_) | None => paths.push(argument),
        }
    }
    let mut paths = paths.into_iter();
    match (paths.next(), paths.next(), paths.next()) {
        (Some(statement), Some(certificate), None) => Some(Task::Check { statement, certificate, json }),
        _ => None,
    }
}

/// Reads both files and checks the certificate. The statement is read from its own file; the certificate's copy must equal it.
fn verify(statement: &Path, certificate: &Path, limits: &Limits) -> Report {
    let claimed = match read(statement, limits, Statement::from_json) {
        Ok(claimed) => claimed,
        Err(failure) => return Report { statement: None, bits: None, result: Err(failure) },
    };
    let (bits, result) = match read(certificate, limits, Certificate::from_json) {
        Ok(evidence) => (Some(evidence.bits), check(&claimed, &evidence, limits).map_err(Failure::Rejected)),
        Err(failure) => (None, Err(failure)),
    };
    Report { statement: Some(claimed), bits, result }
}

/// Reads a file that is no longer than the limit.
fn read<T>(path: &Path, limits: &Limits, parse: fn(&str, &Limits) -> Result<T, Rejection>) -> Result<T, Failure> {
    // Quoted, control characters escaped.
    let name = format!("{path:?}");
    let unreadable = |cause| Failure::Unreadable { path: name.clone(), cause };
    let refused = |rejection| Failure::Refused { path: name.clone(), rejection };
    let max = limits.text_bytes;
    let too_long = |found| refused(Rejection::LimitExceeded { limit: "text_bytes", max, found });
    let file = File::open(path).map_err(unreadable)?;
    let length = file.metadata().map_err(unreadable)?.len();
    if length > max {
        return Err(too_long(length));
    }
    // The length of a pipe is not known, and a file may grow: at most one byte beyond the limit is read.
    let mut bytes = Vec::new();
    file.take(max.saturating_add(1)).read_to_end(&mut bytes).map_err(unreadable)?;
    let length = u64::try_from(bytes.len()).unwrap_or(u64::MAX);
    if length > max {
        return Err(too_long(length));
    }
    let text = String::from_utf8(bytes).map_err(|e| unreadable(io::Error::new(ErrorKind::InvalidData, e)))?;
    parse(&text, limits).map_err(refused)
}

/// What is printed for a proof, and for nothing else.
fn verified_line(proof: &Verified) -> String {
    format!("VERIFIED by {PROGRAM}: the claim above about the zone {:?} is proved.\n", proof.statement().zone.name)
}

impl Failure {
    fn rejection(&self) -> Option<&Rejection> {
        match self {
            Self::Unreadable { .. } => None,
            Self::Refused { rejection, .. } | Self::Rejected(rejection) => Some(rejection),
        }
    }

    fn exit_status(&self) -> u8 {
        self.rejection().map_or(3, Rejection::exit_status)
    }

    /// The rule, the obligation and the position that the certificate failed at.
    fn duty_fields(&self) -> Vec<(&'static str, Value)> {
        let Some(
            Rejection::Refuted { rule, obligation, position } | Rejection::Inconclusive { rule, obligation, position },
        ) = self.rejection()
        else {
            return Vec::new();
        };
        vec![
            ("rule", Value::text(rule)),
            ("obligation", Value::Text(format!("{obligation:?}"))),
            ("position", Value::text(position)),
        ]
    }

    /// The verdict in one word or a few.
    fn verdict(&self) -> &'static str {
        match (self.exit_status(), self.rejection()) {
            (1, _) => "refuted",
            (2, _) => "inconclusive",
            (_, Some(Rejection::OtherStatement)) => "for another statement",
            (_, Some(_)) => "malformed",
            (_, None) => "unreadable",
        }
    }
}

impl fmt::Display for Failure {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self {
            Self::Unreadable { path, cause } => write!(f, "cannot read {path}: {cause}"),
            Self::Refused { path, rejection } => write!(f, "{path}: {rejection}"),
            Self::Rejected(rejection) => write!(f, "{rejection}"),
        }
    }
}

/// What an exit status means, in one sentence.
fn meaning(status: u8) -> &'static str {
    match status {
        0 => "the statement is proved",
        1 => "an obligation of this certificate is exactly false; this says nothing about the plant",
        2 => "this certificate is not decided at its precision, or within the limits of the checker",
        _ => "a file cannot be read or is not in its format, or the certificate is for another statement",
    }
}

impl Report {
    fn exit_status(&self) -> u8 {
        self.result.as_ref().map_or_else(Failure::exit_status, |_| 0)
    }

    fn to_words(&self) -> String {
        let words = self.statement.as_ref().map_or(String::new(), |s| s.words() + "\n");
        let bits = self.bits.map_or(String::new(), |b| format!("Evidence: a certificate of {b} bits.\n"));
        let verdict = match &self.result {
            Ok(proof) => verified_line(proof),
            Err(failure) => {
                let verdict = failure.verdict().to_uppercase();
                format!(
                    "{verdict}, says {PROGRAM}: {failure}.\nNothing is proved: {}.\n",
                    meaning(failure.exit_status())
                )
            }
        };
        format!("{words}{bits}{verdict}")
    }

    fn to_json(&self) -> Value {
        let status = self.exit_status();
        let mut fields = vec![
            ("checker", Value::text(PROGRAM)),
            ("verdict", Value::text(self.result.as_ref().map_or_else(Failure::verdict, |_| "verified"))),
            ("exit_status", Value::text(status)),
            ("meaning", Value::text(meaning(status))),
        ];
        if let Err(failure) = &self.result {
            fields.push(("reason", Value::text(failure)));
            fields.extend(failure.duty_fields());
        }
        fields.extend(self.bits.map(|bits| ("bits", Value::text(bits))));
        fields.extend(self.statement.as_ref().map(|s| ("words", Value::Text(s.words()))));
        Value::Object(fields.into_iter().map(|(key, value)| (key.to_string(), value)).collect())
    }
}

/// Prints a result. A reader that has gone away is no error: the exit status still tells.
fn finish(status: u8, text: &str) -> ExitCode {
    let mut out = io::stdout().lock();
    match out.write_all(text.as_bytes()).and_then(|()| out.flush()) {
        Ok(()) => ExitCode::from(status),
        Err(cause) if cause.kind() == ErrorKind::BrokenPipe => ExitCode::from(status),
        Err(cause) => {
            complain(&format!("standard output: {cause}\n"));
            ExitCode::from(3)
        }
    }
}

/// Prints a message. Where standard error is closed there is nobody to tell.
fn complain(text: &str) {
    let _ = io::stderr().lock().write_all(text.as_bytes());
}
