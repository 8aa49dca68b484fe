//! `vet`: audits spec and data, and shows what the priors imply.

use crate::check;
use crate::command::study::Study;
use crate::command::{Outcome, console};
use crate::design::remarks;
use crate::error::Error;
use crate::output::findings::Note;
use crate::output::json;
use crate::output::vetting::{self, Vetting};
use clap::Args;
use std::path::PathBuf;

/// Arguments of `vet`.
#[derive(Debug, Args)]
pub struct VetArgs {
    /// The spec file.
    pub spec: PathBuf,
    /// Print what was found as JSON, and nothing else.
    #[arg(long)]
    pub json: bool,
}

/// Runs `vet`.
///
/// # Errors
/// The spec or the data is wrong.
pub fn run(arguments: &VetArgs) -> Result<Outcome, Error> {
    let study = Study::open(&arguments.spec)?;
    let (spec, design) = (&study.spec, &study.design);
    let vetting = Vetting {
        title: spec.study.title.clone(),
        answer_term: spec.study.answer.value.clone(),
        incidents_column: spec.incidents.column.value.clone(),
        unit_column: spec.data.unit.value.clone(),
        exposure_column: design.coding.exposure_column.clone(),
        per: design.coding.per,
        data: design.audit.clone(),
        remarks: remarks(spec, &study.table, design)
            .iter()
            .map(|remark| Note {
                code: remark.code().to_owned(),
                text: remark.to_string(),
            })
            .collect(),
        prior: check::prior(spec, design),
    };
    let text = if arguments.json {
        json::text("vet --json", &vetting)?
    } else {
        vetting::text(&vetting)
    };
    console::print(&text)?;
    Ok(Outcome::Done)
}
