//! Takes arguments; one file for each command, and no statistics.

mod console;
mod draft;
mod fit;
mod interrupt;
mod progress;
mod replay;
mod schema;
mod study;
mod vet;

use crate::error::Error;
use clap::{Parser, Subcommand};
use std::ffi::OsString;
use std::process::ExitCode;

/// Incident rates for programme evaluation, from one spec file: what was found, how sure one can
/// be, and the same bytes every time.
///
/// Exit codes: 0 done; 1 failed inside, or no place to write; 2 the input is wrong, and nothing was
/// written; 3 done, but a replay differs; 130 interrupted.
#[derive(Debug, Parser)]
#[command(name = "ratewright", version, max_term_width = 80)]
pub struct Cli {
    /// What to do.
    #[command(subcommand)]
    pub command: Command,
}

/// The commands.
#[derive(Debug, Subcommand)]
pub enum Command {
    /// Fit the study of a spec: the main job.
    Fit(fit::FitArgs),
    /// Check spec and data, and show what the priors imply; no outcome is looked at.
    Vet(vet::VetArgs),
    /// Look at a table and write a starter spec for it.
    Draft(draft::DraftArgs),
    /// Run a finished run again, from itself alone, and tell the first difference, if any.
    Replay(replay::ReplayArgs),
    /// Print a JSON Schema.
    Schema(schema::SchemaArgs),
}

/// How a command ended that did its work.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Outcome {
    /// Nothing to add.
    Done,
    /// A replay gave something else than the run.
    Differs,
}

/// Runs the program on its arguments (the program's own name first).
pub fn run(arguments: impl IntoIterator<Item = OsString>) -> ExitCode {
    let cli = match Cli::try_parse_from(arguments) {
        Ok(cli) => cli,
        Err(told) => {
            // Help and version go to standard output, mistakes to standard error; a closed pipe
            // is nobody's fault.
            let _ = told.print();
            return ExitCode::from(u8::try_from(told.exit_code()).unwrap_or(2));
        }
    };
    match dispatch(&cli.command) {
        Ok(Outcome::Done) => ExitCode::SUCCESS,
        Ok(Outcome::Differs) => ExitCode::from(3),
        Err(error) => {
            console::tell_error(&error);
            ExitCode::from(error.exit_code())
        }
    }
}

fn dispatch(command: &Command) -> Result<Outcome, Error> {
    interrupt::let_large_writes_fail()?;
    match command {
        Command::Fit(arguments) => fit::run(arguments),
        Command::Vet(arguments) => vet::run(arguments),
        Command::Draft(arguments) => draft::run(arguments),
        Command::Replay(arguments) => replay::run(arguments),
        Command::Schema(arguments) => schema::run(arguments),
    }
}
