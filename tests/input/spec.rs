//! What a good spec means: values, defaults, priors and places.

use ratewright::spec::{
    Baseline, Centre, Chances, CovariateKind, Family, KeepOnly, RowsWithGaps, Standing, Steps, ZeroCounts, parse,
};

const EXAMPLE: &str = include_str!("../../src/spec/example.toml");

/// As little as a spec can say.
const SMALLEST: &str = r#"
[study]
title = "t"
question = "q"
answer = "baseline"
seed = 0
[data]
file = "d.csv"
unit = "place"
[incidents]
column = "falls"
[family]
kind = "poisson"
[baseline]
earlier = { incidents = 12, exposure = 150000, at_reference = true }
"#;

#[test]
fn the_example_means_what_it_says() {
    let spec = parse("example.toml", EXAMPLE).expect("the example is good");
    assert_eq!(spec.source.text, EXAMPLE);
    assert_eq!(spec.study.seed, 48_151);
    assert_eq!(spec.study.answer.value, "decking=grooved");
    assert_eq!(&EXAMPLE[spec.study.answer.span.clone()], "\"decking=grooved\"");
    assert_eq!(spec.data.unit.value, "landing");
    assert_eq!(spec.data.keep.len(), 1);
    assert_eq!(&EXAMPLE[spec.data.keep[0].column.span.clone()], "season");
    let KeepOnly::Levels(levels) = &spec.data.keep[0].only else {
        panic!("levels")
    };
    assert_eq!(levels[1].value, "autumn");
    assert_eq!(&EXAMPLE[levels[1].span.clone()], "\"autumn\"");
    assert_eq!(spec.exposure.as_ref().map(|exposure| exposure.per), Some(10_000.0));
    let Baseline::PlausibleRate(range) = &spec.baseline else {
        panic!("a range")
    };
    assert_eq!((range.lo, range.hi, range.standing), (0.5, 20.0, Standing::Settled));
    assert_eq!(&EXAMPLE[range.span.clone()], "[0.5, 20.0]");
    let columns: Vec<&str> = spec
        .covariates
        .iter()
        .map(|covariate| covariate.column.value.as_str())
        .collect();
    assert_eq!(columns, ["decking", "slope_deg", "staff_hours"]);
    let CovariateKind::Category { reference, merge } = &spec.covariates[0].kind else {
        panic!("a category")
    };
    assert_eq!(reference.value, "plain");
    assert_eq!(merge[0].into.value, "other");
    assert_eq!(merge[0].levels[1].value, "paint");
    assert_eq!(
        spec.covariates[1].kind,
        CovariateKind::Number {
            centre: Centre::Value(8.0),
            step: 2.0
        }
    );
    assert_eq!(
        spec.covariates[2].kind,
        CovariateKind::LogNumber { centre: Centre::Mean }
    );
    assert_eq!(spec.covariates[2].plausible_ratio.standing, Standing::Provisional);
    assert_eq!(spec.joints[0].of[1].value, "slope_deg");
    assert_eq!(&EXAMPLE[spec.joints[0].span.clone()], "[[joint]]");
}

#[test]
fn what_is_left_out_has_the_stated_default() {
    let spec = parse("smallest.toml", SMALLEST).expect("enough to fit");
    assert_eq!(spec.exposure, None);
    assert_eq!(spec.data.rows_with_gaps, RowsWithGaps::Refuse);
    assert!(spec.data.gap_marks.is_empty() && spec.data.keep.is_empty() && spec.data.period.is_none());
    assert_eq!((spec.sampling.chains, spec.sampling.steps), (4, Steps::Mixed));
    assert_eq!((spec.sampling.precision, spec.sampling.most_draws), (0.02, 200_000));
    assert_eq!((spec.report.interval, spec.report.hide_counts_below), (0.95, 5));
    assert_eq!(spec.report.zero_counts, ZeroCounts::Hidden);
    let with_exposure = SMALLEST.replace("[family]", "[exposure]\ncolumn = \"hours\"\n[family]");
    let exposure = parse("smallest.toml", &with_exposure)
        .expect("good")
        .exposure
        .expect("stands");
    assert_eq!((exposure.per, exposure.chances), (1.0, Chances::Many));
}

#[test]
fn rows_may_be_kept_by_numbers_with_an_open_end() {
    let keep = "keep = { slope_deg = { from = -2, to = 9.5 }, boardings = { from = 1 }, age = { to = 3, from = 3 } }";
    let text = EXAMPLE.replace("keep   = { season = [\"summer\", \"autumn\"] }", keep);
    let spec = parse("s.toml", &text).expect("good");
    let kept: Vec<(&str, &KeepOnly)> = spec
        .data
        .keep
        .iter()
        .map(|keep| (keep.column.value.as_str(), &keep.only))
        .collect();
    let numbers = |from, to| KeepOnly::Numbers { from, to };
    assert_eq!(
        kept,
        [
            ("slope_deg", &numbers(Some(-2.0), Some(9.5))),
            ("boardings", &numbers(Some(1.0), None)),
            ("age", &numbers(Some(3.0), Some(3.0))),
        ]
    );
}

#[test]
fn numbers_may_be_written_in_any_toml_form() {
    for (written, per) in [
        ("10_000", 10_000.0),
        ("1e4", 10_000.0),
        ("0x10", 16.0),
        ("+5.5", 5.5),
        ("9223372036854775808", 9_223_372_036_854_776_000.0),
    ] {
        let text = EXAMPLE.replace("= 10000 ", &format!("= {written} "));
        let spec = parse("s.toml", &text).expect(written);
        assert_eq!(spec.exposure.map(|exposure| exposure.per), Some(per), "{written}");
    }
}

#[test]
fn a_merged_level_may_keep_the_name_of_a_level_that_it_takes_in() {
    let text = EXAMPLE.replace("other = [\"mesh\", \"paint\"]", "plain = [\"plain\", \"paint\"]");
    let spec = parse("s.toml", &text).expect("plain stays the reference");
    let CovariateKind::Category { merge, .. } = &spec.covariates[0].kind else {
        panic!("a category")
    };
    assert_eq!(merge[0].into.value, "plain");
}

#[test]
fn a_byte_order_mark_and_windows_line_ends_change_nothing_but_the_places() {
    let plain = parse("s.toml", EXAMPLE).expect("good");
    let windows = format!("\u{feff}{}", EXAMPLE.replace('\n', "\r\n"));
    let spec = parse("s.toml", &windows).expect("good");
    assert_eq!(spec.source.text, windows);
    assert_eq!(spec.study.title, plain.study.title);
    assert_eq!(&windows[spec.study.answer.span.clone()], "\"decking=grooved\"");
}

#[test]
fn tables_may_be_written_in_any_toml_form() {
    let dotted =
        SMALLEST
            .replace("[incidents]\ncolumn", "")
            .replacen("\n[study]", "incidents.column = \"falls\"\n[study]", 1);
    let dotted = dotted.replace(" = \"falls\"\n[family]", "[family]");
    assert_eq!(parse("s.toml", &dotted).expect("good").incidents.column.value, "falls");
}

#[test]
fn priors_follow_from_the_ranges() {
    let spec = parse("example.toml", EXAMPLE).expect("good");
    let Baseline::PlausibleRate(rate) = &spec.baseline else {
        panic!("a range")
    };
    // (ln 0.5 + ln 20)/2 = ln(10)/2 and ln(40)/(2 * 1.959963984540054): Python 3 `math.log`, to 17 digits.
    assert!((rate.log_mean() - 1.151_292_546_497_023).abs() < 1e-15);
    assert!((rate.log_sd() - 0.941_057_969_230_900_9).abs() < 1e-15);
    // -ln(0.05)/1: Python 3 `-math.log(0.05)`.
    let scatter = spec.family.scatter_rate().expect("a scatter");
    assert!((scatter - 2.995_732_273_553_991).abs() < 1e-15);
    assert_eq!(Family::Poisson.scatter_rate(), None);
}

#[test]
fn an_answer_may_be_any_term_that_the_spec_can_have() {
    for answer in [
        "baseline",
        "slope_deg",
        "staff_hours",
        "decking=other",
        "decking=a level = with strange words",
        "decking=grooved with slope_deg",
        "decking=wood with steel with slope_deg",
        // "plain with slope_deg" may be a level: only the data can tell.
        "decking=plain with slope_deg",
    ] {
        let text = EXAMPLE.replace("\"decking=grooved\"", &format!("\"{answer}\""));
        assert!(parse("s.toml", &text).is_ok(), "{answer} can be a term");
    }
    for answer in [
        "decking",
        "decking=",
        "decking=plain",
        "decking=mesh",
        "slope_deg=2",
        "slope_deg with decking=grooved",
        "scatter",
        "Slope_deg",
        "staff_hours with slope_deg",
    ] {
        let text = EXAMPLE.replace("\"decking=grooved\"", &format!("\"{answer}\""));
        let error = parse("s.toml", &text).expect_err(answer);
        assert_eq!(error.faults.len(), 1, "{answer}: {error}");
        assert_eq!(error.faults[0].code(), "no-such-answer");
    }
}

#[test]
fn the_reference_is_no_part_of_a_joint_answer() {
    let text = EXAMPLE
        .replace("[\"decking\", \"slope_deg\"]", "[\"slope_deg\", \"decking\"]")
        .replace("\"decking=grooved\"", "\"slope_deg with decking=plain\"");
    let error = parse("s.toml", &text).expect_err("plain is the reference");
    assert_eq!(error.faults.len(), 1, "{error}");
    assert!(error.to_string().contains("is the reference"), "{error}");
}
