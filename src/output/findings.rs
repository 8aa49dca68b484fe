//! Everything that a fit concluded, in one value: every writer reads it, none computes a statistic.

use crate::answer::{Answer, BaselineRate, RateRatio};
use crate::check::UnitsCheck;
use crate::design::Audit;
use schemars::JsonSchema;
use serde::{Deserialize, Serialize};

/// Version of the layout of `findings.json`.
pub const LAYOUT: u32 = 1;

/// What `findings.json` says about who may read it.
pub const AUDIENCE: &str = "not for publication";

/// All findings of one fit: the content of `findings.json`.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize, JsonSchema)]
#[serde(deny_unknown_fields)]
pub struct Findings {
    /// Version of this layout.
    pub layout: u32,
    /// Version of the program.
    pub ratewright: String,
    /// Always `not for publication`: small counts stand here in full.
    pub audience: String,
    /// The study in words.
    pub study: StudyFacts,
    /// What happened to the rows.
    pub data: Audit,
    /// The answer, told first.
    pub answer: Answer,
    /// One entry for each parameter, `baseline` first.
    pub coefficients: Vec<CoefficientFinding>,
    /// One entry for each term but the baseline.
    pub rate_ratios: Vec<RateRatio>,
    /// The rate at the baseline, per `study.per`.
    pub baseline_rate: BaselineRate,
    /// Predictive check of each unit.
    pub units: UnitsCheck,
    /// How sampling went and why it stopped.
    pub sampling: SamplingFinding,
    /// The mode, and how far the draws moved from its Laplace approximation.
    pub mode: ModeFinding,
    /// What has to be said beside the numbers, most important first.
    pub notes: Vec<Note>,
}

/// The study in words.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize, JsonSchema)]
#[serde(deny_unknown_fields)]
pub struct StudyFacts {
    /// `[study] title`
    pub title: String,
    /// `[study] question`
    pub question: String,
    /// Name of the term that answers it.
    pub answer_term: String,
    /// `poisson` or `negative-binomial`.
    pub family: String,
    /// Column of the incident counts.
    pub incidents_column: String,
    /// Column of the unit.
    pub unit_column: String,
    /// Column of the exposure, where there is one.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub exposure_column: Option<String>,
    /// Rates are told per this many units of exposure.
    pub per: f64,
    /// Level of every interval, equal-tailed.
    pub interval: f64,
    /// Seed of every random stream.
    pub seed: u64,
    /// Counts below this are hidden from people.
    pub hide_counts_below: u64,
    /// Whether a count of 0 is shown.
    pub show_zero: bool,
}

/// One parameter: log scale for the baseline (per unit of raw exposure) and the terms, `scatter` as itself.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize, JsonSchema)]
#[serde(deny_unknown_fields)]
pub struct CoefficientFinding {
    /// Its name.
    pub term: String,
    /// Posterior median.
    pub median: f64,
    /// Lower end of the interval.
    pub lower: f64,
    /// Upper end of the interval.
    pub upper: f64,
    /// Posterior mean.
    pub mean: f64,
    /// Posterior standard deviation.
    pub sd: f64,
    /// Monte Carlo standard error of the mean.
    pub error_of_mean: f64,
    /// Monte Carlo standard error of the lower end.
    pub error_of_lower: f64,
    /// Monte Carlo standard error of the upper end.
    pub error_of_upper: f64,
    /// Bulk effective draws.
    pub effective_draws: f64,
    /// Tail effective draws.
    pub effective_tail_draws: f64,
    /// Rank-normalised split R-hat; absent where it cannot be computed.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub split_r_hat: Option<f64>,
    /// Mean under the Laplace approximation.
    pub laplace_mean: f64,
    /// Standard deviation under the Laplace approximation.
    pub laplace_sd: f64,
}

/// How sampling went.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize, JsonSchema)]
#[serde(deny_unknown_fields)]
pub struct SamplingFinding {
    /// `mixed` or `walk`.
    pub steps: String,
    /// Number of chains.
    pub chains: usize,
    /// Warm-up iterations of each chain, not kept.
    pub warm_up: usize,
    /// Kept draws, all chains together.
    pub draws: usize,
    /// Share of proposals accepted after warm-up.
    pub accepted: f64,
    /// Why sampling stopped.
    pub stopped: StopReason,
    /// The precision asked for, in posterior standard deviations.
    pub precision_asked: f64,
    /// The worst simulation error of a mean, in posterior standard deviations.
    pub worst_error_of_mean: f64,
    /// The worst simulation error of an interval end, in posterior standard deviations.
    pub worst_error_of_interval_end: f64,
    /// The largest R-hat; absent where none can be computed.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub largest_r_hat: Option<f64>,
    /// The fewest bulk effective draws.
    pub fewest_effective_draws: f64,
    /// The fewest tail effective draws.
    pub fewest_effective_tail_draws: f64,
    /// The reference that independence steps were drawn from, in words.
    pub reference: String,
}

/// Why sampling stopped.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, Deserialize, JsonSchema)]
#[serde(rename_all = "kebab-case")]
pub enum StopReason {
    /// Every mean and interval end is as precise as asked, and the chains agree.
    PrecisionMet,
    /// `most_draws` was reached first.
    MostDraws,
}

impl StopReason {
    /// As files spell it.
    pub fn word(self) -> &'static str {
        match self {
            StopReason::PrecisionMet => "precision-met",
            StopReason::MostDraws => "most-draws",
        }
    }
}

/// The mode and its Laplace approximation.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize, JsonSchema)]
#[serde(deny_unknown_fields)]
pub struct ModeFinding {
    /// Newton steps taken to it.
    pub steps: u64,
    /// Log posterior density at the mode, all constants kept.
    pub log_density: f64,
    /// Under the negative binomial, whether the scatter's mode is `inside` or `at-zero`.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub scatter_mode: Option<String>,
    /// The furthest that a posterior mean moved from Laplace's, in posterior standard deviations.
    pub furthest_move: f64,
    /// The parameter that moved furthest.
    pub furthest_term: String,
}

/// Something that has to be said beside the numbers.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize, JsonSchema)]
#[serde(deny_unknown_fields)]
pub struct Note {
    /// Stable code.
    pub code: String,
    /// What is to be said, in a sentence or two.
    pub text: String,
}
