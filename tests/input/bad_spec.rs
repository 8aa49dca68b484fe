//! Every fault of a spec, each with a file of its own and the message that a person reads.

use std::collections::BTreeSet;
use std::io::Write;
use std::path::{Path, PathBuf};

use proptest::prelude::*;
use proptest::test_runner::FileFailurePersistence;
use ratewright::output::diagnostic::{Look, render};
use ratewright::spec::{SpecError, SpecFault, parse, read};

fn folder() -> PathBuf {
    Path::new(env!("CARGO_MANIFEST_DIR")).join("tests/bad_spec")
}

/// Files of the folder, by name.
fn files() -> Vec<String> {
    let mut names: Vec<String> = std::fs::read_dir(folder())
        .expect("the folder is there")
        .map(|entry| entry.expect("readable").file_name().into_string().expect("plain name"))
        .filter(|name| name.ends_with(".toml"))
        .collect();
    names.sort();
    names
}

/// The error of a file, under its bare name.
fn error_of(name: &str) -> SpecError {
    let mut error = read(&folder().join(name)).expect_err(name);
    error.source.file = name.to_string();
    error
}

fn message_of(error: &SpecError) -> String {
    render(&error.diagnostics(), Some(&error.source), Look::Plain)
}

#[test]
fn every_bad_file_has_its_message() {
    for name in files() {
        let message = message_of(&error_of(&name));
        insta::with_settings!({ snapshot_path => "../bad_spec/snapshots", prepend_module_to_snapshot => false }, {
            insta::assert_snapshot!(name.trim_end_matches(".toml"), message);
        });
    }
}

#[test]
fn every_kind_of_fault_has_a_file_and_an_entry_in_the_docs() {
    let mut codes: BTreeSet<&str> = BTreeSet::new();
    for name in files() {
        codes.extend(error_of(&name).faults.iter().map(|fault| fault.code()));
    }
    let missing = read(Path::new("no such file.toml")).expect_err("it is not there");
    codes.extend(missing.faults.iter().map(|fault| fault.code()));
    let table = parse("landings.csv", "landing,falls\n").expect_err("a table");
    codes.extend(table.faults.iter().map(|fault| fault.code()));
    codes.extend(a_large_file().faults.iter().map(|fault| fault.code()));
    // Both sides: a fault without a file, and an entry of a fault that no longer exists.
    let problems = include_str!("../../docs/problems.md");
    let part = problems
        .split("\n## ")
        .find(|part| part.starts_with("Spec\n"))
        .expect("a part about the spec");
    let entries: BTreeSet<&str> = part
        .lines()
        .filter_map(|line| line.strip_prefix("### `")?.strip_suffix('`'))
        .collect();
    assert_eq!(codes, entries);
}

#[test]
fn messages_of_ours_stay_within_80_columns_and_end_with_what_to_do() {
    for name in files() {
        let message = message_of(&error_of(&name));
        for line in message.lines() {
            assert!(line.chars().count() <= 80, "{name}: {line}");
        }
        assert!(message.contains("What to do:"), "{name}");
        assert!(
            !message.chars().any(|letter| letter.is_control() && letter != '\n'),
            "{name}"
        );
    }
}

#[test]
fn colour_adds_escape_sequences_and_no_word() {
    for name in files() {
        let error = error_of(&name);
        let styled = render(&error.diagnostics(), Some(&error.source), Look::Styled);
        assert_eq!(
            anstream::adapter::strip_str(&styled).to_string(),
            message_of(&error),
            "{name}"
        );
        assert_ne!(styled, message_of(&error), "{name}");
    }
}

/// The error of a file larger than any spec.
fn a_large_file() -> SpecError {
    let mut file = tempfile::NamedTempFile::new().expect("a file");
    file.write_all("# nothing\n".repeat(200_000).as_bytes())
        .expect("written");
    read(file.path()).expect_err("no spec")
}

#[test]
fn a_table_in_place_of_the_spec_is_told() {
    let folder = tempfile::tempdir().expect("a folder");
    let rows = "landing,falls,boardings\nA,3,120\nB,0,90\n";
    let files: [(&str, Vec<u8>); 7] = [
        ("pools.csv", rows.into()),
        ("pools", format!("\u{feff}{}", rows.replace(',', ";")).into()),
        ("pools.dat", rows.replace(',', "\t").into()),
        ("large.csv", rows.repeat(50_000).into()),
        ("one_column.CSV", "falls\n3\n".into()),
        ("latin.csv", b"landing,falls\nB\xE4der,3\n".to_vec()),
        ("pools.xlsx", b"PK\x03\x04\xFF\xFE\x00\x00".to_vec()),
    ];
    for (name, bytes) in files {
        let path = folder.path().join(name);
        std::fs::write(&path, bytes).expect("written");
        let error = read(&path).expect_err(name);
        assert_eq!(error.faults, [SpecFault::IsTable], "{name}");
        let message = message_of(&error);
        assert!(
            message.contains("Problem: a table was named in place of the spec"),
            "{message}"
        );
        assert!(message.contains("ratewright draft TABLE"), "{message}");
    }
    // A spec with a slip stays one, by whatever name.
    let text = GOOD.replacen("title    = \"", "title    = ", 1);
    assert!(matches!(
        parse("spec.csv", &text).expect_err("no TOML").faults[0],
        SpecFault::Syntax { .. }
    ));
}

#[test]
fn a_file_larger_than_any_spec_is_told() {
    let message = message_of(&a_large_file());
    assert!(
        message.starts_with("Problem: the spec is larger than 1,048,576 bytes"),
        "{message}"
    );
}

#[test]
fn ten_places_that_are_no_toml_are_shown_and_the_rest_counted() {
    let error = parse("s.toml", &"[study]\nnonsense\n".repeat(80)).expect_err("no TOML");
    let message = message_of(&error);
    assert_eq!(message.matches(" --> s.toml").count(), 10, "{message}");
    assert!(message.contains("more places"), "{message}");
}

#[test]
fn deep_nesting_is_refused_and_does_not_exhaust_the_stack() {
    for text in [
        "a = ".to_string() + &"[".repeat(100_000),
        "a = ".to_string() + &"{ a = ".repeat(100_000),
        "a.".repeat(100_000) + "a = 1",
        format!("[{}a]", "a.".repeat(100_000)),
        format!("[[{}a]]", "a.".repeat(100_000)),
    ] {
        let error = parse("deep.toml", &text).expect_err("no spec");
        assert!(
            render(&error.diagnostics(), Some(&error.source), Look::Plain)
                .lines()
                .count()
                < 80
        );
    }
}

#[test]
fn a_file_that_is_not_there_or_is_a_folder_is_told() {
    let told = |path: &Path| message_of(&read(path).expect_err("not a spec"));
    assert!(told(Path::new("no such file.toml")).contains("no such file.toml"));
    let folder = told(Path::new(env!("CARGO_MANIFEST_DIR")));
    assert!(folder.contains("(spec-unreadable)"), "{folder}");
    let device = told(Path::new("/dev/zero"));
    assert!(device.contains("it is a device or a pipe"), "{device}");
}

#[test]
fn a_fault_says_all_in_one_line_too() {
    let error = error_of("range-reversed.toml");
    assert_eq!(
        error.to_string(),
        "the spec range-reversed.toml cannot be used: the range `plausible_ratio` in [[covariate]] is reversed"
    );
}

const GOOD: &str = include_str!("../../src/spec/example.toml");

/// Parses and renders; either outcome is right as long as it is one.
fn survives(text: &str) {
    if let Err(error) = parse("any.toml", text) {
        assert!(!error.faults.is_empty());
        for look in [Look::Plain, Look::Styled] {
            assert!(!render(&error.diagnostics(), Some(&error.source), look).is_empty());
        }
        assert!(!render(&error.diagnostics(), None, Look::Plain).is_empty());
    }
}

proptest! {
    #![proptest_config(ProptestConfig {
        cases: 2000,
        failure_persistence: Some(Box::new(FileFailurePersistence::WithSource("regressions"))),
        ..ProptestConfig::default()
    })]

    #[test]
    fn no_text_makes_it_panic(text in "\\PC{0,200}") {
        survives(&text);
    }

    #[test]
    fn no_toml_like_text_makes_it_panic(
        text in "(\u{feff})?(\\[{0,2}[a-z_]{0,9}\\]{0,2}|[a-z_\"]{0,9} = [\\[\\]{}0-9a-z\"'.,_+=\u{e4}-]{0,12}|\t|\r|\n|\n){0,40}"
    ) {
        survives(&text);
    }

    #[test]
    fn no_cut_or_change_of_a_good_spec_makes_it_panic(
        at in 0..GOOD.len(),
        cut in 0usize..30,
        put in "([\\[\\]{}=\"'#\n.]|nan|inf|-1|1e999|0x7|true|1979-05-27|\u{65e5}|mean|earlier){0,3}",
    ) {
        let end = (at + cut).min(GOOD.len());
        survives(&format!("{}{put}{}", &GOOD[..at], &GOOD[end..]));
    }

    #[test]
    fn no_exchange_of_two_lines_makes_it_panic(a in 0usize..60, b in 0usize..60) {
        let mut lines: Vec<&str> = GOOD.lines().collect();
        let (a, b) = (a % lines.len(), b % lines.len());
        lines.swap(a, b);
        survives(&lines.join("\n"));
    }
}
