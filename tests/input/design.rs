//! The design of a study: what each coding gives, and that a run's own rows give it again.

use crate::study::*;
use proptest::prelude::*;
use ratewright::design::{self, Audit, CellRule, ColumnCoding, Design, DesignFault};
use ratewright::spec::{Centre, Covariate, Data, Joint, RowsWithGaps, Spec, Standing};
use ratewright::table::{Cells, Table};

const LANDINGS: &str = "\
landing,month,falls,boardings,decking,slope,queue,season
Amber,2031-05,2,1000,plain,6,10,spring
Amber,2031-06,0,1500,plain,6,20,summer
Birch,2031-05,1,400,grooved,8,40,spring
Birch,2031-06,3,800,grooved,8,10,summer
Cedar,2031-05,0,900,mesh,13,80,spring
Cedar,2031-06,5,700,paint,12,20,summer
Delta,2031-05,1,650,plain,9,40,summer
Delta,2031-06,4,350,grooved,7,20,winter
";

fn built(spec: &Spec, table: &Table) -> Design {
    design::build(spec, table).unwrap_or_else(|error| panic!("{error}"))
}

fn names(design: &Design) -> Vec<&str> {
    design.terms.iter().map(|term| term.name.as_str()).collect()
}

#[test]
fn rows_units_and_offset_come_in_the_order_of_the_file() {
    let design = built(&study(), &table(LANDINGS));
    assert_eq!(design.counts, [2.0, 0.0, 1.0, 3.0, 0.0, 5.0, 1.0, 4.0]);
    assert_eq!(design.units, ["Amber", "Birch", "Cedar", "Delta"]);
    assert_eq!(design.unit_of, [0, 0, 1, 1, 2, 2, 3, 3]);
    assert_eq!(design.lines, [2, 3, 4, 5, 6, 7, 8, 9]);
    assert_eq!(design.stands_for, [1.0; 8]);
    // ln 1000 and ln 350, by Python 3.11 `math.log`.
    assert!((design.log_exposure[0] - 6.907_755_278_982_137).abs() < 1e-15);
    assert!((design.log_exposure[7] - 5.857_933_154_483_459).abs() < 1e-15);
    assert_eq!(design.coding.per, 1000.0);
    assert!(design.terms.is_empty());
}

#[test]
fn without_an_exposure_every_row_counts_as_one() {
    let spec = Spec {
        exposure: None,
        ..study()
    };
    let design = built(&spec, &table(LANDINGS));
    assert_eq!(design.exposure, [1.0; 8]);
    assert_eq!(design.log_exposure, [0.0; 8]);
    assert_eq!(design.coding.exposure_column, None);
}

#[test]
fn a_category_has_a_column_for_each_level_but_the_reference_and_merged_levels_share_one() {
    let mut spec = study();
    spec.covariates = vec![merged("decking", "plain", "other", &["mesh", "paint"])];
    let design = built(&spec, &table(LANDINGS));
    assert_eq!(names(&design), ["decking=grooved", "decking=other"]);
    assert_eq!(design.columns[0], [0.0, 0.0, 1.0, 1.0, 0.0, 0.0, 0.0, 1.0]);
    assert_eq!(design.columns[1], [0.0, 0.0, 0.0, 0.0, 1.0, 1.0, 0.0, 0.0]);
    assert_eq!(design.terms[1].change, "other (mesh, paint) against plain");
    // The central 95 % of a log-normal from 0.25 to 4: mean 0, sd ln 4 / 1.959963984540054.
    assert!(design.terms[0].prior_mean.abs() < 1e-15);
    assert!((design.terms[0].prior_sd - 1.386_294_361_119_890_6 / 1.959_963_984_540_054).abs() < 1e-15);
}

#[test]
fn a_merged_level_is_told_with_its_members() {
    let changes = |covariate: Covariate, joints: Vec<Joint>| {
        let mut spec = study();
        spec.covariates = vec![covariate, number("slope", Centre::Value(8.0), 2.0)];
        spec.joints = joints;
        let design = built(&spec, &table(LANDINGS));
        let remarks = design::remarks(&spec, &table(LANDINGS), &design);
        let merges = remarks
            .iter()
            .filter(|remark| remark.code() == "merged-into-level")
            .map(|remark| remark.to_string());
        (
            design
                .terms
                .iter()
                .map(|term| term.change.clone())
                .collect::<Vec<String>>(),
            merges.collect::<Vec<String>>(),
        )
    };
    // The name is itself a level.
    let (told, remarks) = changes(
        merged("decking", "plain", "grooved", &["mesh", "paint"]),
        vec![joint("decking", "slope")],
    );
    assert_eq!(told[0], "grooved (with mesh and paint) against plain");
    assert_eq!(
        told[2],
        "factor on the ratio of grooved (with mesh and paint) against plain, for each 2 more in slope"
    );
    assert_eq!(
        remarks,
        [
            "`merge` takes `mesh`, `paint` of `decking` into \"grooved\", which is itself a level of the file: they can no \
          longer be told apart. If that is meant, list \"grooved\" among its levels too; if not, choose a name that no \
          level has."
        ]
    );
    // So it is when the spec lists it, which shows that it is meant.
    let (told, remarks) = changes(
        merged("decking", "plain", "grooved", &["grooved", "mesh", "paint"]),
        vec![],
    );
    assert_eq!(told[0], "grooved (with mesh and paint) against plain");
    assert_eq!(remarks, [""; 0]);
    // The reference is merged.
    let (told, remarks) = changes(merged("decking", "plain", "plain", &["paint"]), vec![]);
    assert_eq!(
        told[..2],
        ["grooved against plain (with paint)", "mesh against plain (with paint)"]
    );
    assert_eq!(remarks.len(), 1);
    let (told, remarks) = changes(merged("decking", "smooth", "smooth", &["plain", "paint"]), vec![]);
    assert_eq!(told[0], "grooved against smooth (plain, paint)");
    assert_eq!(remarks, [""; 0]);
}

#[test]
fn a_number_counts_steps_from_its_centre_and_a_mean_weighs_each_row_once() {
    let mut spec = study();
    spec.data.stands_for = Some(at("queue"));
    spec.covariates = vec![number("slope", Centre::Mean, 2.0)];
    let design = built(&spec, &table(LANDINGS));
    // (6 + 6 + 8 + 8 + 13 + 12 + 9 + 7) / 8 = 8.625, by hand.
    assert_eq!(
        design.coding.covariates[0].coding,
        ColumnCoding::Number {
            centre: 8.625,
            step: 2.0
        }
    );
    assert_eq!(design.columns[0][4], 2.1875);
    assert_eq!(design.terms[0].change, "per 2 more in slope");
    assert_eq!(design.stands_for[4], 80.0);
}

#[test]
fn a_log_number_counts_doublings_from_its_geometric_mean() {
    let mut spec = study();
    spec.covariates = vec![log_number("queue", Centre::Mean)];
    let design = built(&spec, &table(LANDINGS));
    // The doublings above 10 are 0 1 2 0 3 1 2 1, their mean 1.25: centre 10 * 2^1.25, by hand.
    for (column, doublings) in design.columns[0].iter().zip([0.0, 1.0, 2.0, 0.0, 3.0, 1.0, 2.0, 1.0]) {
        assert!((column - (doublings - 1.25)).abs() < 1e-14);
    }
    assert_eq!(design.terms[0].change, "per doubling of queue");
}

#[test]
fn joint_terms_are_products_in_a_fixed_order_and_told_as_what_they_are() {
    let mut spec = study();
    spec.covariates = vec![
        merged("decking", "plain", "other", &["mesh", "paint"]),
        number("slope", Centre::Value(8.0), 2.0),
    ];
    spec.joints = vec![joint("decking", "slope")];
    let design = built(&spec, &table(LANDINGS));
    assert_eq!(
        names(&design),
        [
            "decking=grooved",
            "decking=other",
            "slope",
            "decking=grooved with slope",
            "decking=other with slope"
        ]
    );
    assert_eq!(design.columns[4], [0.0, 0.0, 0.0, 0.0, 2.5, 2.0, 0.0, 0.0]);
    assert_eq!(
        design.terms[3].change,
        "factor on the ratio of grooved against plain, for each 2 more in slope"
    );
    assert_eq!(design.coding.terms, names(&design));
}

#[test]
fn keep_comes_before_gaps_and_the_audit_counts_every_row_once() {
    let mut spec = study();
    spec.data.rows_with_gaps = RowsWithGaps::Drop;
    spec.data.gap_marks = vec!["NA".to_owned()];
    spec.data.keep = vec![
        keep_levels("season", &["spring", "summer"]),
        keep_numbers("slope", Some(7.0), None),
    ];
    spec.covariates = vec![number("slope", Centre::Mean, 1.0)];
    // Line 3 has a gap, but its season excludes it already; lines 4 and 7 have gaps that matter.
    let text = "landing,falls,boardings,slope,season
A,1,10,7,spring
B,NA,10,8,winter
C,,10,8,spring
D,2,10,3,summer
E,3,20,9,summer
F,3,20,9,
G,4,20,10,spring
";
    let design = built(&spec, &table(text));
    assert_eq!(design.lines, [2, 6, 8]);
    assert_eq!(
        design.audit,
        Audit {
            rows_read: 7,
            rows_not_kept: 2,
            lines_dropped: vec![4, 7],
            rows_used: 3,
            units: 3
        }
    );
}

/// The study that uses everything at once.
fn full_study() -> Spec {
    let mut spec = study();
    spec.data.period = Some(at("month"));
    spec.data.rows_with_gaps = RowsWithGaps::Drop;
    spec.data.gap_marks = vec!["NA".to_owned()];
    spec.data.stands_for = Some(at("alike"));
    spec.data.keep = vec![
        keep_levels("season", &["spring", "summer"]),
        keep_numbers("boardings", Some(1.0), None),
    ];
    spec.covariates = vec![
        merged("decking", "plain", "other", &["mesh", "paint"]),
        number("slope", Centre::Mean, 2.0),
        log_number("queue", Centre::Mean),
    ];
    spec.joints = vec![joint("slope", "queue")];
    spec.study.answer = at("decking=grooved");
    spec
}

fn full_table() -> String {
    let mut text = "landing,note,month,falls,boardings,alike,decking,slope,queue,season\n".to_owned();
    for row in 0..40 {
        let decking = ["plain", "grooved", "mesh", "plain", "paint"][row % 5];
        let season = ["spring", "summer", "winter"][row % 3];
        let falls = if row == 12 {
            "NA".to_owned()
        } else {
            (row % 7).to_string()
        };
        let boardings = if row == 21 { 0 } else { 100 + 13 * row };
        text.push_str(&format!(
            "L{},\"a note, of two\nlines\",2031-{:02},{falls},{boardings},{},{decking},{:.3},{},{season}\n",
            row / 4,
            row % 4 + 1,
            1 + row % 2,
            4.1 + 0.37 * ((row * row) % 11) as f64,
            1 + (row * 7) % 29,
        ));
    }
    text
}

#[test]
fn a_runs_own_rows_make_the_same_design_again() {
    let (spec, original) = (full_study(), table(&full_table()));
    let design = built(&spec, &original);
    let rows = design::used_rows(&spec, &original).unwrap();
    let columns: Vec<&str> = rows.columns.iter().map(|column| column.name.as_str()).collect();
    assert_eq!(columns, design::used_columns(&spec));
    assert_eq!(
        columns,
        [
            "landing",
            "month",
            "falls",
            "boardings",
            "alike",
            "decking",
            "slope",
            "queue",
            "season"
        ]
    );
    let typed = |name: &str| matches!(rows.column(name).unwrap().cells, Cells::Numbers(_));
    assert_eq!(
        columns.iter().map(|name| typed(name)).collect::<Vec<bool>>(),
        [false, false, true, true, true, false, true, true, false]
    );
    assert!(rows.rows() < original.rows());
    let again = Design {
        audit: design.audit.clone(),
        ..built(&spec, &rows)
    };
    assert_eq!(again, design);
    // The lines are those of the file although cells hold line breaks: two lines to a row.
    assert_eq!(design.lines[..2], [2, 4]);
}

#[test]
fn new_rows_are_coded_as_the_fitted_ones_were() {
    let (spec, original) = (full_study(), table(&full_table()));
    let design = built(&spec, &original);
    let rows: Vec<usize> = (0..original.rows())
        .filter(|&row| design.lines.contains(&original.lines[row]))
        .collect();
    assert_eq!(design.coding.code(&original, &rows).unwrap(), design.columns);
    let as_text = serde_json::to_string(&design.coding).unwrap();
    let read: design::Coding = serde_json::from_str(&as_text).unwrap();
    assert_eq!(read, design.coding);
}

#[test]
fn a_new_row_with_a_new_level_is_refused_with_its_line() {
    let (spec, original) = (full_study(), table(&full_table()));
    let coding = built(&spec, &original).coding;
    let new = table("decking,slope,queue\nplain,5,10\nrubber,5,0\n");
    let faults = coding.code(&new, &[0, 1]).unwrap_err();
    let told: Vec<(CellRule, u64)> = faults
        .iter()
        .map(|fault| match fault {
            DesignFault::Cells { rule, cells } => (*rule, cells[0].line),
            other => panic!("{other:?}"),
        })
        .collect();
    assert_eq!(told, [(CellRule::CovariatePositive, 3)]);
    let new = table("decking,slope,queue\nplain,5,10\nrubber,5,10\n");
    let faults = coding.code(&new, &[0, 1]).unwrap_err();
    assert!(
        matches!(&faults[..], [DesignFault::Cells { rule: CellRule::NewLevel, cells }] if cells[0].value == "rubber")
    );
    let faults = coding.code(&table("decking,slop\nplain,5\n"), &[0]).unwrap_err();
    assert!(matches!(&faults[0], DesignFault::MissingColumns { missing, .. } if missing.len() == 2));
}

#[test]
fn remarks_tell_what_is_no_error() {
    let mut spec = study();
    spec.data.period = Some(at("month"));
    spec.covariates = vec![category("decking", "plain"), number("year", Centre::Value(0.0), 1.0)];
    spec.covariates[0].plausible_ratio.standing = Standing::Provisional;
    let mut text = "landing,month,falls,boardings,decking,year\n".to_owned();
    for row in 0..30 {
        let decking = if row == 11 {
            "mesh"
        } else {
            ["plain", "grooved"][row % 2]
        };
        let boardings = if row == 3 {
            "0.001".to_owned()
        } else {
            (row * 1000 + 500).to_string()
        };
        text.push_str(&format!(
            "L{},m{},1,{boardings},{decking},{}\n",
            row / 5,
            row % 4,
            2030 + row / 10
        ));
    }
    let table = table(&text);
    let design = built(&spec, &table);
    let told: Vec<String> = design::remarks(&spec, &table, &design)
        .iter()
        .map(|remark| format!("[{}] {remark}\n", remark.code()))
        .collect();
    insta::assert_snapshot!(told.concat());
}

#[test]
fn a_study_in_order_calls_for_no_remark() {
    let (spec, original) = (full_study(), table(&full_table()));
    let spec = Spec {
        data: Data {
            keep: vec![keep_numbers("boardings", Some(1.0), None)],
            ..spec.data
        },
        joints: vec![],
        ..spec
    };
    let design = built(&spec, &original);
    assert_eq!(design::remarks(&spec, &original, &design), []);
}

proptest! {
    #![proptest_config(ProptestConfig { cases: 500, failure_persistence: None, ..ProptestConfig::default() })]

    /// Whatever rows are kept, dropped or full of gaps: where a study can be built, the rows that it
    /// used build it again, to the last bit.
    #[test]
    fn the_rows_used_always_make_the_same_design(
        rows in proptest::collection::vec(
            (0_usize..6, "[0-9]|NA|", "[1-9]{1,4}|0|", prop_oneof!["plain", "grooved", "mesh", "-", ""],
             "-?[0-9]{1,3}(\\.[0-9]{1,3})?|NA", "[1-9][0-9]{0,3}(\\.5)?", prop_oneof!["spring", "summer", "winter"]),
            12..40),
        centre in prop_oneof![Just(Centre::Mean), Just(Centre::Value(3.0))],
    ) {
        let mut text = "landing,falls,boardings,decking,slope,queue,season\n".to_owned();
        for (unit, falls, boardings, decking, slope, queue, season) in &rows {
            text.push_str(&format!("L{unit},{falls},{boardings},{decking},{slope},{queue},{season}\n"));
        }
        let original = table(&text);
        let mut spec = study();
        spec.data.rows_with_gaps = RowsWithGaps::Drop;
        spec.data.gap_marks = vec!["NA".to_owned(), "-".to_owned()];
        spec.data.keep = vec![keep_levels("season", &["spring", "summer"]), keep_numbers("boardings", Some(1.0), None)];
        spec.covariates = vec![category("decking", "plain"), number("slope", centre, 10.0), log_number("queue", centre)];
        spec.joints = vec![joint("slope", "decking")];
        if let Ok(design) = design::build(&spec, &original) {
            let used = design::used_rows(&spec, &original).unwrap();
            let again = Design { audit: design.audit.clone(), ..built(&spec, &used) };
            prop_assert_eq!(&again, &design);
            let audit = &design.audit;
            prop_assert_eq!(audit.rows_used + audit.rows_not_kept + audit.lines_dropped.len(), audit.rows_read);
        }
    }
}
