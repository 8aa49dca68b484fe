//! Simulated problems of stated size and difficulty, on which the sampler is measured.
//!
//! Columns have lag-one correlation 0.4; the last quarter of them is cut to 0/1 at 0.3; all are
//! centred. Coefficients are normal with sd 0.25, log exposures normal. Priors: coefficients
//! Normal(0, 1), baseline about the crude rate with sd 1.5 on the log scale, scatter exponential
//! with rate 3.

use ratewright::design::{Audit, Coding, ColumnCoding, CovariateCoding, Design, Term};
use ratewright::numeric::{Purpose, Stream, exp, ln};
use ratewright::spec::NORMAL_975;

/// A problem's size and truth.
pub struct Plan {
    /// One letter, and what is difficult about it.
    pub name: &'static str,
    /// Rows.
    pub rows: usize,
    /// Terms.
    pub terms: usize,
    /// Expected count of a row at exposure 1 and centred columns.
    pub base: f64,
    /// True scatter; 0 gives Poisson data.
    pub scatter: f64,
    /// Standard deviation of the log exposures.
    pub exposure_sd: f64,
}

/// The problems, small ones first.
pub const PLANS: [Plan; 4] = [
    Plan {
        name: "S (small)",
        rows: 500,
        terms: 8,
        base: 3.0,
        scatter: 0.6,
        exposure_sd: 0.5,
    },
    Plan {
        name: "D (few and skewed)",
        rows: 60,
        terms: 12,
        base: 0.6,
        scatter: 1.2,
        exposure_sd: 0.3,
    },
    Plan {
        name: "Z (no scatter)",
        rows: 2_000,
        terms: 8,
        base: 4.0,
        scatter: 0.0,
        exposure_sd: 0.5,
    },
    Plan {
        name: "M (medium)",
        rows: 10_000,
        terms: 20,
        base: 4.0,
        scatter: 0.6,
        exposure_sd: 0.5,
    },
];

/// The spec of a problem: its priors, and where its seed stands.
pub fn spec_text(design: &Design, seed: u64) -> String {
    let incidents: f64 = design.counts.iter().sum();
    let exposure: f64 = design.exposure.iter().sum();
    let crude = incidents / exposure;
    let reach = exp(1.5 * NORMAL_975);
    let scatter_up_to = -ln(0.05) / 3.0;
    format!(
        "[study]\ntitle = \"measure\"\nquestion = \"?\"\nanswer = \"baseline\"\nseed = {seed}\n\
         [data]\nfile = \"none.csv\"\nunit = \"unit\"\n[incidents]\ncolumn = \"count\"\n\
         [exposure]\ncolumn = \"exposure\"\n\
         [family]\nkind = \"negative-binomial\"\nscatter_up_to = {scatter_up_to:?}\n\
         [baseline]\nplausible_rate = [{:?}, {:?}]\n",
        crude / reach,
        crude * reach
    )
}

/// Simulates the problem's rows; every row is a unit.
pub fn simulate(plan: &Plan, seed: u64) -> Design {
    let mut stream = Stream::new(seed, Purpose::Simulation, plan.rows as u64);
    let columns = columns(plan, &mut stream);
    let coefficients: Vec<f64> = (0..plan.terms).map(|_| 0.25 * stream.normal()).collect();
    let log_exposure: Vec<f64> = (0..plan.rows).map(|_| plan.exposure_sd * stream.normal()).collect();
    let counts = (0..plan.rows)
        .map(|row| {
            let mut log_mean = ln(plan.base) + log_exposure[row];
            for (coefficient, column) in coefficients.iter().zip(&columns) {
                log_mean += coefficient * column[row];
            }
            let square = plan.scatter * plan.scatter;
            let own_factor = if square > 0.0 {
                square * stream.gamma(1.0 / square)
            } else {
                1.0
            };
            stream.poisson(exp(log_mean) * own_factor)
        })
        .collect();
    let names: Vec<String> = (1..=plan.terms).map(|term| format!("x{term}")).collect();
    let number = |name: &String| CovariateCoding {
        column: name.clone(),
        coding: ColumnCoding::Number { centre: 0.0, step: 1.0 },
    };
    Design {
        terms: names.iter().map(|name| term(name)).collect(),
        columns,
        exposure: log_exposure.iter().map(|&x| exp(x)).collect(),
        log_exposure,
        counts,
        stands_for: vec![1.0; plan.rows],
        unit_of: (0..plan.rows).collect(),
        units: (1..=plan.rows).map(|row| format!("{row}")).collect(),
        lines: (0..plan.rows).map(|row| row as u64 + 2).collect(),
        coding: Coding {
            exposure_column: Some("exposure".into()),
            per: 1.0,
            covariates: names.iter().map(number).collect(),
            joints: Vec::new(),
            terms: names,
        },
        audit: Audit {
            rows_read: plan.rows,
            rows_not_kept: 0,
            lines_dropped: Vec::new(),
            rows_used: plan.rows,
            units: plan.rows,
        },
    }
}

fn term(name: &str) -> Term {
    Term {
        name: name.to_string(),
        change: format!("per 1 more {name}"),
        prior_mean: 0.0,
        prior_sd: 1.0,
    }
}

/// Columns with lag-one correlation 0.4, the last quarter cut to 0/1 at 0.3, centred.
fn columns(plan: &Plan, stream: &mut Stream) -> Vec<Vec<f64>> {
    let innovation = (1.0f64 - 0.4 * 0.4).sqrt();
    let mut columns: Vec<Vec<f64>> = Vec::with_capacity(plan.terms);
    for term in 0..plan.terms {
        let column = (0..plan.rows)
            .map(|row| match term {
                0 => stream.normal(),
                _ => 0.4 * columns[term - 1][row] + innovation * stream.normal(),
            })
            .collect();
        columns.push(column);
    }
    for column in columns.iter_mut().skip(plan.terms - plan.terms / 4) {
        column.iter_mut().for_each(|x| *x = if *x > 0.3 { 1.0 } else { 0.0 });
    }
    for column in &mut columns {
        let mean = column.iter().sum::<f64>() / plan.rows as f64;
        column.iter_mut().for_each(|x| *x -= mean);
    }
    columns
}
