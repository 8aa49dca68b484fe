//! What `design` gives: the numbers that the model needs, and the coding that made them.

use serde::{Deserialize, Serialize};

/// The numbers of a study, one entry for each row that the fit uses.
#[derive(Debug, Clone, PartialEq)]
pub struct Design {
    /// One term for each coded column (the baseline is not among them).
    pub terms: Vec<Term>,
    /// Coded columns, one for each term, each of one value a row.
    pub columns: Vec<Vec<f64>>,
    /// Exposure, in the units of the file, above 0.
    pub exposure: Vec<f64>,
    /// Log of the exposure: the offset.
    pub log_exposure: Vec<f64>,
    /// Incident counts: whole numbers from 0 to [`LARGEST_COUNT`].
    pub counts: Vec<f64>,
    /// How many identical rows each row stands for: whole numbers from 1.
    pub stands_for: Vec<f64>,
    /// For each row, the place of its unit in `units`.
    pub unit_of: Vec<usize>,
    /// The units, in order of first appearance.
    pub units: Vec<String>,
    /// For each row, the line of the data file.
    pub lines: Vec<u64>,
    /// What codes new rows.
    pub coding: Coding,
    /// What happened to the rows of the file on the way here.
    pub audit: Audit,
}

/// The largest count that is accepted: beyond it a count is a mistake in the file.
pub const LARGEST_COUNT: f64 = 1e9;

/// Names that no term may bear, because other parameters do.
pub(super) const PARAMETERS: [&str; 3] = ["baseline", "scatter", "spread"];

/// One coefficient of the linear predictor.
#[derive(Debug, Clone, PartialEq)]
pub struct Term {
    /// Its name: `slope_deg`, `decking=grooved`, `decking=grooved with slope_deg`.
    pub name: String,
    /// The change in the covariate that its rate ratio stands for, in words.
    pub change: String,
    /// Mean of its normal prior, on the log scale.
    pub prior_mean: f64,
    /// Standard deviation of its normal prior, on the log scale.
    pub prior_sd: f64,
}

/// All that codes new rows: written to `coding.json`.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct Coding {
    /// Column of the exposure; `None` when every row counts as 1.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub exposure_column: Option<String>,
    /// Rates are told per this many units of exposure.
    pub per: f64,
    /// The covariates, in the order of the spec.
    pub covariates: Vec<CovariateCoding>,
    /// The joint terms: for each, the places of its two covariates in `covariates`.
    pub joints: Vec<[usize; 2]>,
    /// Names of the coded columns in order: those of each covariate, then those of each joint term.
    pub terms: Vec<String>,
}

/// How one column becomes coded columns.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct CovariateCoding {
    /// The column.
    pub column: String,
    /// How it is coded.
    pub coding: ColumnCoding,
}

/// The coding of one column.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
#[serde(tag = "as", rename_all = "kebab-case", deny_unknown_fields)]
pub enum ColumnCoding {
    /// 0/1 columns.
    Category {
        /// The reference level.
        reference: String,
        /// The other levels, one coded column each, in order of first appearance.
        levels: Vec<String>,
        /// Level in the file -> level that it is taken into; a merged name that is itself a level
        /// of the file is taken into itself.
        merge: Vec<(String, String)>,
    },
    /// `(x - centre) / step`.
    Number {
        /// Where the baseline sits.
        centre: f64,
        /// The change that the rate ratio stands for.
        step: f64,
    },
    /// `log2(x / centre)`.
    LogNumber {
        /// Where the baseline sits, above 0.
        centre: f64,
    },
}

/// What happened to the rows of the file.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize, schemars::JsonSchema)]
#[serde(deny_unknown_fields)]
pub struct Audit {
    /// Rows in the file.
    pub rows_read: usize,
    /// Rows that `[data] keep` left out.
    pub rows_not_kept: usize,
    /// Lines of the rows that were dropped because of gaps.
    pub lines_dropped: Vec<u64>,
    /// Rows that the fit uses.
    pub rows_used: usize,
    /// Units among them.
    pub units: usize,
}

impl Design {
    /// A design of columns that are coded already, with exposures and counts: for a caller without a table, as
    /// tests and benches are. Every row is a unit of its own; terms are called x0, x1, ... and have standard
    /// normal priors.
    pub fn of_columns(columns: Vec<Vec<f64>>, exposure: Vec<f64>, counts: Vec<f64>) -> Design {
        let rows = counts.len();
        let names: Vec<String> = (0..columns.len()).map(|k| format!("x{k}")).collect();
        let term = |name: &String| Term {
            name: name.clone(),
            change: "per 1".to_owned(),
            prior_mean: 0.0,
            prior_sd: 1.0,
        };
        Design {
            terms: names.iter().map(term).collect(),
            columns,
            log_exposure: exposure.iter().map(|e| crate::numeric::ln(*e)).collect(),
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
}
