//! `schema`: prints the JSON Schema of the spec or of the findings.

use crate::command::{Outcome, console};
use crate::error::Error;
use crate::{output, spec};
use clap::{Args, ValueEnum};

/// Arguments of `schema`.
#[derive(Debug, Args)]
pub struct SchemaArgs {
    /// Of what.
    #[arg(value_enum, default_value = "spec")]
    pub of: SchemaOf,
}

/// What has a schema.
#[derive(Debug, Clone, Copy, PartialEq, Eq, ValueEnum)]
pub enum SchemaOf {
    /// The spec file.
    Spec,
    /// findings.json of a run.
    Findings,
}

/// Runs `schema`.
///
/// # Errors
/// Standard output cannot be written to.
pub fn run(arguments: &SchemaArgs) -> Result<Outcome, Error> {
    let schema = match arguments.of {
        SchemaOf::Spec => spec::json_schema(),
        SchemaOf::Findings => output::findings_schema(),
    };
    console::print(&format!("{schema:#}\n"))?;
    Ok(Outcome::Done)
}
