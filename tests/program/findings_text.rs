//! What people and programs read of the findings, from a stand-in for the slow part.
#![allow(missing_docs)]

use ratewright::output::findings::StopReason;
use ratewright::output::shown::Audience;
use ratewright::output::{tables, terminal};
use std::path::Path;

/// The text without the escapes that make headings bold.
fn terminal_text(findings: &ratewright::output::findings::Findings, audience: Audience) -> String {
    let text = terminal::findings(findings, audience, Path::new("studies/landings.run"));
    anstream::adapter::strip_str(&text).to_string()
}

#[test]
fn the_terminal_tells_the_answer_first() {
    let findings = crate::stand_in::findings();
    insta::assert_snapshot!(terminal_text(&findings, Audience::of_study(&findings.study)));
}

#[test]
fn the_terminal_says_so_when_the_precision_was_not_met() {
    let mut findings = crate::stand_in::findings();
    findings.sampling.stopped = StopReason::MostDraws;
    findings.sampling.largest_r_hat = None;
    for coefficient in &mut findings.coefficients {
        coefficient.error_of_lower *= 20.0;
        coefficient.error_of_upper *= 20.0;
        coefficient.effective_draws = 150.0;
    }
    insta::assert_snapshot!(terminal_text(&findings, Audience::of_study(&findings.study)));
}

#[test]
fn no_line_of_the_terminal_is_wider_than_eighty_columns() {
    let findings = crate::stand_in::findings();
    for line in terminal_text(&findings, Audience::Whole).lines() {
        assert!(line.chars().count() <= 80, "{line}");
    }
}

#[test]
fn small_counts_are_hidden_and_all_that_tells_them() {
    let findings = crate::stand_in::findings();
    let audience = Audience::of_study(&findings.study);
    let text = terminal_text(&findings, audience);
    assert!(!text.contains("Sandbar") && !text.contains("Old ferry"), "{text}");
    // The sum of all counts, from which a single hidden one would follow.
    assert!(!text.contains("115"), "{text}");
    insta::assert_snapshot!(tables::units(&findings, audience).unwrap());
}

#[test]
fn a_count_of_nothing_is_shown_where_the_study_says_so() {
    let mut findings = crate::stand_in::findings();
    findings.study.show_zero = true;
    let table = tables::units(&findings, Audience::of_study(&findings.study)).unwrap();
    assert!(
        table.contains("\nOld ferry,1,15000,0,0,2.2,0,6,0.07,inside\n"),
        "{table}"
    );
    assert!(table.contains("\nSandbar,1,15000,1,4,14.7,5,27,,hidden\n"), "{table}");
}

#[test]
fn the_whole_table_holds_every_count_and_no_formula() {
    let table = tables::units(&crate::stand_in::findings(), Audience::Whole).unwrap();
    assert!(
        table.contains("\nSandbar,1,15000,2,2,14.7,5,27,0.0004,below\n"),
        "{table}"
    );
    assert!(table.contains("\n'=Heron stairs,1,"), "{table}");
    assert!(table.contains("\n\"Mill steps, upper\",1,"), "{table}");
}

#[test]
fn the_csv_tables_have_their_columns() {
    let findings = crate::stand_in::findings();
    let first_line = |text: String| text.lines().next().unwrap().to_owned();
    assert_eq!(
        first_line(tables::coefficients(&findings).unwrap()),
        "term,median,lower,upper,mean,sd,error_of_mean,error_of_lower,error_of_upper,effective_draws,\
         effective_tail_draws,split_r_hat,laplace_mean,laplace_sd"
    );
    assert_eq!(
        first_line(tables::rate_ratios(&findings).unwrap()),
        "term,change,rate_ratio,lower,upper,prob_below_one"
    );
}

#[test]
fn a_figure_that_is_not_finite_stops_the_table() {
    let mut findings = crate::stand_in::findings();
    findings.coefficients[1].sd = f64::NAN;
    let error = tables::coefficients(&findings).unwrap_err();
    assert!(error.to_string().contains("column sd of coefficients.csv"), "{error}");
}
