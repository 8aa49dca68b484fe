//! What people and programs read of the findings, from a stand-in for the slow part.
#![allow(missing_docs)]

use ratewright::output::findings::{SamplingFinding, StopReason};
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
fn estimates_of_a_poor_simulation_say_so_first_and_why() {
    // The answer tells why; the others point to it.
    let blocks = [
        ("The answer", ": "),
        ("Rate ratios", ", for"),
        ("The rate itself", ", for"),
    ];
    type Change = fn(&mut SamplingFinding);
    let failing: [(Change, &str); 6] = [
        (|s| s.largest_r_hat = Some(1.0104), "R-hat is 1.0104, above 1.01"),
        (|s| s.largest_r_hat = None, "could not be computed"),
        (
            |s| s.fewest_effective_draws = 399.9,
            "only 399 independent ones in the middle",
        ),
        (
            |s| s.fewest_effective_tail_draws = 20.0,
            "only 20 independent ones in the tails",
        ),
        (|s| s.worst_error_of_mean = 0.031, "posterior mean is 0.031"),
        (|s| s.worst_error_of_interval_end = 0.0501, "interval end is 0.0501"),
    ];
    for (change, why) in failing {
        let mut findings = crate::stand_in::findings();
        change(&mut findings.sampling);
        let told = terminal_text(&findings, Audience::Whole);
        let told = told.split_whitespace().collect::<Vec<_>>().join(" ");
        for (block, goes_on) in blocks {
            let starts = format!("{block} NOT PRECISE ENOUGH TO REPORT{goes_on}");
            assert!(told.contains(&starts), "{starts} {told}");
        }
        let answer = &told[..told.find("Rate ratios").unwrap()];
        assert!(answer.contains(why), "{answer}");
        let simulation = &told[told.find("The simulation").unwrap()..];
        assert!(simulation.contains(why), "{simulation}");
    }
    let sound = terminal_text(&crate::stand_in::findings(), Audience::Whole);
    assert!(!sound.contains("NOT PRECISE"), "{sound}");
}

#[test]
fn extreme_figures_and_long_names_stay_within_eighty_columns() {
    let mut findings = crate::stand_in::findings();
    for name in [&mut findings.coefficients[1].term, &mut findings.rate_ratios[0].term] {
        *name = format!("decking={}", "grooved ".repeat(12).trim());
    }
    for coefficient in &mut findings.coefficients[..3] {
        (coefficient.lower, coefficient.upper) = (-400.0, 500.0);
    }
    findings.units.units[0].unit = "quay".repeat(1000);
    findings.units.units[1].expected = 5.177e-13;
    findings.units.units[1].upper = 3.9e46;
    findings.study.title = "Falls ".repeat(40);
    let told = terminal_text(&findings, Audience::Whole);
    for line in told.lines() {
        assert!(line.chars().count() <= 80, "{line}");
    }
    assert!(told.contains("3.900 × 10^46"), "{told}");
    assert!(!told.contains("000000"), "{told}");
}

#[test]
fn the_only_small_count_is_hidden_with_a_second_one() {
    let mut findings = crate::stand_in::findings();
    findings.units.units[4].observed = 9.0;
    let audience = Audience::of_study(&findings.study);
    let table = tables::units(&findings, audience).unwrap();
    assert!(table.contains("\nSandbar,1,15000,0,4,14.7,5,27,,hidden\n"), "{table}");
    assert!(
        table.contains("\n\"Mill steps, upper\",1,15000,,,21,10,35,,hidden\n"),
        "{table}"
    );
    assert_eq!(table.matches(",hidden\n").count(), 2);
    let told = terminal_text(&findings, audience);
    assert!(!told.contains("Mill steps") && !told.contains("Sandbar"), "{told}");
}

#[test]
fn where_no_unit_may_be_judged_none_is() {
    let mut findings = crate::stand_in::findings();
    findings.units.units.truncate(1);
    findings.units.units[0].observed = 3.0;
    findings.units.units[0].lower = 2.0;
    let told = terminal_text(&findings, Audience::of_study(&findings.study));
    let told = told.split_whitespace().collect::<Vec<_>>().join(" ");
    assert!(
        told.contains("Of 1 unit (column landing), none is judged here, so that no small count can be worked out."),
        "{told}"
    );
    assert!(!told.contains("lies outside") && !told.contains("North quay"), "{told}");
}

#[test]
fn one_is_told_as_one() {
    let mut findings = crate::stand_in::findings();
    findings.units.units.truncate(1);
    findings.data = ratewright::design::Audit {
        rows_read: 1,
        rows_not_kept: 0,
        lines_dropped: vec![],
        rows_used: 1,
        units: 1,
    };
    let told = terminal_text(&findings, Audience::of_study(&findings.study));
    assert!(told.contains("Of 1 unit (column landing), none lies outside"), "{told}");
    assert!(told.contains("The one row of the file is used."), "{told}");
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
         effective_tail_draws,split_r_hat,laplace_mean,laplace_sd,stopped"
    );
    assert_eq!(
        first_line(tables::rate_ratios(&findings).unwrap()),
        "term,change,rate_ratio,lower,upper,prob_below_one,stopped"
    );
    let mut stopped_early = findings;
    for (stopped, word) in [
        (StopReason::PrecisionMet, "precision-met"),
        (StopReason::MostDraws, "most-draws"),
    ] {
        stopped_early.sampling.stopped = stopped;
        for table in [
            tables::coefficients(&stopped_early).unwrap(),
            tables::rate_ratios(&stopped_early).unwrap(),
        ] {
            let ends = |line: &str| line.ends_with(&format!(",{word}"));
            assert!(table.lines().skip(1).all(ends), "{table}");
        }
    }
}

#[test]
fn a_figure_that_is_not_finite_stops_the_table() {
    let mut findings = crate::stand_in::findings();
    findings.coefficients[1].sd = f64::NAN;
    let error = tables::coefficients(&findings).unwrap_err();
    assert!(error.to_string().contains("column sd of coefficients.csv"), "{error}");
}
