//! The command: arguments in, one file a subcommand, results out. The only part that prints, reads the clock or touches files.

mod args;
mod check;
mod compare;
mod curves;
mod duty;
mod files;
mod manual;
mod report;
mod shift;
mod solve;
mod tolerance;

use std::process::ExitCode;

use clap::Parser;

use args::{Arguments, Command};

/// Why a command ended without its result.
pub(crate) enum Failure {
    /// Bad input or a run that broke: said on standard error already, or to be said.
    Broken(String),
    /// A need is unmet and that was to count.
    Unmet,
    /// The reader of our output went away: nothing is wrong.
    PipeClosed,
}

/// Exit code for an unmet need.
const UNMET: u8 = 1;
/// Exit code for bad input or a run that broke.
const BROKEN: u8 = 2;

/// Runs the command with the arguments of the process.
pub fn run() -> ExitCode {
    let arguments = Arguments::parse();
    let outcome = match &arguments.command {
        Command::Check(options) => check::check(options),
        Command::Solve(options) => solve::solve(options),
        Command::Duty(options) => duty::duty(options),
        Command::Shift(options) => shift::shift(options),
        Command::Compare(options) => compare::compare(options),
        Command::Completions(options) => manual::completions(options),
        Command::Man => manual::man(),
        Command::Report(options) => report::report(options),
        Command::Tolerance(options) => tolerance::tolerance(options),
        Command::Curves(options) => curves::curves(options),
    };
    match outcome {
        Ok(()) | Err(Failure::PipeClosed) => ExitCode::SUCCESS,
        Err(Failure::Unmet) => ExitCode::from(UNMET),
        Err(Failure::Broken(message)) => {
            files::complain(&message);
            ExitCode::from(BROKEN)
        }
    }
}
