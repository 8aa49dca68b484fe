//! A replay agrees with its run, or tells the first difference and what most likely made it.

use crate::command_line::{err, finished, names, out, place, ratewright, replaced, unwrapped};
use std::fs;
use std::path::{Path, PathBuf};
use tempfile::TempDir;

/// A copy of the finished run, to be tampered with.
fn copied() -> (TempDir, PathBuf) {
    let place = place();
    let run = place.path().join("landings.run");
    fs::create_dir(&run).unwrap();
    for entry in fs::read_dir(finished().join("landings.run")).unwrap() {
        let entry = entry.unwrap();
        fs::copy(entry.path(), run.join(entry.file_name())).unwrap();
    }
    (place, run)
}

#[test]
fn a_replay_needs_the_run_alone() {
    let (place, _) = copied();
    fs::remove_file(place.path().join("landings.toml")).unwrap();
    fs::remove_file(place.path().join("landings.csv")).unwrap();
    let replay = ratewright(place.path(), &["replay", "landings.run"]);
    assert_eq!(replay.status.code(), Some(0), "{}{}", out(&replay), err(&replay));
    insta::assert_snapshot!(out(&replay), @"The replay agrees: all 8 hashed files came out again to the last byte.");
    assert_eq!(names(place.path()), ["landings.run"]);
}

#[test]
fn a_replay_tells_an_altered_table_by_its_cell() {
    let (place, run) = copied();
    replaced(&run.join("units.csv"), "North quay,2,", "North quay,3,");
    let replay = ratewright(place.path(), &["replay", "landings.run"]);
    assert_eq!(replay.status.code(), Some(3));
    insta::assert_snapshot!(out(&replay));
}

#[test]
fn a_replay_tells_altered_findings_by_their_pointer() {
    let (place, run) = copied();
    replaced(&run.join("findings.json"), "\"chains\": 4", "\"chains\": 5");
    let replay = ratewright(place.path(), &["replay", "landings.run"]);
    assert_eq!(replay.status.code(), Some(3));
    insta::assert_snapshot!(out(&replay));
}

#[test]
fn a_replay_tells_an_altered_start_without_running_it() {
    for file in ["spec.toml", "rows.parquet"] {
        let (place, run) = copied();
        fs::write(run.join(file), "nothing of use").unwrap();
        let replay = ratewright(place.path(), &["replay", "landings.run"]);
        assert_eq!(replay.status.code(), Some(3), "{}", err(&replay));
        assert!(out(&replay).contains(&format!("file: {file}")), "{}", out(&replay));
        let words: Vec<String> = out(&replay).split_whitespace().map(str::to_owned).collect();
        assert!(
            words.join(" ").contains("was altered after the run"),
            "{}",
            out(&replay)
        );
    }
}

#[test]
fn a_manifest_that_contradicts_its_run_is_damaged() {
    for (from, to, place) in [
        ("\"seed\": 48151", "\"seed\": 48152", "/seed is 48152 in it and 48151"),
        ("\"chains\": 4", "\"chains\": 5", "/settings/chains is 5 in it and 4"),
        (
            "\"file\": \"landings.csv\"",
            "\"file\": \"quays.csv\"",
            "/data/file is \"quays.csv\"",
        ),
        (
            "\"rows_used\": 24",
            "\"rows_used\": 25",
            "/audit/rows_used is 25 in it and 24",
        ),
        ("\"ratewright\": \"", "\"ratewright\": \"9", "/ratewright is \"9"),
    ] {
        let (place_of_run, run) = copied();
        replaced(&run.join("manifest.json"), from, to);
        let replay = ratewright(place_of_run.path(), &["replay", "landings.run"]);
        assert_eq!(replay.status.code(), Some(2), "{}{}", out(&replay), err(&replay));
        let told = unwrapped(&err(&replay));
        assert!(told.contains("(damaged-run)") && told.contains(place), "{told}");
    }
}

#[test]
fn a_manifest_that_names_fewer_files_or_others_is_damaged() {
    let outputs = |change: &dyn Fn(&mut Vec<serde_json::Value>)| {
        let (place, run) = copied();
        let path = run.join("manifest.json");
        let mut manifest: serde_json::Value = serde_json::from_slice(&fs::read(&path).unwrap()).unwrap();
        change(manifest["outputs"].as_array_mut().unwrap());
        fs::write(&path, manifest.to_string()).unwrap();
        let replay = ratewright(place.path(), &["replay", "landings.run"]);
        assert_eq!(replay.status.code(), Some(2), "{}{}", out(&replay), err(&replay));
        assert!(unwrapped(&err(&replay)).contains("(damaged-run)"), "{}", err(&replay));
    };
    outputs(&|outputs| outputs.clear());
    outputs(&|outputs| outputs.truncate(3));
    outputs(&|outputs| outputs.swap(0, 1));
    outputs(&|outputs| outputs[7]["file"] = "timings.json".into());
}

#[test]
fn a_replay_tells_draws_that_are_no_parquet_any_more() {
    let cut = |keep: fn(&[u8]) -> &[u8]| {
        let (place, run) = copied();
        let path = run.join("draws.parquet");
        let whole = fs::read(&path).unwrap();
        fs::write(&path, keep(&whole)).unwrap();
        let replay = ratewright(place.path(), &["replay", "landings.run"]);
        assert_eq!(replay.status.code(), Some(3), "{}", err(&replay));
        unwrapped(&out(&replay))
    };
    let empty = cut(|_| &[]);
    assert!(
        empty.contains("in the run: it is empty, and cannot be read as Parquet"),
        "{empty}"
    );
    let half = cut(|whole| &whole[..whole.len() / 2]);
    assert!(half.contains("bytes cannot be read as Parquet"), "{half}");
    assert!(half.contains("draws.parquet, or its hash"), "{half}");
}

/// Alters a count of `rows.parquet` and its hash in the manifest.
fn with_another_count(run: &Path) {
    use ratewright::output::{manifest, parquet};
    use ratewright::table::Cells;
    let path = run.join("rows.parquet");
    let mut rows = parquet::read_rows(&path, "landings.csv").unwrap();
    let falls = rows.columns.iter_mut().find(|column| column.name == "falls").unwrap();
    match &mut falls.cells {
        Cells::Numbers(counts) => counts[0] = counts[0].map(|count| count + 1.0),
        Cells::Text(_) => unreachable!("counts are numbers"),
    }
    let before = manifest::sha256(&fs::read(&path).unwrap());
    let bytes = parquet::rows(&path, &rows).unwrap();
    fs::write(&path, &bytes).unwrap();
    replaced(&run.join("manifest.json"), &before, &manifest::sha256(&bytes));
}

#[test]
fn rows_altered_with_their_hash_are_a_likely_cause_and_the_data_file_proves_it() {
    let (place, run) = copied();
    with_another_count(&run);
    let replay = ratewright(place.path(), &["replay", "landings.run"]);
    assert_eq!(replay.status.code(), Some(3), "{}", err(&replay));
    let told = unwrapped(&out(&replay));
    assert!(
        told.contains("rows.parquet was altered after the run and its hash"),
        "{told}"
    );
    let replay = ratewright(place.path(), &["replay", "landings.run", "--data", "landings.csv"]);
    assert_eq!(replay.status.code(), Some(3), "{}", err(&replay));
    let told = unwrapped(&out(&replay));
    assert!(
        told.contains("rows.parquet and its hash in manifest.json were altered after the run"),
        "{told}"
    );
}

#[test]
fn a_replay_of_data_that_moved_on_tells_the_row() {
    let (place, _) = copied();
    let same = ratewright(place.path(), &["replay", "landings.run", "--data", "landings.csv"]);
    assert_eq!(same.status.code(), Some(0), "{}{}", out(&same), err(&same));
    let table = fs::read_to_string(place.path().join("landings.csv")).unwrap();
    let second_row = table.lines().nth(2).unwrap().to_owned();
    let moved = second_row.replace(",autumn,", ",autumn,1");
    fs::write(place.path().join("landings.csv"), table.replace(&second_row, &moved)).unwrap();
    let replay = ratewright(place.path(), &["replay", "landings.run", "--data", "landings.csv"]);
    assert_eq!(replay.status.code(), Some(3));
    insta::assert_snapshot!(out(&replay));
}

#[test]
fn a_replay_of_something_else_is_wrong_input() {
    let place = place();
    for run in [".", "landings.csv", "no such.run"] {
        let replay = ratewright(place.path(), &["replay", run]);
        assert_eq!(replay.status.code(), Some(2), "{run}: {}", err(&replay));
        assert!(err(&replay).contains("manifest.json"), "{}", err(&replay));
    }
}
