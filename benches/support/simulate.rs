//! Makes the rows of a problem.
//!
//! Numbers: columns have lag-one correlation 0.4; the last quarter of them is cut to 0/1 at 0.3; all
//! are centred. Categories: every level equally likely, 0/1 columns. Coefficients are normal with sd 0.25. Log
//! exposures are normal, or evenly spaced where there are only a few.

use super::problems::{Columns, Exposures, Family, Problem};
use ratewright::design::{Audit, Coding, ColumnCoding, CovariateCoding, Design, Term};
use ratewright::numeric::{Purpose, Stream, exp, ln};
use std::fmt::Write;

/// Rows of a unit: a place's months of one year.
const ROWS_OF_A_UNIT: usize = 12;

/// Simulates the problem's rows.
pub fn simulate(problem: &Problem, family: Family, seed: u64) -> Design {
    let (rows, units) = (problem.rows, problem.rows.div_ceil(ROWS_OF_A_UNIT));
    let mut stream = Stream::new(seed, Purpose::Simulation, rows as u64);
    let (columns, covariates) = match problem.columns {
        Columns::Numbers(terms) => numbers(rows, terms, &mut stream),
        Columns::Categories(levels) => categories(rows, levels, &mut stream),
    };
    let coefficients: Vec<f64> = columns.iter().map(|_| 0.25 * stream.normal()).collect();
    let log_exposure: Vec<f64> = (0..rows)
        .map(|_| log_exposure(problem.exposures, &mut stream))
        .collect();
    let scatter = match family {
        Family::NegativeBinomial => problem.scatter,
        Family::Poisson => 0.0,
    };
    let square = scatter * scatter;
    let counts = (0..rows)
        .map(|row| {
            let mut log_mean = ln(problem.base) + log_exposure[row];
            for (coefficient, column) in coefficients.iter().zip(&columns) {
                log_mean += coefficient * column[row];
            }
            let own_factor = if square > 0.0 {
                square * stream.gamma(1.0 / square)
            } else {
                1.0
            };
            stream.poisson(exp(log_mean) * own_factor)
        })
        .collect();
    let names: Vec<String> = covariates.iter().flat_map(term_names).collect();
    Design {
        terms: names.iter().map(|name| term(name)).collect(),
        columns,
        exposure: log_exposure.iter().map(|&x| exp(x)).collect(),
        log_exposure,
        counts,
        stands_for: vec![1.0; rows],
        unit_of: (0..rows).map(|row| row / ROWS_OF_A_UNIT).collect(),
        units: (1..=units).map(|unit| format!("u{unit}")).collect(),
        lines: (0..rows).map(|row| row as u64 + 2).collect(),
        coding: Coding {
            exposure_column: Some("exposure".into()),
            per: 1.0,
            covariates,
            joints: Vec::new(),
            terms: names,
        },
        audit: Audit {
            rows_read: rows,
            rows_not_kept: 0,
            lines_dropped: Vec::new(),
            rows_used: rows,
            units,
        },
    }
}

fn log_exposure(exposures: Exposures, stream: &mut Stream) -> f64 {
    match exposures {
        Exposures::OfEachRow(sd) => sd * stream.normal(),
        Exposures::OneOf(different) => (stream.below(different) as f64 - 0.5 * (different - 1) as f64) * 0.15,
    }
}

fn term(name: &str) -> Term {
    Term {
        name: name.to_owned(),
        change: format!("per 1 more {name}"),
        prior_mean: 0.0,
        prior_sd: 1.0,
    }
}

fn term_names(covariate: &CovariateCoding) -> Vec<String> {
    match &covariate.coding {
        ColumnCoding::Category { levels, .. } => levels
            .iter()
            .map(|level| format!("{}={level}", covariate.column))
            .collect(),
        _ => vec![covariate.column.clone()],
    }
}

type Coded = (Vec<Vec<f64>>, Vec<CovariateCoding>);

fn numbers(rows: usize, terms: usize, stream: &mut Stream) -> Coded {
    let innovation = (1.0f64 - 0.4 * 0.4).sqrt();
    let mut columns: Vec<Vec<f64>> = Vec::with_capacity(terms);
    for term in 0..terms {
        let column = (0..rows)
            .map(|row| match term {
                0 => stream.normal(),
                _ => 0.4 * columns[term - 1][row] + innovation * stream.normal(),
            })
            .collect();
        columns.push(column);
    }
    for column in columns.iter_mut().skip(terms - terms / 4) {
        column.iter_mut().for_each(|x| *x = if *x > 0.3 { 1.0 } else { 0.0 });
    }
    for column in &mut columns {
        let mean = column.iter().sum::<f64>() / rows as f64;
        column.iter_mut().for_each(|x| *x -= mean);
    }
    let covariates = (1..=terms)
        .map(|term| CovariateCoding {
            column: format!("x{term}"),
            coding: ColumnCoding::Number { centre: 0.0, step: 1.0 },
        })
        .collect();
    (columns, covariates)
}

fn categories(rows: usize, levels: &[usize], stream: &mut Stream) -> Coded {
    let (mut columns, mut covariates) = (Vec::new(), Vec::new());
    for (place, &levels) in levels.iter().enumerate() {
        let of_row: Vec<u64> = (0..rows).map(|_| stream.below(levels as u64)).collect();
        // Level 0 is the reference and has no column.
        for level in 1..levels as u64 {
            columns.push(of_row.iter().map(|own| f64::from(u8::from(*own == level))).collect());
        }
        covariates.push(CovariateCoding {
            column: format!("g{}", place + 1),
            coding: ColumnCoding::Category {
                reference: "v0".into(),
                levels: (1..levels).map(|level| format!("v{level}")).collect(),
                merge: Vec::new(),
            },
        });
    }
    (columns, covariates)
}

/// The rows as the CSV file that they could have come from.
pub fn csv_text(design: &Design) -> String {
    let mut text = String::from("unit,count,exposure");
    for covariate in &design.coding.covariates {
        text.push(',');
        text.push_str(&covariate.column);
    }
    text.push('\n');
    for row in 0..design.counts.len() {
        // Writing into a string cannot fail.
        let _ = write!(
            text,
            "{},{},{}",
            design.units[design.unit_of[row]], design.counts[row], design.exposure[row]
        );
        let mut first = 0;
        for covariate in &design.coding.covariates {
            if let ColumnCoding::Category { reference, levels, .. } = &covariate.coding {
                let level = (0..levels.len()).find(|level| design.columns[first + level][row] > 0.5);
                let _ = write!(text, ",{}", level.map_or(reference, |level| &levels[level]));
                first += levels.len();
            } else {
                let _ = write!(text, ",{}", design.columns[first][row]);
                first += 1;
            }
        }
        text.push('\n');
    }
    text
}
