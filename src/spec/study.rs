//! The checked spec: what the TOML text says once every key, type and range has been accepted.
//!
//! Nothing here has met the data yet. Values that a later stage may have to complain about
//! (a column that the table lacks, a level that never occurs) keep their place in the text.

use std::ops::Range;

/// A value together with its byte range in the spec's text.
#[derive(Debug, Clone, PartialEq)]
pub struct At<T> {
    /// The value.
    pub value: T,
    /// Byte range into [`Source::text`].
    pub span: Range<usize>,
}

/// The text that a spec was read from.
#[derive(Debug, Clone, PartialEq)]
pub struct Source {
    /// The file as the person named it.
    pub file: String,
    /// The text, byte for byte.
    pub text: String,
}

/// One study: the whole checked spec.
#[derive(Debug, Clone, PartialEq)]
pub struct Spec {
    /// Where it was read from.
    pub source: Source,
    /// `[study]`
    pub study: Study,
    /// `[data]`
    pub data: Data,
    /// `[incidents]`
    pub incidents: Incidents,
    /// `[exposure]`; `None` means that every row counts as 1.
    pub exposure: Option<Exposure>,
    /// `[family]`
    pub family: Family,
    /// `[baseline]`
    pub baseline: Baseline,
    /// `[[covariate]]`, in the order of the spec.
    pub covariates: Vec<Covariate>,
    /// `[[joint]]`, in the order of the spec.
    pub joints: Vec<Joint>,
    /// `[sampling]`
    pub sampling: Sampling,
    /// `[report]`
    pub report: Reporting,
}

/// `[study]`
#[derive(Debug, Clone, PartialEq)]
pub struct Study {
    /// A title for the outputs.
    pub title: String,
    /// The board's question, in words.
    pub question: String,
    /// Name of the term that answers it, as in `decking=grooved`; `baseline` where there is no covariate.
    pub answer: At<String>,
    /// Seed of every random stream, 0 to 2^63 - 1.
    pub seed: u64,
}

/// `[data]`
#[derive(Debug, Clone, PartialEq)]
pub struct Data {
    /// The data file, relative to the spec.
    pub file: At<String>,
    /// Column of the unit.
    pub unit: At<String>,
    /// Column that orders the rows of a unit.
    pub period: Option<At<String>>,
    /// What to do with rows that lack a value that the fit needs.
    pub rows_with_gaps: RowsWithGaps,
    /// Cell texts that mean "no value", beside the empty cell.
    pub gap_marks: Vec<String>,
    /// Only these rows.
    pub keep: Vec<Keep>,
    /// Column that says how many identical rows this row stands for.
    pub stands_for: Option<At<String>>,
}

/// What to do with rows that lack a value that the fit needs.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum RowsWithGaps {
    /// The study is refused, with the list of gaps.
    Refuse,
    /// The rows are left out and listed.
    Drop,
}

/// One condition of `[data] keep`; a row is kept when all conditions hold.
#[derive(Debug, Clone, PartialEq)]
pub struct Keep {
    /// The column that decides.
    pub column: At<String>,
    /// Which values are kept.
    pub only: KeepOnly,
}

/// Which values of a column are kept.
#[derive(Debug, Clone, PartialEq)]
pub enum KeepOnly {
    /// Exactly these levels.
    Levels(Vec<At<String>>),
    /// Numbers from `from` to `to`, both ends included, either end open.
    Numbers {
        /// Smallest number kept.
        from: Option<f64>,
        /// Largest number kept.
        to: Option<f64>,
    },
}

/// `[incidents]`
#[derive(Debug, Clone, PartialEq)]
pub struct Incidents {
    /// Column of the counts.
    pub column: At<String>,
}

/// `[exposure]`
#[derive(Debug, Clone, PartialEq)]
pub struct Exposure {
    /// Column of the exposure.
    pub column: At<String>,
    /// Rates are told per this many units of exposure.
    pub per: f64,
    /// Whether a count may exceed its exposure.
    pub chances: Chances,
}

/// How many incidents one unit of exposure can bring.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Chances {
    /// Any number.
    Many,
    /// One at most: a count above its exposure is impossible.
    OneIncidentEach,
}

/// `[family]`
#[derive(Debug, Clone, PartialEq)]
pub enum Family {
    /// Poisson counts.
    Poisson,
    /// Negative-binomial counts, Var(y) = mu + c^2 mu^2.
    NegativeBinomial {
        /// Prior of the scatter c: P(c > `scatter_up_to`) = 0.05.
        scatter_up_to: f64,
        /// Whether that value is still provisional.
        standing: Standing,
    },
}

/// Whether a prior has been thought about.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Standing {
    /// The evaluator stands behind it.
    Settled,
    /// Written by `draft` and not yet narrowed.
    Provisional,
}

/// A plausible range: the central 95 % of a log-normal prior, in the evaluator's own units.
#[derive(Debug, Clone, PartialEq)]
pub struct PlausibleRange {
    /// Lower end, above 0.
    pub lo: f64,
    /// Upper end, above `lo`.
    pub hi: f64,
    /// Place in the spec.
    pub span: Range<usize>,
    /// Whether it is still provisional.
    pub standing: Standing,
}

/// `[baseline]`
#[derive(Debug, Clone, PartialEq)]
pub enum Baseline {
    /// A plausible range of the rate per `per`, where numbers are at their centre and categories at their reference.
    PlausibleRate(PlausibleRange),
    /// Earlier data at the reference: the conjugate gamma on the raw rate. Poisson only.
    Earlier {
        /// Incidents seen earlier, above 0.
        incidents: f64,
        /// Exposure, in raw units, that they were seen over; above 0.
        exposure: f64,
        /// Place in the spec.
        span: Range<usize>,
    },
}

/// One `[[covariate]]`.
#[derive(Debug, Clone, PartialEq)]
pub struct Covariate {
    /// The column.
    pub column: At<String>,
    /// How the column enters the model.
    pub kind: CovariateKind,
    /// Plausible range of each of its rate ratios.
    pub plausible_ratio: PlausibleRange,
}

/// How a column enters the linear predictor.
#[derive(Debug, Clone, PartialEq)]
pub enum CovariateKind {
    /// A 0/1 column for each level but the reference.
    Category {
        /// The level that the others are compared with.
        reference: At<String>,
        /// Levels taken together, before the reference is looked up.
        merge: Vec<Merge>,
    },
    /// `(x - centre) / step`.
    Number {
        /// Where the baseline sits.
        centre: Centre,
        /// The change that the rate ratio stands for; above 0.
        step: f64,
    },
    /// `log2(x / centre)`: the rate ratio is per doubling.
    LogNumber {
        /// Where the baseline sits; `Mean` is the geometric mean.
        centre: Centre,
    },
}

/// Where the baseline of a number sits.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum Centre {
    /// At this value.
    Value(f64),
    /// At the mean over the rows kept, each row once (for a log-number, of the logs).
    Mean,
}

/// Levels of a category that are taken together.
#[derive(Debug, Clone, PartialEq)]
pub struct Merge {
    /// Name of the merged level.
    pub into: At<String>,
    /// The levels that it takes in.
    pub levels: Vec<At<String>>,
}

/// One `[[joint]]`: an interaction of two covariates.
#[derive(Debug, Clone, PartialEq)]
pub struct Joint {
    /// The two columns, both covariates of the spec.
    pub of: [At<String>; 2],
    /// Plausible range of each of its rate ratios.
    pub plausible_ratio: PlausibleRange,
    /// Place of the whole table in the spec.
    pub span: Range<usize>,
}

/// `[sampling]`
#[derive(Debug, Clone, PartialEq)]
pub struct Sampling {
    /// Number of chains, 4 to 64.
    pub chains: usize,
    /// Kind of steps.
    pub steps: Steps,
    /// Simulation error of every mean, in posterior sds, at which sampling may stop; 2.5 times it for interval ends.
    pub precision: f64,
    /// Most kept draws, all chains together.
    pub most_draws: usize,
}

/// Kind of steps that the chains take.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Steps {
    /// Independence Metropolis steps from a fixed reference, mixed with random-walk steps.
    Mixed,
    /// The plain random walk alone.
    Walk,
}

/// `[report]`
#[derive(Debug, Clone, PartialEq)]
pub struct Reporting {
    /// Level of every interval, equal-tailed.
    pub interval: f64,
    /// Counts below this are hidden in what is shown to people.
    pub hide_counts_below: u64,
    /// Whether a count of 0 is hidden too.
    pub zero_counts: ZeroCounts,
}

/// Whether a count of 0 counts as small.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum ZeroCounts {
    /// 0 is hidden like any small count.
    Hidden,
    /// 0 is shown.
    Shown,
}

/// Half the width of the central 95 % of a standard normal.
pub const NORMAL_975: f64 = 1.959_963_984_540_054;
