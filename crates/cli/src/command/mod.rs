//! The commands of the program `keepout`.
//!
//! Results go to standard output, progress and messages to standard error.

pub mod certify;
mod invariant;
pub mod peak;
mod progress;
pub mod spectrum;
mod worst_case;

use crate::model::{Model, Need, load};
use std::io::Write;
use std::path::Path;

/// Exit status when all zones are clear.
pub const CLEAR: u8 = 0;
/// Exit status when some zone is entered.
pub const ENTERED: u8 = 1;
/// Exit status when no zone is entered, but some zone is not settled.
pub const UNSETTLED: u8 = 2;
/// Exit status when the model or the command is wrong.
pub const WRONG: u8 = 3;

/// Writes to standard output; returns the status, or [`WRONG`] if the result is lost. A reader that has gone away is no
/// error: nobody is left to tell.
pub(crate) fn print(text: &str, status: u8) -> u8 {
    let mut out = std::io::stdout().lock();
    match out.write_all(text.as_bytes()).and_then(|()| out.flush()) {
        Err(e) if e.kind() != std::io::ErrorKind::BrokenPipe => {
            complain(&format!("the result cannot be written: {e}\n"));
            WRONG
        }
        Ok(()) | Err(_) => status,
    }
}

/// Writes a message to standard error.
pub(crate) fn complain(text: &str) {
    let _ = std::io::stderr().lock().write_all(text.as_bytes());
}

/// Loads a model; what is wrong with it goes to standard error.
pub(crate) fn loaded(path: &Path, need: Need) -> Option<Model> {
    load(path, need).map_err(|diagnostics| complain(&diagnostics.to_string())).ok()
}
