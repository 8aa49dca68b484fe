//! All files of a run, in the order that they are written in.

use crate::design::Coding;
use crate::fit::Draws;
use crate::output::findings::Findings;
use crate::output::manifest::{self, FileFact, Layouts, Manifest, Settings};
use crate::output::shown::Audience;
use crate::output::timings::{self, Timings};
use crate::output::{OutputError, RunFolder, json, parquet, tables};
use crate::spec::Spec;
use crate::table::Table;

/// Everything that a run holds.
#[derive(Debug, Clone, Copy)]
pub struct RunContent<'a> {
    /// The spec, with its text.
    pub spec: &'a Spec,
    /// Name of the spec file, without folders.
    pub spec_file: &'a str,
    /// The data file: name without folders, and hash.
    pub data: &'a FileFact,
    /// The rows and columns that the fit used.
    pub rows: &'a Table,
    /// What codes new rows.
    pub coding: &'a Coding,
    /// The kept draws.
    pub draws: &'a Draws,
    /// What was found.
    pub findings: &'a Findings,
    /// Whom `units.csv` is for.
    pub audience: Audience,
}

/// Writes all files of a run but the timings; returns its manifest, which is written last.
///
/// # Errors
/// A figure is not finite, or the system refuses to write.
pub fn write(folder: &RunFolder, content: &RunContent) -> Result<Manifest, OutputError> {
    let target = folder.target();
    let findings = content.findings;
    let mut outputs = Vec::new();
    let mut put = |file: &str, bytes: &[u8]| -> Result<(), OutputError> {
        folder.write(file, bytes)?;
        outputs.push(FileFact {
            file: file.to_owned(),
            sha256: manifest::sha256(bytes),
        });
        Ok(())
    };
    put("spec.toml", content.spec.source.text.as_bytes())?;
    put(
        "rows.parquet",
        &parquet::rows(&target.join("rows.parquet"), content.rows)?,
    )?;
    put("coding.json", json::text("coding.json", content.coding)?.as_bytes())?;
    put(
        "draws.parquet",
        &parquet::draws(&target.join("draws.parquet"), content.draws)?,
    )?;
    put("coefficients.csv", tables::coefficients(findings)?.as_bytes())?;
    put("rate_ratios.csv", tables::rate_ratios(findings)?.as_bytes())?;
    put("units.csv", tables::units(findings, content.audience)?.as_bytes())?;
    put("findings.json", json::text("findings.json", findings)?.as_bytes())?;
    debug_assert!(
        outputs
            .iter()
            .map(|output: &FileFact| output.file.as_str())
            .eq(manifest::HASHED)
    );
    let manifest = Manifest {
        ratewright: env!("CARGO_PKG_VERSION").to_owned(),
        layouts: Layouts::CURRENT,
        spec: FileFact {
            file: content.spec_file.to_owned(),
            sha256: manifest::sha256(content.spec.source.text.as_bytes()),
        },
        data: content.data.clone(),
        seed: content.spec.study.seed,
        settings: Settings::of(content.spec, content.audience),
        audit: findings.data.clone(),
        outputs,
    };
    folder.write(manifest::FILE, manifest.text()?.as_bytes())?;
    Ok(manifest)
}

/// Writes the timings of a run.
///
/// # Errors
/// The system refuses to write.
pub fn write_timings(folder: &RunFolder, timings: &Timings) -> Result<(), OutputError> {
    folder.write(timings::FILE, json::text(timings::FILE, timings)?.as_bytes())
}
