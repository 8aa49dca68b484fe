//! Designs made by hand, for tests that start behind the table.

use ratewright::design::{Audit, Coding, Design, Term};
use ratewright::numeric::ln;

/// A design of these coded columns, exposures and counts; every row is a unit of its own.
pub fn design(columns: Vec<Vec<f64>>, exposure: Vec<f64>, counts: Vec<f64>) -> Design {
    let rows = counts.len();
    let names: Vec<String> = (0..columns.len()).map(|k| format!("x{k}")).collect();
    let term = |name: &String| Term {
        name: name.clone(),
        change: "per 1".to_owned(),
        prior_mean: 0.1,
        prior_sd: 0.7,
    };
    Design {
        terms: names.iter().map(term).collect(),
        columns,
        log_exposure: exposure.iter().map(|e| ln(*e)).collect(),
        exposure,
        counts,
        stands_for: vec![1.0; rows],
        unit_of: (0..rows).collect(),
        units: (0..rows).map(|row| row.to_string()).collect(),
        lines: (0..rows as u64).collect(),
        coding: Coding {
            exposure_column: None,
            per: 1.0,
            covariates: vec![],
            joints: vec![],
            terms: names,
        },
        audit: Audit {
            rows_read: rows,
            rows_not_kept: 0,
            lines_dropped: vec![],
            rows_used: rows,
            units: rows,
        },
    }
}
