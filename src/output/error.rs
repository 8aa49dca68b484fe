//! What can go wrong between the findings and the disk.

use crate::diagnostic::{Diagnostic, Place};
use std::fmt;
use std::path::{Path, PathBuf};

/// A fault of the output: every variant names the path at fault.
#[derive(Debug)]
#[non_exhaustive]
pub enum OutputError {
    /// The system refused to write: no permission, a full disk, a lost medium.
    Write {
        /// The file or folder.
        path: PathBuf,
        /// What the system said.
        source: std::io::Error,
    },
    /// The system refused to read.
    Read {
        /// The file.
        path: PathBuf,
        /// What the system said.
        source: std::io::Error,
    },
    /// An old run was moved aside for a new one and could be neither moved back nor removed.
    OldRunLeft {
        /// Where it stands now.
        kept: PathBuf,
        /// What the system said.
        source: std::io::Error,
    },
    /// The folder that the run should stand in does not exist.
    NoFolder {
        /// The missing folder.
        folder: PathBuf,
    },
    /// The target has no name of its own, such as `/` or `..`.
    NoName {
        /// The target.
        target: PathBuf,
    },
    /// Something stands at the target that no `fit` has left there.
    NoRun {
        /// The target.
        target: PathBuf,
    },
    /// A run of another spec stands at the target.
    OtherRun {
        /// The target.
        target: PathBuf,
        /// Spec file that it is a run of.
        spec: String,
        /// Spec file of the run to be written.
        wanted: String,
    },
    /// A run stands at the target, and with it files that would be lost.
    OtherFiles {
        /// The target.
        target: PathBuf,
        /// The files that are not the run's.
        files: Vec<String>,
    },
    /// A file is to be written and exists already.
    Exists {
        /// The file.
        path: PathBuf,
    },
    /// A file of a run is not what such a file must be.
    Damaged {
        /// The file.
        path: PathBuf,
        /// What is wrong with it.
        because: String,
    },
    /// A folder is no run, or not a complete one.
    NotComplete {
        /// The folder.
        run: PathBuf,
        /// The file that is missing.
        missing: String,
    },
    /// A run was left by a version whose files this one does not read.
    OtherLayout {
        /// The run.
        run: PathBuf,
        /// The version that left it.
        left_by: String,
    },
    /// A figure came out infinite or undefined; nothing like it may reach a file.
    NotFinite {
        /// The file that it was meant for.
        file: &'static str,
        /// Its place, as a JSON pointer or a column.
        place: String,
    },
    /// A table could not be turned into Parquet.
    Parquet {
        /// The file.
        path: PathBuf,
        /// What the Parquet library said.
        because: String,
    },
}

impl OutputError {
    /// A refusal to write, by path.
    pub fn write(path: &Path) -> impl FnOnce(std::io::Error) -> OutputError + use<> {
        let path = path.to_owned();
        move |source| OutputError::Write { path, source }
    }

    /// A refusal to read, by path.
    pub fn read(path: &Path) -> impl FnOnce(std::io::Error) -> OutputError + use<> {
        let path = path.to_owned();
        move |source| OutputError::Read { path, source }
    }

    /// The process's exit code: 2 where what was handed in is wrong, 1 otherwise.
    pub fn exit_code(&self) -> u8 {
        match self {
            OutputError::Read { .. }
            | OutputError::Damaged { .. }
            | OutputError::NotComplete { .. }
            | OutputError::OtherLayout { .. } => 2,
            _ => 1,
        }
    }

    /// The fault as a person is told it.
    pub fn diagnostics(&self) -> Vec<Diagnostic> {
        let (code, message, path, help) = self.told();
        let places = path
            .map(|path| Place::File {
                file: path.display().to_string(),
            })
            .into_iter()
            .collect();
        vec![Diagnostic::new(code, message, places, help)]
    }

    fn told(&self) -> (&'static str, String, Option<&Path>, String) {
        match self {
            OutputError::Write { path, source } => (
                "cannot-write",
                format!("this cannot be written: {source}"),
                Some(path),
                "Free space or ask for permission there, or name another place with --into; nothing was left behind."
                    .to_owned(),
            ),
            OutputError::Read { path, source } => (
                "cannot-read",
                format!("this cannot be read: {source}"),
                Some(path),
                "Check the name and who may read the file.".to_owned(),
            ),
            OutputError::OldRunLeft { kept, source } => (
                "old-run-left",
                format!("the old run was moved here to make room, and then the system refused: {source}"),
                Some(kept),
                "Look at what stands in its old place; then move this folder back, or remove it.".to_owned(),
            ),
            OutputError::NoFolder { folder } => (
                "no-folder",
                "the folder that the run should stand in does not exist".to_owned(),
                Some(folder),
                "Make the folder, or name another place with --into.".to_owned(),
            ),
            OutputError::NoName { target } => (
                "no-name",
                "a run needs a folder name of its own".to_owned(),
                Some(target),
                "Name the folder to be made with --into.".to_owned(),
            ),
            OutputError::NoRun { target } => (
                "not-a-run",
                "something else than a run stands here, so it is left alone".to_owned(),
                Some(target),
                "Move it away, or name another place with --into.".to_owned(),
            ),
            OutputError::OtherRun { target, spec, wanted } => (
                "other-run",
                format!("a run of the spec \"{spec}\" stands here, and this is a run of \"{wanted}\""),
                Some(target),
                "Replace it with --replace, or name another place with --into.".to_owned(),
            ),
            OutputError::OtherFiles { target, files } => (
                "other-files",
                format!(
                    "the run that stands here holds files that ratewright did not write: {}",
                    listed(files)
                ),
                Some(target),
                "Move these files away first, since the whole folder is replaced; or name another place with --into."
                    .to_owned(),
            ),
            OutputError::Exists { path } => (
                "exists",
                "this file exists already, and is never written over".to_owned(),
                Some(path),
                "Move it away, or name another file.".to_owned(),
            ),
            OutputError::Damaged { path, because } => (
                "damaged-run",
                format!("this file of a run is not as a run leaves it: {because}"),
                Some(path),
                "Take the run from a backup, or fit its spec again.".to_owned(),
            ),
            OutputError::NotComplete { run, missing } => (
                "incomplete-run",
                format!("this is no complete run: it holds no {missing}"),
                Some(run),
                "Name a folder that `ratewright fit` has left.".to_owned(),
            ),
            OutputError::OtherLayout { run, left_by } => (
                "other-layout",
                format!("version {left_by} left this run, and this version does not read its files"),
                Some(run),
                "Use the version that left the run, or fit its spec again.".to_owned(),
            ),
            OutputError::NotFinite { file, place } => (
                "not-finite",
                format!("the figure at {place} of {file} came out infinite or undefined, so nothing was written"),
                None,
                "This is a fault of the program: please report it with the spec.".to_owned(),
            ),
            OutputError::Parquet { path, because } => (
                "parquet",
                format!("this could not be written as Parquet: {because}"),
                Some(path),
                "This is a fault of the program: please report it with the spec.".to_owned(),
            ),
        }
    }
}

/// The first few of a list, and how many more there are.
fn listed(files: &[String]) -> String {
    const SHOWN: usize = 3;
    let shown = files
        .iter()
        .take(SHOWN)
        .map(String::as_str)
        .collect::<Vec<_>>()
        .join(", ");
    match files.len().saturating_sub(SHOWN) {
        0 => shown,
        more => format!("{shown} and {more} more"),
    }
}

impl fmt::Display for OutputError {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        let (_, message, path, _) = self.told();
        match path {
            Some(path) => write!(f, "{}: {message}", path.display()),
            None => f.write_str(&message),
        }
    }
}

impl std::error::Error for OutputError {
    fn source(&self) -> Option<&(dyn std::error::Error + 'static)> {
        match self {
            OutputError::Write { source, .. }
            | OutputError::Read { source, .. }
            | OutputError::OldRunLeft { source, .. } => Some(source),
            _ => None,
        }
    }
}
