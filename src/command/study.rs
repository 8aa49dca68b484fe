//! The steps that several commands share: open a study, and conclude it.

use crate::check;
use crate::command::progress::Progress;
use crate::design::{self, Design, DesignError};
use crate::error::Error;
use crate::fit::{self, Draws, Machine};
use crate::model::Model;
use crate::output::findings::Findings;
use crate::output::gather;
use crate::output::manifest::{FileFact, sha256};
use crate::spec::{self, Spec};
use crate::table::{self, Table};
use std::num::NonZeroUsize;
use std::path::Path;

/// A study that has been read and checked.
pub struct Study {
    /// The spec.
    pub spec: Spec,
    /// Name of the spec file, without folders.
    pub spec_file: String,
    /// The table as it was read.
    pub table: Table,
    /// The data file by name and content.
    pub data: FileFact,
    /// What the fit needs of it.
    pub design: Design,
}

impl Study {
    /// Reads a spec and the data that it names.
    ///
    /// # Errors
    /// Either is wrong, or the two do not fit together.
    pub fn open(spec_path: &Path) -> Result<Study, Error> {
        let spec = spec::read(spec_path)?;
        let data_path = spec_path.parent().unwrap_or(Path::new("")).join(&spec.data.file.value);
        let (table, data) = read_table(&data_path)?;
        let design = design::build(&spec, &table).map_err(|error| design_error(error, &spec))?;
        Ok(Study {
            spec,
            spec_file: file_name(spec_path),
            table,
            data,
            design,
        })
    }

    /// The rows and columns that a fit uses.
    ///
    /// # Errors
    /// None in a study that is open; the type is that of the function beneath.
    pub fn used_rows(&self) -> Result<Table, Error> {
        design::used_rows(&self.spec, &self.table).map_err(|error| design_error(error, &self.spec))
    }
}

/// Reads a data file once: its table, and its name and hash.
///
/// # Errors
/// The file cannot be read, or holds no table.
pub fn read_table(path: &Path) -> Result<(Table, FileFact), Error> {
    let shown = path.display().to_string();
    let bytes = table::read_bytes(&shown, path)?;
    let table = table::parse_csv(&shown, &bytes)?;
    let fact = FileFact {
        file: file_name(path),
        sha256: sha256(&bytes),
    };
    Ok((table, fact))
}

/// A design error with the spec that it points into.
pub fn design_error(error: DesignError, spec: &Spec) -> Error {
    Error::Design {
        error,
        spec: Box::new(spec.source.clone()),
    }
}

/// What a study came to.
pub struct Concluded {
    /// The kept draws.
    pub draws: Draws,
    /// The findings.
    pub findings: Findings,
}

/// Fits a study and checks its units.
///
/// # Errors
/// The model could not be fitted, or the person asked to stop.
pub fn conclude(
    spec: &Spec,
    design: &Design,
    threads: Option<NonZeroUsize>,
    progress: &Progress,
) -> Result<Concluded, Error> {
    let model = Model::new(spec, design);
    let fitted = fit::run(&model, spec, machine(threads), progress);
    progress.clear();
    let fitted = fitted?;
    let units = check::units(
        design,
        &spec.family,
        &fitted.draws,
        spec.report.interval,
        spec.study.seed,
        machine(threads).threads,
    );
    let findings = gather::findings(spec, design, &fitted, units)?;
    Ok(Concluded {
        draws: fitted.draws,
        findings,
    })
}

/// The machine as asked for; all of it where nothing is.
pub fn machine(threads: Option<NonZeroUsize>) -> Machine {
    let whole = Machine::default();
    Machine {
        threads: threads.map_or(whole.threads, NonZeroUsize::get),
        ..whole
    }
}

/// The last part of a path; the whole path where it has none.
fn file_name(path: &Path) -> String {
    path.file_name()
        .unwrap_or(path.as_os_str())
        .to_string_lossy()
        .into_owned()
}
