//! A run appears complete or not at all, and replaces only what it may.
#![allow(missing_docs)]

use ratewright::output::files::{self, RunContent};
use ratewright::output::manifest::{self, Manifest};
use ratewright::output::shown::Audience;
use ratewright::output::timings::Laps;
use ratewright::output::{OutputError, Replace, RunFolder, parquet, run_folder};
use std::fs;
use std::path::{Path, PathBuf};

fn leave_run(target: &Path, spec_file: &str, replace: Replace) -> Result<PathBuf, OutputError> {
    let folder = RunFolder::begin(target, spec_file, replace)?;
    fill(
        &folder,
        spec_file,
        Audience::of_study(&crate::stand_in::findings().study),
    )?;
    folder.finish()
}

fn fill(folder: &RunFolder, spec_file: &str, audience: Audience) -> Result<Manifest, OutputError> {
    let content = RunContent {
        spec: &crate::stand_in::spec(),
        spec_file,
        data: &crate::stand_in::data_fact(),
        rows: &crate::stand_in::rows(),
        coding: &crate::stand_in::coding(),
        draws: &crate::stand_in::draws(),
        findings: &crate::stand_in::findings(),
        audience,
    };
    let manifest = files::write(folder, &content)?;
    files::write_timings(folder, &Laps::new().timings(2))?;
    Ok(manifest)
}

/// Names in a folder, sorted.
fn names(folder: &Path) -> Vec<String> {
    let mut names: Vec<String> = fs::read_dir(folder)
        .unwrap()
        .map(|entry| entry.unwrap().file_name().to_string_lossy().into_owned())
        .collect();
    names.sort();
    names
}

#[test]
fn a_run_holds_its_files_and_nothing_is_left_beside_it() {
    let place = tempfile::tempdir().unwrap();
    let run = leave_run(&place.path().join("landings.run"), "landings.toml", Replace::SameSpec).unwrap();
    assert_eq!(names(place.path()), ["landings.run"]);
    assert_eq!(
        names(&run),
        [
            "coding.json",
            "coefficients.csv",
            "draws.parquet",
            "findings.json",
            "manifest.json",
            "rate_ratios.csv",
            "rows.parquet",
            "spec.toml",
            "timings.json",
            "units.csv"
        ]
    );
    assert_eq!(
        fs::read(run.join("spec.toml")).unwrap(),
        crate::stand_in::spec().source.text.as_bytes()
    );
    assert_eq!(
        parquet::read_rows(&run.join("rows.parquet"), "landings.csv").unwrap(),
        crate::stand_in::rows()
    );
}

#[cfg(unix)]
#[test]
fn others_may_read_a_run_where_the_umask_lets_them() {
    use std::os::unix::fs::PermissionsExt;
    let place = tempfile::tempdir().unwrap();
    let by_hand = place.path().join("by hand");
    fs::create_dir(&by_hand).unwrap();
    let run = leave_run(&place.path().join("landings.run"), "landings.toml", Replace::SameSpec).unwrap();
    let mode = |path: &Path| fs::metadata(path).unwrap().permissions().mode();
    assert_eq!(mode(&run), mode(&by_hand));
}

#[test]
fn the_manifest_names_every_hashed_file_and_no_machine() {
    let place = tempfile::tempdir().unwrap();
    let run = leave_run(&place.path().join("landings.run"), "landings.toml", Replace::SameSpec).unwrap();
    let manifest = run_folder::open(&run).unwrap();
    for output in &manifest.outputs {
        assert_eq!(
            manifest::sha256(&fs::read(run.join(&output.file)).unwrap()),
            output.sha256,
            "{}",
            output.file
        );
    }
    let mut named: Vec<String> = manifest.outputs.iter().map(|output| output.file.clone()).collect();
    named.extend(["manifest.json".to_owned(), "timings.json".to_owned()]);
    named.sort();
    assert_eq!(named, names(&run));
    let text = fs::read_to_string(run.join("manifest.json")).unwrap();
    assert!(
        !text.contains(&place.path().display().to_string()) && !text.contains("studies/"),
        "{text}"
    );
    let outputs_hidden = insta::Settings::clone_current();
    let mut settings = outputs_hidden;
    settings.add_filter(r#""sha256": "[0-9a-f]{64}""#, r#""sha256": "(64 hexadecimal digits)""#);
    settings.bind(|| insta::assert_snapshot!(text));
}

#[test]
fn the_same_content_gives_the_same_bytes() {
    let place = tempfile::tempdir().unwrap();
    let first = leave_run(&place.path().join("a.run"), "landings.toml", Replace::SameSpec).unwrap();
    let second = leave_run(&place.path().join("b.run"), "landings.toml", Replace::SameSpec).unwrap();
    let bytes = |run: &Path| fs::read(run.join("manifest.json")).unwrap();
    assert_eq!(bytes(&first), bytes(&second));
}

#[test]
fn a_run_of_the_same_spec_file_is_replaced() {
    let place = tempfile::tempdir().unwrap();
    let target = place.path().join("landings.run");
    leave_run(&target, "landings.toml", Replace::SameSpec).unwrap();
    let folder = RunFolder::begin(&target, "landings.toml", Replace::SameSpec).unwrap();
    fill(&folder, "landings.toml", Audience::Whole).unwrap();
    // Until the last moment the old run stands whole.
    assert!(!run_folder::open(&target).unwrap().settings.whole);
    folder.finish().unwrap();
    assert!(run_folder::open(&target).unwrap().settings.whole);
    assert_eq!(names(place.path()), ["landings.run"]);
}

#[test]
fn an_unfinished_run_leaves_the_old_one_and_nothing_else() {
    let place = tempfile::tempdir().unwrap();
    let target = place.path().join("landings.run");
    leave_run(&target, "landings.toml", Replace::SameSpec).unwrap();
    let before = fs::read(target.join("manifest.json")).unwrap();
    let folder = RunFolder::begin(&target, "landings.toml", Replace::SameSpec).unwrap();
    folder.write("spec.toml", b"half").unwrap();
    drop(folder);
    assert_eq!(names(place.path()), ["landings.run"]);
    assert_eq!(fs::read(target.join("manifest.json")).unwrap(), before);
}

#[test]
fn a_run_of_another_spec_is_replaced_only_when_asked() {
    let place = tempfile::tempdir().unwrap();
    let target = place.path().join("landings.run");
    leave_run(&target, "landings.toml", Replace::SameSpec).unwrap();
    let error = leave_run(&target, "other.toml", Replace::SameSpec).unwrap_err();
    assert!(
        matches!(&error, OutputError::OtherRun { spec, .. } if spec == "landings.toml"),
        "{error}"
    );
    leave_run(&target, "other.toml", Replace::AnyRun).unwrap();
    assert_eq!(run_folder::open(&target).unwrap().spec.file, "other.toml");
}

#[test]
fn what_is_no_run_is_never_touched() {
    let place = tempfile::tempdir().unwrap();
    let folder = place.path().join("photos");
    fs::create_dir(&folder).unwrap();
    fs::write(folder.join("quay.jpg"), "x").unwrap();
    let file = place.path().join("a file");
    fs::write(&file, "x").unwrap();
    for target in [&folder, &file] {
        let error = leave_run(target, "landings.toml", Replace::AnyRun).unwrap_err();
        assert!(matches!(error, OutputError::NoRun { .. }), "{error}");
    }
    assert!(folder.join("quay.jpg").is_file() && file.is_file());
    assert_eq!(names(place.path()), ["a file", "photos"]);
}

#[test]
fn a_run_with_a_person_s_own_files_is_never_removed() {
    let place = tempfile::tempdir().unwrap();
    let target = place.path().join("landings.run");
    leave_run(&target, "landings.toml", Replace::SameSpec).unwrap();
    fs::write(target.join("my notes.txt"), "x").unwrap();
    let error = leave_run(&target, "landings.toml", Replace::AnyRun).unwrap_err();
    assert!(error.to_string().contains("my notes.txt"), "{error}");
    assert!(target.join("my notes.txt").is_file());
}

#[test]
fn an_empty_folder_is_taken() {
    let place = tempfile::tempdir().unwrap();
    let target = place.path().join("made before");
    fs::create_dir(&target).unwrap();
    leave_run(&target, "landings.toml", Replace::SameSpec).unwrap();
    assert!(run_folder::open(&target).is_ok());
}

#[test]
fn a_place_that_does_not_exist_is_told_before_the_slow_part() {
    let place = tempfile::tempdir().unwrap();
    let error = RunFolder::begin(
        &place.path().join("no such/landings.run"),
        "landings.toml",
        Replace::SameSpec,
    );
    assert!(matches!(error, Err(OutputError::NoFolder { .. })));
    assert!(matches!(
        RunFolder::begin(Path::new("/"), "landings.toml", Replace::SameSpec),
        Err(OutputError::NoName { .. })
    ));
}

#[test]
fn a_run_that_lost_a_file_or_its_manifest_is_told() {
    let place = tempfile::tempdir().unwrap();
    let run = leave_run(&place.path().join("landings.run"), "landings.toml", Replace::SameSpec).unwrap();
    fs::remove_file(run.join("coding.json")).unwrap();
    assert!(run_folder::open(&run).unwrap_err().to_string().contains("coding.json"));
    fs::write(run.join("manifest.json"), "{ \"ratewright\": 3 }").unwrap();
    assert!(matches!(run_folder::open(&run), Err(OutputError::Damaged { .. })));
    fs::remove_file(run.join("manifest.json")).unwrap();
    assert!(matches!(run_folder::open(&run), Err(OutputError::NotComplete { .. })));
}

#[test]
fn a_run_with_another_layout_is_told_by_its_version() {
    let place = tempfile::tempdir().unwrap();
    let run = leave_run(&place.path().join("landings.run"), "landings.toml", Replace::SameSpec).unwrap();
    let path = run.join("manifest.json");
    let text = fs::read_to_string(&path).unwrap();
    let later = text
        .replace("\"manifest\": 1,", "\"manifest\": 2,")
        .replace("0.2.0", "9.0.0");
    assert_ne!(text, later);
    fs::write(&path, later).unwrap();
    let error = run_folder::open(&run).unwrap_err();
    assert!(
        matches!(&error, OutputError::OtherLayout { left_by, .. } if left_by == "9.0.0"),
        "{error}"
    );
}
