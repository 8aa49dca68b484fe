//! The one error of the program: a variant for each folder that can fail.

use crate::design::{DesignError, DraftError};
use crate::diagnostic::{Diagnostic, one_line};
use crate::fit::FitError;
use crate::output::OutputError;
use crate::spec::{Source, SpecError};
use crate::table::TableError;
use std::fmt;

/// Whatever kept a command from its result.
#[derive(Debug)]
#[non_exhaustive]
pub enum Error {
    /// The spec is wrong.
    Spec(SpecError),
    /// The data file is no table.
    Table(TableError),
    /// Spec and table do not fit together.
    Design {
        /// The faults.
        error: DesignError,
        /// The spec that they point into.
        spec: Box<Source>,
    },
    /// No spec could be drafted for a table.
    Draft(DraftError),
    /// The model could not be fitted.
    Fit(FitError),
    /// Something could not be written, or a run could not be read.
    Output(OutputError),
    /// Standard output could not be written to.
    Stdout(std::io::Error),
    /// The keyboard's interrupt could not be watched.
    NoInterrupt(String),
    /// The person asked to stop.
    Interrupted,
}

impl Error {
    /// The process's exit code: 1 failed inside or no place to write, 2 the input is wrong,
    /// 130 interrupted.
    pub fn exit_code(&self) -> u8 {
        match self {
            Error::Spec(_) | Error::Table(_) | Error::Design { .. } | Error::Draft(_) => 2,
            Error::Fit(FitError::Stopped) | Error::Interrupted => 130,
            // What cannot be fitted is a matter of spec and data.
            Error::Fit(_) => 2,
            Error::Stdout(_) | Error::NoInterrupt(_) => 1,
            Error::Output(error) => error.exit_code(),
        }
    }

    /// Everything that a person is told about it; nothing for an interruption, which they asked for.
    pub fn diagnostics(&self) -> Vec<Diagnostic> {
        match self {
            Error::Spec(error) => error.diagnostics(),
            Error::Table(error) => error.diagnostics(),
            Error::Design { error, .. } => error.diagnostics(),
            Error::Draft(error) => error.diagnostics(),
            Error::Output(error) => error.diagnostics(),
            Error::Fit(FitError::Stopped) | Error::Interrupted => Vec::new(),
            Error::Fit(error) => vec![Diagnostic::new(
                fit_code(error),
                error.to_string(),
                Vec::new(),
                error.help(),
            )],
            Error::Stdout(error) => vec![Diagnostic::new(
                "stdout",
                format!("standard output cannot be written to: {error}"),
                Vec::new(),
                "Look at where the output is sent to; a finished run is complete all the same.",
            )],
            Error::NoInterrupt(because) => vec![Diagnostic::new(
                "interrupt",
                format!("the keyboard's interrupt cannot be watched: {because}"),
                Vec::new(),
                "Start the program from another terminal.",
            )],
        }
    }

    /// The spec that places in the diagnostics point into.
    pub fn spec_source(&self) -> Option<&Source> {
        match self {
            Error::Spec(error) => Some(&error.source),
            Error::Design { spec, .. } => Some(spec),
            _ => None,
        }
    }
}

fn fit_code(error: &FitError) -> &'static str {
    match error {
        FitError::NotDetermined { .. } => "not-determined",
        FitError::NoStart => "no-start",
        FitError::StepLimit => "step-limit",
        FitError::NoCovariance => "no-covariance",
        FitError::NeverMoved { .. } => "never-moved",
        FitError::Stopped => "stopped",
    }
}

impl fmt::Display for Error {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match one_line(&self.diagnostics()) {
            // An interruption is told by nothing else.
            told if told.is_empty() => f.write_str("interrupted"),
            told => f.write_str(&told),
        }
    }
}

impl std::error::Error for Error {}

impl From<SpecError> for Error {
    fn from(error: SpecError) -> Self {
        Error::Spec(error)
    }
}

impl From<TableError> for Error {
    fn from(error: TableError) -> Self {
        Error::Table(error)
    }
}

impl From<FitError> for Error {
    fn from(error: FitError) -> Self {
        Error::Fit(error)
    }
}

impl From<OutputError> for Error {
    fn from(error: OutputError) -> Self {
        Error::Output(error)
    }
}

impl From<DraftError> for Error {
    fn from(error: DraftError) -> Self {
        Error::Draft(error)
    }
}
