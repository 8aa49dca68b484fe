//! `draft`: looks at a table and writes a starter spec for it.

use crate::command::study::read_table;
use crate::command::{Outcome, console};
use crate::design;
use crate::error::Error;
use crate::output::OutputError;
use crate::output::run_folder::write_new;
use clap::Args;
use std::path::{Component, Path, PathBuf};

/// Arguments of `draft`.
#[derive(Debug, Args)]
pub struct DraftArgs {
    /// The data file.
    pub data: PathBuf,
    /// Write the spec to this new file (else to standard output).
    #[arg(long, value_name = "SPEC")]
    pub into: Option<PathBuf>,
}

/// Runs `draft`.
///
/// # Errors
/// The data file is no table, no spec fits it, or the new file exists already.
pub fn run(arguments: &DraftArgs) -> Result<Outcome, Error> {
    if let Some(into) = &arguments.into
        && into.symlink_metadata().is_ok()
    {
        return Err(OutputError::Exists { path: into.clone() }.into());
    }
    let (mut table, _) = read_table(&arguments.data)?;
    if let Some(into) = &arguments.into {
        // The spec names its data relative to itself.
        let folder = into.parent().unwrap_or(Path::new(""));
        if let Some(relative) = relative_to(&arguments.data, folder) {
            table.file = relative;
        }
    }
    let draft = design::draft(&table)?;
    match &arguments.into {
        None => console::print(&draft.text)?,
        Some(into) => {
            write_new(into, draft.text.as_bytes())?;
            console::tell(&format!(
                "A starter spec is in {}: read its comments, narrow its ranges, then try `ratewright vet`.\n",
                into.display()
            ));
        }
    }
    Ok(Outcome::Done)
}

/// The path of a file as seen from a folder, with `/` between its parts; `None` where either
/// cannot be found.
fn relative_to(file: &Path, folder: &Path) -> Option<String> {
    let folder = if folder == Path::new("") {
        Path::new(".")
    } else {
        folder
    };
    let (file, folder) = (file.canonicalize().ok()?, folder.canonicalize().ok()?);
    let file: Vec<Component> = file.components().collect();
    let folder: Vec<Component> = folder.components().collect();
    let shared = file.iter().zip(&folder).take_while(|(a, b)| a == b).count();
    let up = folder[shared..].iter().map(|_| "..".to_owned());
    let down = file[shared..]
        .iter()
        .map(|part| part.as_os_str().to_string_lossy().into_owned());
    Some(up.chain(down).collect::<Vec<_>>().join("/"))
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_spec_names_its_data_from_where_it_stands() {
        let place = tempfile::tempdir().unwrap();
        let (data, specs) = (place.path().join("data"), place.path().join("specs"));
        std::fs::create_dir(&data).unwrap();
        std::fs::create_dir(&specs).unwrap();
        let file = data.join("landings.csv");
        std::fs::write(&file, "x").unwrap();
        assert_eq!(relative_to(&file, &data).as_deref(), Some("landings.csv"));
        assert_eq!(relative_to(&file, place.path()).as_deref(), Some("data/landings.csv"));
        assert_eq!(relative_to(&file, &specs).as_deref(), Some("../data/landings.csv"));
        assert_eq!(relative_to(&data.join("none.csv"), &specs), None);
    }
}
