//! Compares a run with its replay: the first difference, and what most likely made it.

use crate::output::OutputError;
use crate::output::compare::{Difference, first_difference, of_values};
use crate::output::manifest::{self, FileFact, Manifest, sha256_of_file};
use crate::output::text::Page;
use serde_json::Value;
use std::path::Path;

/// Where a replay took its rows from.
#[derive(Debug, Clone, PartialEq, Eq)]
pub enum Rows {
    /// From the run itself.
    OfTheRun,
    /// From a data file.
    OfFile(FileFact),
}

/// What most likely made a difference.
#[derive(Debug, Clone, PartialEq, Eq)]
pub enum Cause {
    /// The file of the run is not the one that the manifest was made with.
    Altered,
    /// The data file is not the one of the run.
    OtherData {
        /// Name of the run's data file.
        then: String,
        /// Name of the file given.
        now: String,
    },
    /// Another version left the run.
    OtherVersion {
        /// That version.
        then: String,
    },
    /// A file was altered and its hash in the manifest with it.
    AlteredWithHash,
    /// None of the above: the replay started from the run's own rows.
    UnknownFromOwnRows,
    /// None of the above: the replay started from the very data file of the run.
    Unknown,
}

/// The first difference between a run and its replay.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Mismatch {
    /// The file.
    pub file: String,
    /// The place in it and both values (run first), where they can be told.
    pub difference: Option<Difference>,
    /// What most likely made it.
    pub cause: Cause,
}

/// The first of these files of a run that is not as the run left it.
///
/// Asked before a replay of the files that it starts from: an altered start leads nowhere.
///
/// # Errors
/// A file cannot be read.
pub fn altered(run: &Path, manifest: &Manifest, files: &[&str]) -> Result<Option<Mismatch>, OutputError> {
    for output in &manifest.outputs {
        if files.contains(&output.file.as_str()) && sha256_of_file(&run.join(&output.file))? != output.sha256 {
            return Ok(Some(Mismatch {
                file: output.file.clone(),
                difference: None,
                cause: Cause::Altered,
            }));
        }
    }
    Ok(None)
}

/// The first difference between a run and its replay in the folder `again`, whose manifest is `now`.
///
/// # Errors
/// A file cannot be read.
pub fn first_mismatch(
    run: &Path,
    then: &Manifest,
    again: &Path,
    now: &Manifest,
    rows: &Rows,
) -> Result<Option<Mismatch>, OutputError> {
    for output in &then.outputs {
        let is_whole = sha256_of_file(&run.join(&output.file))? == output.sha256;
        let made_again = now.outputs.iter().find(|other| other.file == output.file);
        if is_whole && made_again.is_some_and(|other| other.sha256 == output.sha256) {
            continue;
        }
        let difference = match made_again {
            Some(_) => first_difference(run, again, &output.file)?,
            None => None,
        };
        return Ok(Some(Mismatch {
            file: output.file.clone(),
            difference,
            cause: match cause(then, now, rows) {
                _ if !is_whole => Cause::Altered,
                // Spec, rows and version are the run's, and no arithmetic lies between the rows read and written.
                Cause::Unknown | Cause::UnknownFromOwnRows if output.file == "rows.parquet" => Cause::AlteredWithHash,
                known => known,
            },
        }));
    }
    Ok(
        of_values(&comparable(then), &comparable(now)).map(|difference| Mismatch {
            file: manifest::FILE.to_owned(),
            difference: Some(difference),
            cause: match cause(then, now, rows) {
                // With every file the same, only the manifest itself can have been changed.
                Cause::Unknown | Cause::UnknownFromOwnRows => Cause::Altered,
                known => known,
            },
        }),
    )
}

fn cause(then: &Manifest, now: &Manifest, rows: &Rows) -> Cause {
    match rows {
        Rows::OfFile(file) if file.sha256 != then.data.sha256 => Cause::OtherData {
            then: then.data.file.clone(),
            now: file.file.clone(),
        },
        _ if then.ratewright != now.ratewright => Cause::OtherVersion {
            then: then.ratewright.clone(),
        },
        Rows::OfTheRun => Cause::UnknownFromOwnRows,
        Rows::OfFile(_) => Cause::Unknown,
    }
}

/// What two manifests of the same work share: all but the version, the data file and the hashes.
fn comparable(manifest: &Manifest) -> Value {
    let mut value = serde_json::to_value(manifest).unwrap_or_default();
    if let Some(entries) = value.as_object_mut() {
        for key in ["ratewright", "data", "outputs"] {
            entries.remove(key);
        }
    }
    value
}

/// A replay that agrees, as text.
pub fn agreement(manifest: &Manifest, rows: &Rows) -> String {
    let mut page = Page::default();
    page.aside(&format!(
        "The replay agrees: all {} hashed files came out again to the last byte.",
        manifest.outputs.len()
    ));
    if let Rows::OfFile(file) = rows
        && file.sha256 != manifest.data.sha256
    {
        page.aside(&format!(
            "{} is not the same file, byte for byte, as the run's {}; but the rows and columns that the fit uses are \
             the same.",
            file.file, manifest.data.file
        ));
    }
    page.finish()
}

/// A replay that differs, as text.
pub fn disagreement(mismatch: &Mismatch) -> String {
    let mut page = Page::default();
    page.aside("The replay differs from the run. The first difference:");
    let nothing = || "nothing".to_owned();
    page.paragraph(&format!("file: {}", mismatch.file));
    match &mismatch.difference {
        Some(difference) if !difference.place.is_empty() => {
            page.paragraph(&format!("place: {}", difference.place));
            page.paragraph(&format!(
                "in the run: {}",
                difference.first.clone().unwrap_or_else(nothing)
            ));
            page.paragraph(&format!(
                "in the replay: {}",
                difference.second.clone().unwrap_or_else(nothing)
            ));
        }
        Some(_) => page.paragraph("place: in its bytes alone, none of its values"),
        None => {}
    }
    let file = &mismatch.file;
    let cause = match &mismatch.cause {
        Cause::Altered if file == manifest::FILE => format!("{file} was altered after the run"),
        Cause::Altered => format!("{file}, or its hash in {}, was altered after the run", manifest::FILE),
        Cause::OtherData { then, now } if then == now => format!("{now} has changed since the run"),
        Cause::OtherData { then, now } => format!("{now} holds other data than the run's {then}"),
        Cause::OtherVersion { then } => format!(
            "version {then} left the run, and this is version {}",
            env!("CARGO_PKG_VERSION")
        ),
        Cause::AlteredWithHash => format!("{file} and its hash in {} were altered after the run", manifest::FILE),
        Cause::UnknownFromOwnRows => format!(
            "not certain. Either {file}, spec.toml or rows.parquet was altered after the run and its hash in {} with \
             it, or this processor gives other figures. A replay from the data file (--data FILE) tells an altered \
             rows.parquet",
            manifest::FILE
        ),
        Cause::Unknown => "unknown: spec, data and version are those of the run. Please report it, with the processor \
                           of both machines"
            .to_owned(),
    };
    page.paragraph(&format!("likely cause: {cause}."));
    page.finish()
}
