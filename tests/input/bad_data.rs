//! What the program says to tables that it cannot use: one checked-in file for each mistake, one
//! snapshot for each message.

use crate::study::*;
use proptest::prelude::*;
use ratewright::design;
use ratewright::diagnostic::{Diagnostic, Place};
use ratewright::output::diagnostic;
use ratewright::spec::{self, At, Centre, Chances, Covariate, RowsWithGaps, Spec};
use ratewright::table::{Table, TableError, parse_csv, read_csv};
use std::collections::BTreeSet;
use std::path::PathBuf;

/// Diagnostics as plain lines.
fn lines(diagnostics: &[Diagnostic]) -> String {
    let mut text = String::new();
    for diagnostic in diagnostics {
        text.push_str(&format!("[{}] {}\n", diagnostic.code, diagnostic.message));
        for place in &diagnostic.places {
            text.push_str(&match place {
                Place::File { file } => format!("  at {file}\n"),
                Place::Spec { file, span, label } => format!("  at {file} {span:?}: {label}\n"),
                Place::Cell {
                    file,
                    line,
                    column,
                    value,
                } => format!(
                    "  at {file}{}{}{}\n",
                    line.map(|line| format!(", line {line}")).unwrap_or_default(),
                    column
                        .as_ref()
                        .map(|name| format!(", column {name}"))
                        .unwrap_or_default(),
                    value.as_ref().map(|value| format!(": {value:?}")).unwrap_or_default(),
                ),
            });
        }
        if diagnostic.places_in_all > diagnostic.places.len() {
            text.push_str(&format!("  {} places in all\n", diagnostic.places_in_all));
        }
        text.push_str(&format!("  help: {}\n", diagnostic.help));
    }
    text
}

fn path(file: &str) -> PathBuf {
    PathBuf::from(env!("CARGO_MANIFEST_DIR"))
        .join("tests/bad_data")
        .join(file)
}

fn read(file: &str) -> Result<Table, TableError> {
    read_csv(file, &path(file))
}

#[test]
fn what_is_no_regular_file_is_refused_before_it_is_read() {
    for no_file in ["/dev/zero", env!("CARGO_MANIFEST_DIR")] {
        let error = read_csv("data.csv", &PathBuf::from(no_file)).expect_err(no_file);
        let told = lines(&error.diagnostics());
        assert!(
            told.contains("[data-unreadable] the data file cannot be read: it is a"),
            "{told}"
        );
    }
}

/// What is said to a file that is no table.
fn unreadable(file: &str) -> String {
    lines(&read(file).expect_err("no table").diagnostics())
}

/// What is said to a table that does not fit the study.
fn unfit(file: &str, spec: &Spec) -> String {
    let table = read(file).unwrap_or_else(|error| panic!("{error}"));
    lines(&design::build(spec, &table).expect_err("no design").diagnostics())
}

fn with(covariates: Vec<Covariate>) -> Spec {
    Spec { covariates, ..study() }
}

#[test]
fn byte_order_mark_line_endings_and_blank_lines_are_no_problem() {
    let plain = read("good_bom.csv").unwrap();
    assert_eq!(plain.columns[0].name, "landing");
    assert_eq!(plain.lines, [2, 3, 4, 5]);
    let crlf = read("good_crlf.csv").unwrap();
    assert_eq!(crlf.columns, plain.columns);
    // A blank line stands before the third row.
    assert_eq!(crlf.lines, [2, 3, 5, 6]);
    let untidy = read("good_spaces_and_blank_lines.csv").unwrap();
    assert_eq!(untidy.columns[1..], plain.columns[1..]);
    assert_eq!(untidy.columns[0].label(1), "Birch, north\nend");
    assert_eq!(untidy.lines, [4, 6, 8, 10]);
    let spec = with(vec![category("decking", "plain"), number("slope", Centre::Mean, 1.0)]);
    assert!(design::build(&spec, &untidy).is_ok());
}

#[test]
fn no_incident_at_all_is_an_outcome_like_any_other() {
    let design = design::build(&study(), &read("all_zero.csv").unwrap()).unwrap();
    assert!(design.counts.iter().all(|count| count.to_bits() == 0));
}

#[test]
fn files_that_are_no_tables() {
    for file in [
        "latin1.csv",
        "utf16.csv",
        "nul.csv",
        "empty.csv",
        "blank_lines_only.csv",
        "header_only.csv",
        "repeated_columns.csv",
        "unnamed_column.csv",
        "ragged.csv",
        "ragged_often.csv",
        "semicolons.csv",
        "tabs.csv",
        "unclosed_quote.csv",
    ] {
        insta::assert_snapshot!(file, unreadable(file));
    }
}

#[test]
fn a_file_that_is_not_there() {
    // What follows the colon is the system's own wording.
    let said = unreadable("no_such_file.csv");
    assert!(
        said.starts_with("[data-unreadable] the data file cannot be read: "),
        "{said}"
    );
}

#[test]
fn columns_that_the_table_lacks() {
    let mut spec = with(vec![category("deckng", "plain"), number("tide", Centre::Mean, 1.0)]);
    spec.incidents.column = At {
        value: "Falls".to_owned(),
        span: 40..47,
    };
    insta::assert_snapshot!(unfit("good_bom.csv", &spec));
}

#[test]
fn cells_without_a_value() {
    let mut spec = with(vec![category("decking", "plain")]);
    spec.data.gap_marks = vec!["NA".to_owned()];
    insta::assert_snapshot!(unfit("gaps.csv", &spec));
    spec.data.rows_with_gaps = RowsWithGaps::Drop;
    insta::assert_snapshot!("dropping_leaves_one_level", unfit("gaps.csv", &spec));
}

#[test]
fn counts_that_are_none() {
    insta::assert_snapshot!(unfit("counts.csv", &study()));
    insta::assert_snapshot!("huge_cells", unfit("huge_cells.csv", &study()));
}

#[test]
fn exposures_that_are_none() {
    let mut spec = study();
    if let Some(exposure) = &mut spec.exposure {
        exposure.chances = Chances::OneIncidentEach;
    }
    insta::assert_snapshot!(unfit("exposure.csv", &spec));
}

#[test]
fn rows_that_stand_for_no_number_of_rows_or_too_many() {
    let mut spec = study();
    spec.data.stands_for = Some(at("alike"));
    insta::assert_snapshot!(unfit("stands_for.csv", &spec));
}

#[test]
fn numbers_that_are_none() {
    let spec = with(vec![
        number("slope", Centre::Mean, 1.0),
        log_number("queue", Centre::Mean),
        number("tide", Centre::Value(0.0), 1.0),
    ]);
    insta::assert_snapshot!(unfit("covariates.csv", &spec));
    let spec = with(vec![number("tide", Centre::Value(0.0), 1.0)]);
    insta::assert_snapshot!("far_from_its_centre", unfit("covariates.csv", &spec));
}

#[test]
fn columns_that_do_not_vary() {
    let spec = with(vec![
        number("slope", Centre::Mean, 1.0),
        category("decking", "plain"),
        log_number("queue", Centre::Mean),
    ]);
    insta::assert_snapshot!(unfit("constant.csv", &spec));
}

#[test]
fn terms_that_others_determine() {
    let spec = with(vec![
        number("plain_share", Centre::Mean, 10.0),
        number("grooved_share", Centre::Mean, 10.0),
        number("mesh_share", Centre::Mean, 10.0),
        category("decking", "plain"),
        category("season", "summer"),
    ]);
    insta::assert_snapshot!(unfit("collinear.csv", &spec));
    let mut spec = with(vec![category("decking", "plain"), category("season", "summer")]);
    spec.joints = vec![joint("decking", "season")];
    insta::assert_snapshot!("joint_of_the_same", unfit("collinear.csv", &spec));
}

#[test]
fn more_coefficients_than_rows_and_an_answer_that_is_no_term() {
    let mut spec = with(vec![category("decking", "plain"), number("slope", Centre::Mean, 1.0)]);
    spec.study.answer = at("decking=groved");
    insta::assert_snapshot!(unfit("few_rows.csv", &spec));
}

/// Twenty kilobytes that would have asked for ten gigabytes of coded columns.
#[test]
fn a_joint_term_of_two_long_categories_is_refused_before_it_is_made() {
    let mut text = "landing,falls,boardings,decking,season\n".to_owned();
    for row in 0..1_200 {
        text.push_str(&format!("L{row},1,10,d{},s{}\n", row % 900, row % 800));
    }
    let mut spec = with(vec![category("decking", "d0"), category("season", "s0")]);
    spec.joints = vec![joint("decking", "season")];
    let error = design::build(&spec, &parse_csv("long.csv", text.as_bytes()).unwrap()).unwrap_err();
    let told = error.diagnostics();
    assert_eq!((told.len(), told[0].code), (1, "too-many-terms"));
    assert!(told[0].message.contains("720000 coefficients"), "{}", told[0].message);
}

#[test]
fn levels_that_no_row_has() {
    let mut spec = with(vec![
        category("decking", "plain"),
        merged("season", "spring", "warm", &["summer", "Sumer", "winter"]),
    ]);
    insta::assert_snapshot!(unfit("levels.csv", &spec));
    spec.data.keep = vec![keep_levels("season", &["sprng", "summer", "winter"])];
    spec.covariates.clear();
    insta::assert_snapshot!("levels_to_keep", unfit("levels.csv", &spec));
}

#[test]
fn a_category_that_names_every_row() {
    let mut spec = with(vec![category("manager", "M0")]);
    spec.study.answer = at("manager=M1");
    insta::assert_snapshot!(unfit("names_as_category.csv", &spec));
}

#[test]
fn names_that_belong_to_other_parameters() {
    let spec = with(vec![
        number("scatter", Centre::Mean, 1.0),
        number("baseline", Centre::Mean, 1.0),
        category("deck", "a"),
        number("deck=b", Centre::Mean, 1.0),
    ]);
    insta::assert_snapshot!(unfit("taken_names.csv", &spec));
}

#[test]
fn a_joint_term_of_no_covariate() {
    let mut spec = with(vec![category("decking", "plain")]);
    spec.joints = vec![joint("decking", "slope")];
    insta::assert_snapshot!(unfit("good_bom.csv", &spec));
}

#[test]
fn rows_kept_by_what_is_no_number_and_rows_all_left_out() {
    let mut spec = study();
    spec.data.keep = vec![keep_numbers("slope", Some(1.0), None)];
    insta::assert_snapshot!(unfit("keep.csv", &spec));
    spec.data.keep = vec![
        keep_levels("season", &["spring"]),
        keep_numbers("boardings", None, Some(10.0)),
    ];
    insta::assert_snapshot!("no_row_left", unfit("keep.csv", &spec));
}

/// The same messages as a person reads them: each place shows the characters of the spec.
#[test]
fn places_in_the_spec_are_the_characters_at_fault() {
    let text = std::fs::read_to_string(path("misfit.toml")).unwrap();
    let spec = spec::parse("misfit.toml", &text).unwrap_or_else(|error| panic!("{error}"));
    let error = design::build(&spec, &read("levels.csv").unwrap()).unwrap_err();
    insta::assert_snapshot!(diagnostic::render(
        &error.diagnostics(),
        Some(&spec.source),
        diagnostic::Look::Plain
    ));
}

#[test]
fn every_code_has_an_entry_in_the_docs() {
    let docs = std::fs::read_to_string(PathBuf::from(env!("CARGO_MANIFEST_DIR")).join("docs/problems.md")).unwrap();
    let mut codes = BTreeSet::new();
    for snapshot in std::fs::read_dir(path("../input/snapshots")).unwrap() {
        let snapshot = snapshot.unwrap();
        if snapshot.file_name().to_string_lossy().starts_with("input__bad_data__") {
            let text = std::fs::read_to_string(snapshot.path()).unwrap();
            let named = text.lines().filter_map(|line| line.strip_prefix('[')?.split_once(']'));
            codes.extend(named.map(|(code, _)| code.to_owned()));
        }
    }
    assert!(codes.len() > 30, "snapshots are missing: {codes:?}");
    for code in codes {
        assert!(docs.contains(&format!("### `{code}`\n")), "no entry for {code}");
    }
}

proptest! {
    #![proptest_config(ProptestConfig { cases: 2000, failure_persistence: None, ..ProptestConfig::default() })]

    #[test]
    fn no_bytes_make_the_reader_panic(bytes in proptest::collection::vec(any::<u8>(), 0..400)) {
        let _ = parse_csv("any.csv", &bytes);
    }

    #[test]
    fn no_text_of_separators_and_quotes_makes_the_reader_panic(text in "[a,;\t\"\r\n é\u{0}\u{FEFF}1-]{0,80}") {
        if let Ok(table) = parse_csv("any.csv", text.as_bytes()) {
            prop_assert!(table.rows() > 0);
            for column in &table.columns {
                prop_assert!((0..table.rows()).all(|row| column.label(row).trim() == column.label(row)));
            }
            prop_assert!(table.lines.windows(2).all(|pair| pair[0] < pair[1]));
        }
    }

    #[test]
    fn no_cells_make_the_design_panic(
        cells in proptest::collection::vec(
            prop_oneof!["[-+0-9.einfa,]{0,6}", "[a-c]", "0", "1", "-", "1e308", "-1e308", "1e-320", "NA"].prop_map(|cell| cell.replace(',', "")),
            4..60,
        ),
        drop in any::<bool>(),
    ) {
        let mut text = "landing,falls,boardings,decking,slope\n".to_owned();
        for row in cells.chunks_exact(4) {
            text.push_str(&format!("x{},{},{},{},{}\n", row[0], row[0], row[1], row[2], row[3]));
        }
        let table = table(&text);
        let mut spec = with(vec![category("decking", "a"), number("slope", Centre::Mean, 1e-3), log_number("boardings", Centre::Mean)]);
        spec.joints = vec![joint("decking", "slope")];
        spec.data.gap_marks = vec!["NA".to_owned()];
        spec.data.rows_with_gaps = if drop { RowsWithGaps::Drop } else { RowsWithGaps::Refuse };
        match design::build(&spec, &table) {
            Ok(design) => prop_assert!(design.columns.iter().flatten().all(|value| value.is_finite())),
            Err(error) => prop_assert!(error.diagnostics().iter().all(|told| !told.message.is_empty() && !told.help.is_empty())),
        }
    }
}
