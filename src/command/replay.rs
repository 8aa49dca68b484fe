//! `replay`: runs a finished run again and tells the first difference, if any.

use crate::command::interrupt::Interrupt;
use crate::command::progress::{Chatter, Progress};
use crate::command::study::{conclude, design_error, read_table};
use crate::command::{Outcome, console};
use crate::error::Error;
use crate::output::files::{self, RunContent};
use crate::output::replaying::{self, Rows};
use crate::output::shown::Audience;
use crate::output::{OutputError, Replace, RunFolder, consistency, parquet, run_folder};
use crate::{design, spec};
use clap::Args;
use std::num::NonZeroUsize;
use std::path::{Path, PathBuf};

/// Arguments of `replay`.
#[derive(Debug, Args)]
pub struct ReplayArgs {
    /// The run: a folder that `fit` has left.
    pub run: PathBuf,
    /// Take the rows from this data file instead of from the run.
    #[arg(long, value_name = "FILE")]
    pub data: Option<PathBuf>,
    /// Show no progress.
    #[arg(long)]
    pub quiet: bool,
    /// Use this many threads (else one for each core); the results do not depend on it.
    #[arg(long, value_name = "N")]
    pub threads: Option<NonZeroUsize>,
}

/// Runs `replay`. The run itself is only read.
///
/// # Errors
/// The folder is no complete run, the data file is wrong, the fit fails, or the person asks to stop.
pub fn run(arguments: &ReplayArgs) -> Result<Outcome, Error> {
    let interrupt = Interrupt::watched()?;
    let run = &arguments.run;
    let manifest = run_folder::open(run)?;
    let starts_from: &[&str] = match arguments.data {
        Some(_) => &["spec.toml"],
        None => &["spec.toml", "rows.parquet"],
    };
    if let Some(mismatch) = replaying::altered(run, &manifest, starts_from)? {
        console::print(&replaying::disagreement(&mismatch))?;
        return Ok(Outcome::Differs);
    }

    let spec = spec::read(&run.join("spec.toml"))?;
    consistency::check(run, &manifest, &spec)?;
    let (table, source) = match &arguments.data {
        Some(path) => {
            let (table, fact) = read_table(path)?;
            (table, Rows::OfFile(fact))
        }
        None => {
            let table = parquet::read_rows(&run.join("rows.parquet"), &manifest.data.file)?;
            (table, Rows::OfTheRun)
        }
    };
    let mut design = design::build(&spec, &table).map_err(|error| design_error(error, &spec))?;
    let rows = design::used_rows(&spec, &table).map_err(|error| design_error(error, &spec))?;
    if source == Rows::OfTheRun {
        // The run holds the rows that were used; what happened to the others is in its manifest.
        design.audit = manifest.audit.clone();
    }

    let place = tempfile::tempdir().map_err(OutputError::write(Path::new("the system's temporary folder")))?;
    let folder = RunFolder::begin(&place.path().join("again.run"), &manifest.spec.file, Replace::SameSpec)?;
    let chatter = if arguments.quiet {
        Chatter::Quiet
    } else {
        Chatter::Allowed
    };
    let progress = Progress::new(chatter, interrupt.clone());
    let concluded = conclude(&spec, &design, arguments.threads, &progress)?;
    let content = RunContent {
        spec: &spec,
        spec_file: &manifest.spec.file,
        data: &manifest.data,
        rows: &rows,
        coding: &design.coding,
        draws: &concluded.draws,
        findings: &concluded.findings,
        audience: Audience::of_run(&manifest.settings),
    };
    let now = files::write(&folder, &content)?;
    interrupt.check()?;
    match replaying::first_mismatch(run, &manifest, folder.path(), &now, &source)? {
        None => {
            console::print(&replaying::agreement(&manifest, &source))?;
            Ok(Outcome::Done)
        }
        Some(mismatch) => {
            console::print(&replaying::disagreement(&mismatch))?;
            Ok(Outcome::Differs)
        }
    }
}
