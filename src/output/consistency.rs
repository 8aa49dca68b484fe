//! Whether a run's manifest agrees with the rest of the run, asked before anything is run again.
//!
//! The manifest alone is covered by no hash. What it repeats of the spec and of the findings is
//! held against them here: otherwise an altered manifest would read as a fault of the program.

use crate::output::OutputError;
use crate::output::compare::of_values;
use crate::output::manifest::{self, Manifest, Settings, sha256};
use crate::output::shown::Audience;
use crate::spec::Spec;
use serde::Serialize;
use serde_json::Value;
use std::path::Path;

/// Holds a manifest against the spec and the findings of its own run.
///
/// `spec` is the run's, whose hash was found right. Findings whose hash is wrong are passed over: the
/// comparison of the files tells of them.
///
/// # Errors
/// [`OutputError::Damaged`] with everything in which the manifest contradicts the run; a file that cannot be read.
pub fn check(run: &Path, manifest: &Manifest, spec: &Spec) -> Result<(), OutputError> {
    let mut contradictions = Vec::new();
    let mut hold = |place: &str, stated: Value, other: Value, file: &str| {
        if let Some(found) = of_values(&stated, &other) {
            let nothing = || "nothing".to_owned();
            contradictions.push(format!(
                "{place}{} is {} in it and {} in {file}",
                found.place,
                found.first.unwrap_or_else(nothing),
                found.second.unwrap_or_else(nothing)
            ));
        }
    };
    let audience = Audience::of_run(&manifest.settings);
    hold("/seed", json(&manifest.seed), json(&spec.study.seed), "spec.toml");
    hold(
        "/settings",
        json(&manifest.settings),
        json(&Settings::of(spec, audience)),
        "spec.toml",
    );
    let data_file = Path::new(&spec.data.file.value).file_name().map_or_else(
        || spec.data.file.value.clone(),
        |name| name.to_string_lossy().into_owned(),
    );
    hold("/data/file", json(&manifest.data.file), json(&data_file), "spec.toml");
    let of_spec = sha256(spec.source.text.as_bytes());
    hold("/spec/sha256", json(&manifest.spec.sha256), json(&of_spec), "spec.toml");

    if let Some(findings) = findings(run, manifest)? {
        let stated_there = |key: &str| findings.get(key).cloned().unwrap_or_default();
        let file = "findings.json";
        hold(
            "/ratewright",
            json(&manifest.ratewright),
            stated_there("ratewright"),
            file,
        );
        hold("/audit", json(&manifest.audit), stated_there("data"), file);
    }
    if contradictions.is_empty() {
        return Ok(());
    }
    Err(OutputError::Damaged {
        path: run.join(manifest::FILE),
        because: format!(
            "it contradicts the run that it belongs to, so it was altered after the run: {}",
            contradictions.join("; ")
        ),
    })
}

/// The run's findings, where they are as the manifest's hash says.
fn findings(run: &Path, manifest: &Manifest) -> Result<Option<Value>, OutputError> {
    let path = run.join("findings.json");
    let bytes = std::fs::read(&path).map_err(OutputError::read(&path))?;
    let is_whole = manifest
        .outputs
        .iter()
        .any(|output| output.file == "findings.json" && output.sha256 == sha256(&bytes));
    Ok(is_whole.then(|| serde_json::from_slice(&bytes).ok()).flatten())
}

fn json(value: &impl Serialize) -> Value {
    serde_json::to_value(value).unwrap_or_default()
}
