//! The program `keepout`.

use clap::{Parser, Subcommand};
use keepout::command::{CLEAR, WRONG, certify, peak, spectrum};
use std::process::ExitCode;

/// Shows that a linear system never enters a keep-out zone, for all time, with evidence that others can re-check.
#[derive(Debug, Parser)]
#[command(name = "keepout", version, arg_required_else_help = true)]
struct Cli {
    #[command(subcommand)]
    command: Command,
}

#[derive(Debug, Subcommand)]
enum Command {
    /// Settle the keep-out zones of a model
    ///
    /// Exit status: 0 every zone is clear (or left for good); 1 some zone is entered; 2 none is entered, but some zone is not
    /// settled, or inseparable;
    /// 3 the model or the command is wrong.
    Certify(certify::Arguments),
    /// Bound the maximum and the minimum of an expression over all time, or over a window, with evidence
    ///
    /// Exit status: 0 both are bounded from both sides; 2 some bound is missing; 3 the model or the command is wrong.
    Peak(peak::Arguments),
    /// Print the exact structure of a model's dynamics: blocks, factors, eigenvalues, growth, frequencies
    Spectrum(spectrum::Arguments),
}

fn main() -> ExitCode {
    let cli = match Cli::try_parse() {
        Ok(cli) => cli,
        Err(error) => {
            let _ = error.print();
            let asked = !error.use_stderr();
            return ExitCode::from(if asked { CLEAR } else { WRONG });
        }
    };
    // Whatever happens, the exit status is one of those that the program promises.
    let status = std::panic::catch_unwind(|| match &cli.command {
        Command::Certify(arguments) => certify::run(arguments),
        Command::Peak(arguments) => peak::run(arguments),
        Command::Spectrum(arguments) => spectrum::run(arguments),
    });
    ExitCode::from(status.unwrap_or(WRONG))
}
