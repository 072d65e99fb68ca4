//! The program `keepout-check`: re-verifies a certificate, and says in words what has been proved.

use keepout_checker::certificate::Certificate;
use keepout_checker::json::Value;
use keepout_checker::statement::Statement;
use keepout_checker::{Limits, Rejection, Verified, check};
use std::io::Write;
use std::process::ExitCode;

const USAGE: &str = "\
Re-verifies a certificate for a statement, and says in words what has been proved.

usage: keepout-check STATEMENT CERTIFICATE [--json]

  STATEMENT     the statement, a JSON file
  CERTIFICATE   the certificate, a JSON file
  --json        print one JSON object instead of text
  --help        print this text
  --version     print name and version

exit status: 0 verified; 1 refuted: an obligation of this certificate is exactly false, which says nothing about the plant;
2 inconclusive at the certificate's precision, or a limit exceeded; 3 malformed, unreadable, wrong usage, or the
certificate is for another statement
";

fn main() -> ExitCode {
    let arguments: Vec<String> = std::env::args_os().skip(1).map(|a| a.to_string_lossy().into_owned()).collect();
    let is_flag = |a: &&String| a.starts_with("--");
    let flags: Vec<&str> = arguments.iter().filter(is_flag).map(String::as_str).collect();
    let files: Vec<&str> = arguments.iter().filter(|a| !is_flag(a)).map(String::as_str).collect();
    match (flags.as_slice(), files.as_slice()) {
        (["--help"], _) => finish(0, USAGE),
        (["--version"], _) => finish(0, &format!("{}\n", version())),
        ([], [statement, certificate]) => report(&verify(statement, certificate), false),
        (["--json"], [statement, certificate]) => report(&verify(statement, certificate), true),
        _ => {
            complain(USAGE);
            ExitCode::from(3)
        }
    }
}

fn version() -> String {
    format!("keepout-check {}", env!("CARGO_PKG_VERSION"))
}

/// Why there is no verdict, or no proof.
enum Failure {
    Unreadable(String),
    Rejected(Rejection),
}

/// Reads both files and checks the certificate. The statement is read from its own file; the certificate's copy must equal it.
fn verify(statement: &str, certificate: &str) -> Result<(Verified, u32), Failure> {
    let limits = Limits::default();
    let named = |file: &str, rejection: Rejection| match rejection {
        Rejection::Malformed { place, expected, found } => {
            Failure::Rejected(Rejection::Malformed { place: format!("{file}: {place}"), expected, found })
        }
        other => Failure::Rejected(other),
    };
    let claimed = Statement::from_json(&read(statement, &limits)?, &limits).map_err(|r| named(statement, r))?;
    let evidence = Certificate::from_json(&read(certificate, &limits)?, &limits).map_err(|r| named(certificate, r))?;
    let verified = check(&claimed, &evidence, &limits).map_err(Failure::Rejected)?;
    Ok((verified, evidence.bits))
}

fn read(path: &str, limits: &Limits) -> Result<String, Failure> {
    let failed = |e: std::io::Error| Failure::Unreadable(format!("cannot read {path}: {e}"));
    let length = std::fs::metadata(path).map_err(failed)?.len();
    if length > limits.text_bytes {
        let limit = Rejection::LimitExceeded { limit: "text_bytes", max: limits.text_bytes, found: length };
        return Err(Failure::Rejected(limit));
    }
    let bytes = std::fs::read(path).map_err(failed)?;
    String::from_utf8(bytes).map_err(|_| Failure::Unreadable(format!("{path} is not UTF-8 text")))
}

fn report(result: &Result<(Verified, u32), Failure>, json: bool) -> ExitCode {
    let (status, verdict, reason) = match result {
        Ok(_) => (0, "verified", String::new()),
        Err(Failure::Unreadable(message)) => (3, "malformed", message.clone()),
        Err(Failure::Rejected(rejection)) => {
            let verdict = match rejection.exit_status() {
                1 => "refuted",
                2 => "inconclusive",
                _ => "malformed",
            };
            (rejection.exit_status(), verdict, rejection.to_string())
        }
    };
    if json {
        return finish(status, &json_report(result, verdict, &reason));
    }
    match result {
        Ok((verified, bits)) => finish(status, &verified_text(verified, *bits)),
        Err(_) => finish(status, &format!("{}: {reason}\n", verdict.to_uppercase())),
    }
}

/// What is printed for a proof, and for nothing else.
fn verified_text(verified: &Verified, bits: u32) -> String {
    format!("{}\nVERIFIED by {} at {bits} bits\n", verified.statement().words(), version())
}

fn json_report(result: &Result<(Verified, u32), Failure>, verdict: &str, reason: &str) -> String {
    let mut fields =
        vec![("checker".to_string(), Value::text(version())), ("verdict".to_string(), Value::text(verdict))];
    match result {
        Ok((verified, bits)) => {
            fields.push(("bits".to_string(), Value::text(bits)));
            fields.push(("words".to_string(), Value::text(verified.statement().words())));
        }
        Err(_) => fields.push(("reason".to_string(), Value::text(reason))),
    }
    Value::Object(fields).print()
}

/// Prints a result. A reader that has gone away is no error: the exit status still tells.
fn finish(status: u8, text: &str) -> ExitCode {
    let mut out = std::io::stdout().lock();
    let _ = out.write_all(text.as_bytes()).and_then(|()| out.flush());
    ExitCode::from(status)
}

fn complain(text: &str) {
    let _ = std::io::stderr().lock().write_all(text.as_bytes());
}
