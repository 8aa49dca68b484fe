//! Checked specs built by hand, for tests that start behind the parser.

use ratewright::spec::*;
use ratewright::table::{Table, parse_csv};

pub fn at(value: &str) -> At<String> {
    At {
        value: value.to_owned(),
        span: 0..0,
    }
}

pub fn range(lo: f64, hi: f64) -> PlausibleRange {
    PlausibleRange {
        lo,
        hi,
        span: 0..0,
        standing: Standing::Settled,
    }
}

/// A study of falls at landings: `falls` per 1,000 `boardings`, no covariate.
pub fn study() -> Spec {
    Spec {
        source: Source {
            file: "study.toml".to_owned(),
            text: String::new(),
        },
        study: Study {
            title: "Falls at landings".to_owned(),
            question: "Does grooved decking go with fewer falls?".to_owned(),
            answer: at("baseline"),
            seed: 1,
        },
        data: Data {
            file: at("data.csv"),
            unit: at("landing"),
            period: None,
            rows_with_gaps: RowsWithGaps::Refuse,
            gap_marks: vec![],
            keep: vec![],
            stands_for: None,
        },
        incidents: Incidents { column: at("falls") },
        exposure: Some(Exposure {
            column: at("boardings"),
            per: 1000.0,
            chances: Chances::Many,
        }),
        family: Family::Poisson,
        baseline: Baseline::PlausibleRate(range(0.5, 20.0)),
        covariates: vec![],
        joints: vec![],
        sampling: Sampling {
            chains: 4,
            steps: Steps::Mixed,
            precision: 0.02,
            most_draws: 200_000,
        },
        report: Reporting {
            interval: 0.95,
            hide_counts_below: 5,
            zero_counts: ZeroCounts::Hidden,
        },
    }
}

pub fn category(column: &str, reference: &str) -> Covariate {
    Covariate {
        column: at(column),
        kind: CovariateKind::Category {
            reference: at(reference),
            merge: vec![],
        },
        plausible_ratio: range(0.25, 4.0),
    }
}

pub fn merged(column: &str, reference: &str, into: &str, levels: &[&str]) -> Covariate {
    Covariate {
        kind: CovariateKind::Category {
            reference: at(reference),
            merge: vec![Merge {
                into: at(into),
                levels: levels.iter().map(|level| at(level)).collect(),
            }],
        },
        ..category(column, reference)
    }
}

pub fn number(column: &str, centre: Centre, step: f64) -> Covariate {
    Covariate {
        column: at(column),
        kind: CovariateKind::Number { centre, step },
        plausible_ratio: range(0.5, 2.0),
    }
}

pub fn log_number(column: &str, centre: Centre) -> Covariate {
    Covariate {
        column: at(column),
        kind: CovariateKind::LogNumber { centre },
        plausible_ratio: range(0.5, 2.0),
    }
}

pub fn joint(first: &str, second: &str) -> Joint {
    Joint {
        of: [at(first), at(second)],
        plausible_ratio: range(0.5, 2.0),
        span: 0..0,
    }
}

pub fn keep_levels(column: &str, levels: &[&str]) -> Keep {
    Keep {
        column: at(column),
        only: KeepOnly::Levels(levels.iter().map(|level| at(level)).collect()),
    }
}

pub fn keep_numbers(column: &str, from: Option<f64>, to: Option<f64>) -> Keep {
    Keep {
        column: at(column),
        only: KeepOnly::Numbers { from, to },
    }
}

/// A table from CSV text.
pub fn table(text: &str) -> Table {
    parse_csv("data.csv", text.as_bytes()).expect("a table that can be read")
}
