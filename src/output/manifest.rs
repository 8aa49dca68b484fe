//! `manifest.json`: what a run was made from and by, and the hash of everything hashed in it.
//!
//! Nothing here differs between two machines that do the same work: no time, no user, no path, no
//! number of threads. Those stand in `timings.json`, which is not hashed.

use crate::design::Audit;
use crate::output::OutputError;
use crate::output::json;
use crate::output::shown::Audience;
use crate::spec::{Spec, Steps, ZeroCounts};
use serde::{Deserialize, Serialize};
use sha2::{Digest, Sha256};
use std::io::Read;
use std::path::Path;

/// Name of the manifest in a run.
pub const FILE: &str = "manifest.json";

/// Every hashed file of a run, in the order that they are written in: no run holds fewer or others.
pub const HASHED: [&str; 8] = [
    "spec.toml",
    "rows.parquet",
    "coding.json",
    "draws.parquet",
    "coefficients.csv",
    "rate_ratios.csv",
    "units.csv",
    "findings.json",
];

/// The manifest.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct Manifest {
    /// Version of the program that left the run.
    pub ratewright: String,
    /// Version of each file's layout.
    pub layouts: Layouts,
    /// The spec.
    pub spec: FileFact,
    /// The data file: its name only, wherever it lay.
    pub data: FileFact,
    /// Seed of every random stream.
    pub seed: u64,
    /// What the run was asked to do.
    pub settings: Settings,
    /// What happened to the rows of the data file: `rows.parquet` holds only those that were used.
    pub audit: Audit,
    /// The files that [`HASHED`] names, in its order.
    pub outputs: Vec<FileFact>,
}

/// Version of each file's layout: raised when a reader of the old one could go wrong.
#[derive(Debug, Clone, PartialEq, Eq, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct Layouts {
    /// `manifest.json`
    pub manifest: u32,
    /// `findings.json`
    pub findings: u32,
    /// `coding.json`
    pub coding: u32,
    /// The CSV tables.
    pub tables: u32,
    /// `draws.parquet`
    pub draws: u32,
    /// `rows.parquet`
    pub rows: u32,
}

impl Layouts {
    /// The layouts that this version writes and reads.
    pub const CURRENT: Layouts = Layouts {
        manifest: 1,
        findings: crate::output::findings::LAYOUT,
        coding: 1,
        tables: 1,
        draws: 1,
        rows: 1,
    };
}

/// A file by name and content.
#[derive(Debug, Clone, PartialEq, Eq, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct FileFact {
    /// Its name, without folders.
    pub file: String,
    /// SHA-256 of its bytes, in hexadecimal.
    pub sha256: String,
}

/// What the run was asked to do, defaults filled in.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct Settings {
    /// Number of chains.
    pub chains: usize,
    /// `mixed` or `walk`.
    pub steps: String,
    /// Precision asked for.
    pub precision: f64,
    /// Most kept draws.
    pub most_draws: usize,
    /// Level of every interval.
    pub interval: f64,
    /// Counts below this are hidden from people.
    pub hide_counts_below: u64,
    /// Whether a count of 0 is shown.
    pub show_zero: bool,
    /// Whether `units.csv` holds every count in full.
    pub whole: bool,
}

impl Settings {
    /// The settings of a spec, and whom `units.csv` is for.
    pub fn of(spec: &Spec, audience: Audience) -> Settings {
        Settings {
            chains: spec.sampling.chains,
            steps: steps_word(spec.sampling.steps).to_owned(),
            precision: spec.sampling.precision,
            most_draws: spec.sampling.most_draws,
            interval: spec.report.interval,
            hide_counts_below: spec.report.hide_counts_below,
            show_zero: spec.report.zero_counts == ZeroCounts::Shown,
            whole: audience == Audience::Whole,
        }
    }
}

/// The kind of steps as the spec spells it.
pub fn steps_word(steps: Steps) -> &'static str {
    match steps {
        Steps::Mixed => "mixed",
        Steps::Walk => "walk",
    }
}

impl Manifest {
    /// Reads a run's manifest.
    ///
    /// # Errors
    /// The folder is no run, its manifest is damaged (entries of hashed files are missing, unknown or
    /// out of order included), or another version's layout stands in it.
    pub fn read(run: &Path) -> Result<Manifest, OutputError> {
        let path = run.join(FILE);
        let text = match std::fs::read_to_string(&path) {
            Err(error)
                if matches!(
                    error.kind(),
                    std::io::ErrorKind::NotFound | std::io::ErrorKind::NotADirectory
                ) =>
            {
                return Err(OutputError::NotComplete {
                    run: run.to_owned(),
                    missing: FILE.to_owned(),
                });
            }
            Err(source) => return Err(OutputError::Read { path, source }),
            Ok(text) => text,
        };
        let damaged = |error: serde_json::Error| OutputError::Damaged {
            path: path.clone(),
            because: error.to_string(),
        };
        let value: serde_json::Value = serde_json::from_str(&text).map_err(damaged)?;
        // Another version may have other keys, so the layouts are looked at before the rest.
        let left_by = value.get("ratewright").and_then(|version| version.as_str());
        let layouts = value.get("layouts").cloned().map(serde_json::from_value::<Layouts>);
        if let (Some(left_by), Some(layouts)) = (left_by, layouts)
            && !matches!(layouts, Ok(Layouts::CURRENT))
        {
            return Err(OutputError::OtherLayout {
                run: run.to_owned(),
                left_by: left_by.to_owned(),
            });
        }
        let manifest: Manifest = serde_json::from_value(value).map_err(damaged)?;
        // With entries taken out, a replay would compare nothing and agree.
        let named: Vec<&str> = manifest.outputs.iter().map(|output| output.file.as_str()).collect();
        if named != HASHED {
            return Err(OutputError::Damaged {
                path,
                because: format!(
                    "it has to name these hashed files, in this order: {}; it names {}",
                    HASHED.join(", "),
                    if named.is_empty() {
                        "none".to_owned()
                    } else {
                        named.join(", ")
                    }
                ),
            });
        }
        Ok(manifest)
    }

    /// The manifest as the text of its file.
    pub fn text(&self) -> Result<String, OutputError> {
        json::text(FILE, self)
    }
}

/// SHA-256 of some bytes, in hexadecimal.
pub fn sha256(bytes: &[u8]) -> String {
    hexadecimal(&Sha256::digest(bytes))
}

/// SHA-256 of a file, in hexadecimal, without holding the file in memory.
///
/// # Errors
/// The file cannot be read.
pub fn sha256_of_file(path: &Path) -> Result<String, OutputError> {
    let mut file = std::fs::File::open(path).map_err(OutputError::read(path))?;
    let mut hash = Sha256::new();
    let mut buffer = vec![0; 1 << 16];
    loop {
        match file.read(&mut buffer) {
            Ok(0) => return Ok(hexadecimal(&hash.finalize())),
            Ok(read) => hash.update(&buffer[..read]),
            Err(error) if error.kind() == std::io::ErrorKind::Interrupted => {}
            Err(source) => {
                return Err(OutputError::Read {
                    path: path.to_owned(),
                    source,
                });
            }
        }
    }
}

fn hexadecimal(bytes: &[u8]) -> String {
    bytes.iter().map(|byte| format!("{byte:02x}")).collect()
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn the_hash_is_the_published_one() {
        // FIPS 180-2, appendix B.1: the message "abc".
        let expected = "ba7816bf8f01cfea414140de5dae2223b00361a396177a9cb410ff61f20015ad";
        assert_eq!(sha256(b"abc"), expected);
        let folder = tempfile::tempdir().unwrap();
        let path = folder.path().join("abc");
        std::fs::write(&path, "abc").unwrap();
        assert_eq!(sha256_of_file(&path).unwrap(), expected);
    }
}
