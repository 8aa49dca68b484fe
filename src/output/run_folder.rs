//! The run folder on disk: written beside its target, moved into place when complete.
//!
//! Everything that can be refused is refused by [`RunFolder::begin`], before the slow part. An
//! old run stays whole until the new one is complete; then it is moved aside, the new one moved
//! in, and only then is the old one removed. A run that is dropped unfinished leaves nothing.

use crate::output::OutputError;
use crate::output::manifest::{self, Manifest};
use crate::output::timings;
use std::io::Write;
use std::path::{Path, PathBuf};
use tempfile::TempDir;

/// Which old run may be replaced.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Replace {
    /// A run of the same spec file only.
    SameSpec,
    /// A run of any spec.
    AnyRun,
}

/// A run in the making.
#[derive(Debug)]
pub struct RunFolder {
    target: PathBuf,
    parent: PathBuf,
    spec_file: String,
    replace: Replace,
    work: TempDir,
}

/// What stands at a target.
enum Found {
    Nothing,
    OldRun,
}

impl RunFolder {
    /// Proves that a run can be written to `target`, and begins it beside the target.
    ///
    /// # Errors
    /// The folder around the target is missing or may not be written to; or something stands at
    /// the target that may not be replaced: no run, a run of another spec (unless `replace` says
    /// so), or a run together with files that are not a run's.
    pub fn begin(target: &Path, spec_file: &str, replace: Replace) -> Result<RunFolder, OutputError> {
        if target.file_name().is_none() {
            return Err(OutputError::NoName {
                target: target.to_owned(),
            });
        }
        let parent = match target.parent() {
            Some(parent) if parent != Path::new("") => parent.to_owned(),
            _ => PathBuf::from("."),
        };
        if !parent.is_dir() {
            return Err(OutputError::NoFolder { folder: parent });
        }
        if let Found::OldRun = look(target, spec_file, replace)? {
            // Its files have to be removed at the end, which asks for leave to write in it: a
            // nameless file in it proves that and touches nothing.
            tempfile::tempfile_in(target).map_err(OutputError::write(target))?;
        }
        let work = temporary_folder(&parent).map_err(OutputError::write(target))?;
        Ok(RunFolder {
            target: target.to_owned(),
            parent,
            spec_file: spec_file.to_owned(),
            replace,
            work,
        })
    }

    /// The folder to write into until [`RunFolder::finish`].
    pub fn path(&self) -> &Path {
        self.work.path()
    }

    /// Where the run will stand.
    pub fn target(&self) -> &Path {
        &self.target
    }

    /// Writes one file of the run, and sees it onto the disk.
    ///
    /// # Errors
    /// The system refuses; the error names the file where the person asked for it.
    pub fn write(&self, file: &str, bytes: &[u8]) -> Result<(), OutputError> {
        write_synced(&self.path().join(file), bytes).map_err(OutputError::write(&self.target.join(file)))
    }

    /// Moves the complete run into place; an old run there is gone only once the new one stands.
    ///
    /// # Errors
    /// The system refuses a move, or something came to stand at the target meanwhile; the old run
    /// is then where it was.
    pub fn finish(self) -> Result<PathBuf, OutputError> {
        let refused = OutputError::write(&self.target);
        match look(&self.target, &self.spec_file, self.replace)? {
            Found::Nothing => std::fs::rename(self.work.path(), &self.target).map_err(refused)?,
            Found::OldRun => {
                let aside = temporary_folder(&self.parent).map_err(OutputError::write(&self.target))?;
                let old = aside.path().join("old");
                std::fs::rename(&self.target, &old).map_err(OutputError::write(&self.target))?;
                if let Err(error) = std::fs::rename(self.work.path(), &self.target) {
                    if std::fs::rename(&old, &self.target).is_err() {
                        // The old run must not be removed with the folder that it is in.
                        let kept = aside.keep().join("old");
                        return Err(OutputError::OldRunLeft { kept, source: error });
                    }
                    return Err(refused(error));
                }
                let kept = old.clone();
                aside
                    .close()
                    .map_err(|source| OutputError::OldRunLeft { kept, source })?;
            }
        }
        // The folder is the person's now: it must not be removed at the end of this scope.
        let _ = self.work.keep();
        Ok(self.target)
    }
}

/// Looks at what stands at the target, and whether it may be replaced.
fn look(target: &Path, spec_file: &str, replace: Replace) -> Result<Found, OutputError> {
    match std::fs::symlink_metadata(target) {
        Err(error) if error.kind() == std::io::ErrorKind::NotFound => return Ok(Found::Nothing),
        Err(source) => {
            return Err(OutputError::Write {
                path: target.to_owned(),
                source,
            });
        }
        Ok(facts) if !facts.is_dir() => {
            return Err(OutputError::NoRun {
                target: target.to_owned(),
            });
        }
        Ok(_) => {}
    }
    let mut files: Vec<String> = std::fs::read_dir(target)
        .and_then(|entries| {
            entries
                .map(|entry| entry.map(|entry| entry.file_name().to_string_lossy().into_owned()))
                .collect()
        })
        .map_err(OutputError::read(target))?;
    if files.is_empty() {
        // A folder that was made for the run.
        return Ok(Found::OldRun);
    }
    let (old_spec, its_files) = old_run(target).ok_or_else(|| OutputError::NoRun {
        target: target.to_owned(),
    })?;
    if old_spec != spec_file && replace == Replace::SameSpec {
        return Err(OutputError::OtherRun {
            target: target.to_owned(),
            spec: old_spec,
            wanted: spec_file.to_owned(),
        });
    }
    files.retain(|file| !its_files.contains(file));
    if !files.is_empty() {
        files.sort();
        return Err(OutputError::OtherFiles {
            target: target.to_owned(),
            files,
        });
    }
    Ok(Found::OldRun)
}

/// Spec file and files of the run that stands somewhere.
///
/// The manifest is read key by key: a run that another version left may be replaced as well.
fn old_run(target: &Path) -> Option<(String, Vec<String>)> {
    let text = std::fs::read_to_string(target.join(manifest::FILE)).ok()?;
    let value: serde_json::Value = serde_json::from_str(&text).ok()?;
    value.get("ratewright")?.as_str()?;
    let spec = value.get("spec")?.get("file")?.as_str()?.to_owned();
    let outputs = value.get("outputs")?.as_array()?;
    let mut files: Vec<String> = outputs
        .iter()
        .filter_map(|output| output.get("file")?.as_str().map(str::to_owned))
        .collect();
    files.extend([manifest::FILE.to_owned(), timings::FILE.to_owned()]);
    Some((spec, files))
}

/// A temporary folder in `parent`, with the permissions that a folder made by hand would have.
fn temporary_folder(parent: &Path) -> std::io::Result<TempDir> {
    let mut builder = tempfile::Builder::new();
    builder.prefix(".ratewright-");
    #[cfg(unix)]
    {
        use std::os::unix::fs::PermissionsExt;
        // The process's umask takes away what it takes away; without this only the owner could
        // read the finished run.
        builder.permissions(std::fs::Permissions::from_mode(0o777));
    }
    builder.tempdir_in(parent)
}

/// Writes a new file, and returns once its bytes are on the disk: a full disk shows here.
fn write_synced(path: &Path, bytes: &[u8]) -> std::io::Result<()> {
    let mut file = std::fs::File::create_new(path)?;
    file.write_all(bytes)?;
    file.sync_all()
}

/// Writes a file that must not exist yet: it appears complete or not at all.
///
/// # Errors
/// The file exists, or the system refuses.
pub fn write_new(path: &Path, bytes: &[u8]) -> Result<(), OutputError> {
    if path.symlink_metadata().is_ok() {
        return Err(OutputError::Exists { path: path.to_owned() });
    }
    let parent = match path.parent() {
        Some(parent) if parent != Path::new("") => parent,
        _ => Path::new("."),
    };
    let mut builder = tempfile::Builder::new();
    builder.prefix(".ratewright-");
    #[cfg(unix)]
    {
        use std::os::unix::fs::PermissionsExt;
        builder.permissions(std::fs::Permissions::from_mode(0o666));
    }
    let mut file = builder.tempfile_in(parent).map_err(OutputError::write(path))?;
    file.write_all(bytes)
        .and_then(|()| file.as_file().sync_all())
        .map_err(OutputError::write(path))?;
    file.persist_noclobber(path).map_err(|error| match error.error.kind() {
        std::io::ErrorKind::AlreadyExists => OutputError::Exists { path: path.to_owned() },
        _ => OutputError::Write {
            path: path.to_owned(),
            source: error.error,
        },
    })?;
    Ok(())
}

/// The default place of a run: beside the spec, `pools.toml` giving `pools.run`.
pub fn beside(spec: &Path) -> PathBuf {
    spec.with_extension("run")
}

/// The manifest of a run that stands complete in `run`: every file that it names is there.
///
/// # Errors
/// The manifest cannot be read, or a file is missing.
pub fn open(run: &Path) -> Result<Manifest, OutputError> {
    let manifest = Manifest::read(run)?;
    for output in &manifest.outputs {
        if !run.join(&output.file).is_file() {
            return Err(OutputError::NotComplete {
                run: run.to_owned(),
                missing: output.file.clone(),
            });
        }
    }
    Ok(manifest)
}
