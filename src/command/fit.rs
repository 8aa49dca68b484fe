//! `fit`: read, check, fit, judge, write, tell.

use crate::command::interrupt::Interrupt;
use crate::command::progress::{Chatter, Progress};
use crate::command::study::{self, Study};
use crate::command::{Outcome, console};
use crate::error::Error;
use crate::output::files::{self, RunContent};
use crate::output::shown::Audience;
use crate::output::timings::Laps;
use crate::output::{Replace, RunFolder, json, run_folder, terminal};
use clap::Args;
use std::num::NonZeroUsize;
use std::path::PathBuf;

/// Arguments of `fit`.
#[derive(Debug, Args)]
pub struct FitArgs {
    /// The spec file.
    pub spec: PathBuf,
    /// Leave the run in this folder (else beside the spec: pools.toml gives pools.run).
    #[arg(long, value_name = "RUN")]
    pub into: Option<PathBuf>,
    /// Replace a run that stands there even if it is of another spec.
    #[arg(long)]
    pub replace: bool,
    /// Print the findings as JSON, and nothing else; small counts stand there in full.
    #[arg(long)]
    pub json: bool,
    /// Show no progress.
    #[arg(long)]
    pub quiet: bool,
    /// Show small counts in full, on the terminal and in units.csv.
    #[arg(long)]
    pub whole: bool,
    /// Use this many threads (else one for each core); the results do not depend on it.
    #[arg(long, value_name = "N")]
    pub threads: Option<NonZeroUsize>,
}

/// Runs `fit`.
///
/// # Errors
/// The input is wrong, the place cannot be written to, the fit fails, or the person asks to stop.
pub fn run(arguments: &FitArgs) -> Result<Outcome, Error> {
    let interrupt = Interrupt::watched()?;
    let mut laps = Laps::new();
    let study = Study::open(&arguments.spec)?;
    let rows = study.used_rows()?;
    let target = arguments
        .into
        .clone()
        .unwrap_or_else(|| run_folder::beside(&arguments.spec));
    let replace = if arguments.replace {
        Replace::AnyRun
    } else {
        Replace::SameSpec
    };
    let folder = RunFolder::begin(&target, &study.spec_file, replace)?;
    laps.lap("read and check");

    let chatter = if arguments.quiet {
        Chatter::Quiet
    } else {
        Chatter::Allowed
    };
    let progress = Progress::new(chatter, interrupt.clone());
    let concluded = study::conclude(&study.spec, &study.design, arguments.threads, &progress)?;
    laps.lap("fit and check");

    let findings = &concluded.findings;
    let audience = if arguments.whole {
        Audience::Whole
    } else {
        Audience::of_study(&findings.study)
    };
    let content = RunContent {
        spec: &study.spec,
        spec_file: &study.spec_file,
        data: &study.data,
        rows: &rows,
        coding: &study.design.coding,
        draws: &concluded.draws,
        findings,
        audience,
    };
    files::write(&folder, &content)?;
    laps.lap("write");
    let threads = study::machine(arguments.threads).threads;
    files::write_timings(&folder, &laps.timings(threads))?;
    interrupt.check()?;
    let run = folder.finish()?;

    let text = if arguments.json {
        json::text("findings.json", findings)?
    } else {
        terminal::findings(findings, audience, &run)
    };
    console::print(&text)?;
    Ok(Outcome::Done)
}
