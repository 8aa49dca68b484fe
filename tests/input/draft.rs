//! Starter specs for tables that nobody prepared: each must hold as it is written.

use proptest::prelude::*;
use ratewright::design::{DraftFault, draft};
use ratewright::table::{Table, parse_csv, read_csv};
use std::path::PathBuf;

fn table(text: &str) -> Table {
    parse_csv("counts.csv", text.as_bytes()).expect("a table that can be read")
}

fn untidy() -> Table {
    let path = PathBuf::from(env!("CARGO_MANIFEST_DIR")).join("tests/drafts/untidy.csv");
    read_csv("untidy.csv", &path).expect("a table that can be read")
}

/// The lines of a draft that hold one of its keys.
fn value<'t>(text: &'t str, key: &str) -> Vec<&'t str> {
    let start = format!("{key} = ");
    text.lines().filter_map(|line| line.strip_prefix(&start)).collect()
}

#[test]
fn an_untidy_table_gets_a_spec_that_holds() {
    let drafted = draft(&untidy()).unwrap_or_else(|error| panic!("{error}"));
    insta::assert_snapshot!(drafted.text);
    let names: Vec<&str> = drafted.design.terms.iter().map(|term| term.name.as_str()).collect();
    insta::assert_snapshot!("terms_of_the_untidy_table", names.join("\n"));
    assert_eq!(drafted.design.audit.rows_not_kept, 1);
    assert_eq!(draft(&untidy()).unwrap(), drafted);
}

#[test]
fn what_can_be_seen_in_the_names_and_cells_is_used() {
    let text = "site,month,incidents,population,programme\nA,1,4,1500,0\nA,2,3,1400,1\nB,1,0,800,0\nB,2,1,900,1\nC,1,2,700,0\nC,2,2,650,1\n\
                D,1,2,700,0\nD,2,0,650,1\nE,1,1,700,0\nE,2,1,650,1\n";
    let drafted = draft(&table(text)).unwrap();
    assert_eq!(drafted.spec.incidents.column.value, "incidents");
    assert_eq!(drafted.spec.data.unit.value, "site");
    assert_eq!(
        drafted.spec.data.period.as_ref().map(|period| period.value.as_str()),
        Some("month")
    );
    let exposure = drafted.spec.exposure.as_ref().unwrap();
    // 16 incidents in 8,650 people: 1.85 in a thousand, by hand.
    assert_eq!((exposure.column.value.as_str(), exposure.per), ("population", 1000.0));
    assert_eq!(value(&drafted.text, "plausible_rate"), ["[0.062, 55]"]);
    assert_eq!(drafted.spec.study.answer.value, "programme=1");
}

#[test]
fn the_classic_tables_are_read_as_meant() {
    for (file, unit, incidents, exposure) in [
        ("ships.csv", "cell", "incidents", Some("service")),
        ("insurance.csv", "cell", "Claims", Some("Holders")),
        ("quine.csv", "pupil", "Days", None),
        ("clinic.csv", "unit", "events", Some("years")),
    ] {
        let path = PathBuf::from(env!("CARGO_MANIFEST_DIR"))
            .join("tests/reference")
            .join(file);
        let drafted = draft(&read_csv(file, &path).unwrap()).unwrap_or_else(|error| panic!("{file}: {error}"));
        assert_eq!(drafted.spec.data.unit.value, unit);
        assert_eq!(drafted.spec.incidents.column.value, incidents);
        assert_eq!(
            drafted.spec.exposure.map(|exposure| exposure.column.value).as_deref(),
            exposure
        );
        insta::assert_snapshot!(format!("terms_of_{file}"), drafted.design.coding.terms.join("\n"));
    }
}

#[test]
fn without_a_name_that_helps_whole_numbers_are_counts_and_rows_their_own_exposure() {
    let drafted = draft(&table("who,q1,q2\nred,3,0.5\nblue,0,1.5\ngreen,2,2.5\ngrey,4,2.1\n")).unwrap();
    assert_eq!(drafted.spec.incidents.column.value, "q1");
    assert!(drafted.text.contains("a guess: whole numbers from 0"));
    assert_eq!(drafted.spec.exposure, None);
    assert_eq!(drafted.spec.study.answer.value, "baseline");
}

#[test]
fn years_row_numbers_and_labels_are_no_counts() {
    let drafted = draft(&table("row,year,code,events\n1,2030,7,0\n2,2031,9,3\n3,2032,8,1\n")).unwrap();
    assert_eq!(drafted.spec.incidents.column.value, "events");
    assert_eq!(drafted.spec.data.unit.value, "code");
}

#[test]
fn names_that_need_quoting_are_quoted() {
    let text = "\"site \"\"A\"\"\",\"falls\nin all\",\"visits\\\"\nx,1,10\ny,0,30\nz,2,20\n";
    let drafted = draft(&table(text)).unwrap();
    assert_eq!(drafted.spec.data.unit.value, "site \"A\"");
    assert_eq!(drafted.spec.incidents.column.value, "falls\nin all");
    assert_eq!(drafted.spec.exposure.unwrap().column.value, "visits\\");
}

#[test]
fn signs_that_turn_the_text_are_escaped_in_comments_too() {
    let mut text = "site\u{202E},falls,visits,wet\u{2067}floor,note\u{2028}s\u{1B}[2J\n".to_owned();
    for row in 0..30 {
        let wet = ["y\u{200F}es", "no"][row % 2];
        text.push_str(&format!("s{row},{},{},{wet},remark {row}\n", row % 3, 100 + row));
    }
    let drafted = draft(&table(&text)).unwrap();
    let told = |sign: char| !matches!(sign, '\n' | '…') && (sign.is_control() || !sign.is_ascii());
    assert_eq!(drafted.text.chars().find(|&sign| told(sign)), None, "{}", drafted.text);
    assert!(
        drafted.text.contains("# - \"note\\u2028s\\u001B[2J\": a text with 30"),
        "{}",
        drafted.text
    );
    // What was escaped reads as it was.
    assert_eq!(drafted.spec.data.unit.value, "site\u{202E}");
    assert_eq!(drafted.spec.covariates[0].column.value, "wet\u{2067}floor");
}

#[test]
fn incidents_without_exposure_are_told_aloud() {
    let drafted = draft(&table("site,falls,visits\na,1,0\nb,0,0\nc,3,50\nd,1,20\n")).unwrap();
    assert!(
        drafted.text.contains("# Of them with incidents all the same: 1."),
        "{}",
        drafted.text
    );
    assert_eq!(drafted.design.audit.rows_not_kept, 2);
}

#[test]
fn a_table_without_an_incident_still_gets_a_range() {
    let drafted = draft(&table("site,falls,visits\na,0,100\nb,0,50\nc,0,50\n")).unwrap();
    // Half an incident in 200 visits: 2.5 in a thousand, a thirtieth and thirty times it, by hand.
    assert_eq!(value(&drafted.text, "plausible_rate"), ["[0.083, 75]"]);
}

#[test]
fn a_table_without_counts_is_refused_with_what_spoils_them() {
    let error = draft(&table("site,falls,score\na,<5,0.5\nb,12,1.5\n")).unwrap_err();
    match &error.fault {
        DraftFault::NoCount { spoilt } => {
            assert_eq!((spoilt[0].line, spoilt[0].value.as_str()), (2, "<5"));
        }
        other => panic!("{other:?}"),
    }
    assert_eq!(error.diagnostics()[0].code, "draft-no-count");
    let error = draft(&table("falls\n3\n1\n")).unwrap_err();
    assert_eq!(error.diagnostics()[0].code, "draft-no-unit");
    let docs = std::fs::read_to_string(PathBuf::from(env!("CARGO_MANIFEST_DIR")).join("docs/problems.md")).unwrap();
    for code in ["draft-no-count", "draft-bad-exposure", "draft-no-unit"] {
        assert!(docs.contains(&format!("### `{code}`\n")), "no entry for {code}");
    }
}

/// A table of 40 rows, one column of which is given, with what the 21st of its cells is in line 22.
fn forty(header: &str, cell: &str, clean: impl Fn(usize) -> String) -> Table {
    let mut text = format!("site,falls,{header}\n");
    for row in 0..40 {
        let value = if row == 20 { cell.to_owned() } else { clean(row) };
        text.push_str(&format!("s{row},{},{value}\n", row % 4));
    }
    table(&text)
}

#[test]
fn a_cell_that_spoils_the_exposure_is_told() {
    for cell in ["-3", "\"1,234\"", "inf", "NAN", "1e400", "12 km"] {
        for header in ["boardings", "exposure", "hours"] {
            let error = draft(&forty(header, cell, |row| (100 + 7 * row).to_string())).unwrap_err();
            let DraftFault::BadExposure { cells } = &error.fault else {
                panic!("{header} {cell}: {error:?}")
            };
            assert_eq!(cells.len(), 1, "{header} {cell}");
            assert_eq!(
                (cells[0].line, cells[0].column.as_str(), cells[0].value.as_str()),
                (22, header, cell.trim_matches('"'))
            );
            assert_eq!(error.diagnostics()[0].code, "draft-bad-exposure");
        }
    }
    // Separators in every row: all are counted, the first ten shown.
    let error = draft(&forty("boardings", "\"9,999\"", |row| format!("\"1,{:03}\"", 7 * row))).unwrap_err();
    let told = &error.diagnostics()[0];
    assert_eq!((told.places.len(), told.places_in_all), (10, 40));
}

#[test]
fn a_name_for_opportunity_over_something_else_is_no_exposure() {
    let by_turns = |values: [&'static str; 3]| move |row: usize| values[row % 3].to_owned();
    for (header, clean) in [
        ("service", by_turns(["bus", "ferry", "tram"])),
        ("time", by_turns(["08:30", "12:15", "17:45"])),
        ("time", by_turns(["-2", "0", "3"])),
    ] {
        let drafted = draft(&forty(header, &clean(20), clean)).unwrap();
        assert_eq!(drafted.spec.exposure, None, "{header}");
        assert!(
            drafted.text.contains("# No column looks like an exposure"),
            "{}",
            drafted.text
        );
    }
    // A clean column is taken before an equal one that is spoilt.
    let drafted = draft(&table(
        "site,falls,people,visits\na,1,x,10\nb,0,20,30\nc,2,30,20\nd,1,40,20\n",
    ))
    .unwrap();
    assert_eq!(drafted.spec.exposure.unwrap().column.value, "visits");
}

#[test]
fn spoilt_counts_are_told_and_no_other_column_steps_in() {
    let error = draft(&table("site,falls,doors\na,-3,2\nb,12,4\nc,1,3\n")).unwrap_err();
    match &error.fault {
        DraftFault::NoCount { spoilt } => assert_eq!((spoilt[0].line, spoilt[0].value.as_str()), (2, "-3")),
        other => panic!("{other:?}"),
    }
}

#[test]
fn what_spoils_a_column_of_numbers_is_told() {
    for (cell, told) in [
        (
            "inf",
            "# - \"depth\": a column of numbers, but 1 cell is no number: inf in line 22",
        ),
        (
            "NAN",
            "# - \"depth\": a column of numbers, but 1 cell is no number: NAN in line 22",
        ),
        (
            "3 m",
            "# - \"depth\": a column of numbers, but 1 cell is no number: 3 m in line 22",
        ),
    ] {
        let drafted = draft(&forty("depth", cell, |row| format!("{row}.5"))).unwrap();
        assert!(drafted.text.contains(told), "{}", drafted.text);
    }
    // Few values, one of them infinite: it is no level.
    let drafted = draft(&forty("depth", "inf", |row| (row % 3).to_string())).unwrap();
    assert!(drafted.text.contains("inf in line 22"), "{}", drafted.text);
    // A few numbers and a word are levels.
    let drafted = draft(&forty("doors", "many", |row| (row % 3).to_string())).unwrap();
    assert!(
        drafted.design.coding.terms.contains(&"doors=many".to_owned()),
        "{}",
        drafted.text
    );
}

#[test]
fn other_outcomes_are_no_covariates() {
    let mut text = "site,deaths,injuries,claim rate,claim_id,hours,falls programme\n".to_owned();
    for row in 0..40 {
        text.push_str(&format!(
            "s{row},{},{},{}.5,{},{},{}\n",
            row % 4,
            row % 7,
            row % 5,
            1000 + 3 * row,
            100 + 7 * row,
            row % 2
        ));
    }
    let drafted = draft(&table(&text)).unwrap();
    assert_eq!(drafted.spec.incidents.column.value, "deaths");
    assert_eq!(drafted.design.coding.terms, ["falls programme=1"]);
    for column in ["injuries", "claim rate"] {
        let told = format!("# - \"{column}\": it is named like incidents too, and another outcome is no cause");
        assert!(drafted.text.contains(&told), "{}", drafted.text);
    }
}

proptest! {
    #![proptest_config(ProptestConfig { cases: 400, failure_persistence: None, ..ProptestConfig::default() })]

    /// Whatever the table, the draft holds (it checks itself), or a message says why there is none.
    #[test]
    fn any_table_gets_a_draft_or_a_reason(
        names in proptest::collection::hash_set("[a-c]{1,2}|falls|visits|site|month|n|scatter|a=b|[\"'#\\\\]{1,3}", 1..7),
        cells in proptest::collection::vec(
            prop_oneof!["[0-9]{1,2}", "[a-c]", "0", "-?[0-9]\\.[0-9]", "NA", "", "1e300", "-"], 1..120),
    ) {
        let names: Vec<String> = names.into_iter().collect();
        let mut text = names.iter().map(|name| format!("\"{}\"", name.replace('"', "\"\""))).collect::<Vec<String>>().join(",");
        text.push('\n');
        for row in cells.chunks_exact(names.len()) {
            text.push_str(&row.iter().map(|cell| format!("\"{cell}\"")).collect::<Vec<String>>().join(","));
            text.push('\n');
        }
        let Ok(table) = parse_csv("any.csv", text.as_bytes()) else { return Ok(()) };
        match draft(&table) {
            Ok(drafted) => prop_assert!(drafted.text.contains("provisional = true")),
            Err(error) => {
                prop_assert!(matches!(error.fault, DraftFault::NoCount { .. } | DraftFault::BadExposure { .. } | DraftFault::NoUnit | DraftFault::NoDesign(_)), "{error}");
                prop_assert!(!error.diagnostics().is_empty());
            }
        }
    }
}
