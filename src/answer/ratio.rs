//! Rate ratios and the rate at the baseline, from the draws.
//!
//! Quantiles are taken once, of the coefficients, and carried through the exponential: a figure of
//! `rate_ratios.csv` is exactly the exponential of its neighbour in `coefficients.csv`.

use crate::answer::meaning::{at_baseline, meanings};
use crate::answer::number::Measured;
use crate::answer::sentence::{Evidence, Others, baseline_sentence, ratio_sentence};
use crate::design::{Coding, Term};
use crate::fit::Draws;
use crate::numeric::exp;
use schemars::JsonSchema;
use serde::{Deserialize, Serialize};

/// One rate ratio.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize, JsonSchema)]
#[serde(deny_unknown_fields)]
pub struct RateRatio {
    /// The term.
    pub term: String,
    /// The change that the ratio stands for, in words.
    pub change: String,
    /// Posterior median of exp(coefficient).
    pub rate_ratio: f64,
    /// Lower end of the interval.
    pub lower: f64,
    /// Upper end of the interval.
    pub upper: f64,
    /// Posterior probability that the ratio is below 1.
    pub prob_below_one: f64,
}

/// The rate where numbers are at their centre and categories at their reference.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize, JsonSchema)]
#[serde(deny_unknown_fields)]
pub struct BaselineRate {
    /// Posterior median, per `study.per` units of exposure.
    pub rate: f64,
    /// Lower end of the interval.
    pub lower: f64,
    /// Upper end of the interval.
    pub upper: f64,
    /// Where the baseline sits, one entry for each column of the model: `decking is plain`.
    pub at: Vec<String>,
}

/// The answer to the study's question.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize, JsonSchema)]
#[serde(deny_unknown_fields)]
pub struct Answer {
    /// In words, with its uncertainty.
    pub sentence: String,
    /// The term.
    pub term: String,
    /// Rate ratio, or the rate per `study.per` where the answer is the baseline: posterior median.
    pub estimate: f64,
    /// Lower end of its interval.
    pub lower: f64,
    /// Upper end of its interval.
    pub upper: f64,
    /// Posterior probability that the rate ratio is below 1; absent for the baseline.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub prob_below_one: Option<f64>,
}

/// One parameter's posterior on the log scale, as far as the answer needs it.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct LogSummary {
    /// Median, interval and the simulation errors of its ends.
    pub measured: Measured,
    /// Bulk effective draws.
    pub effective_draws: f64,
}

/// The rate ratio of each term.
///
/// `draws` and `summaries` are in the order of the parameters: the baseline, then the terms.
pub fn rate_ratios(terms: &[Term], draws: &Draws, summaries: &[LogSummary]) -> Vec<RateRatio> {
    let of_terms = draws.values.iter().zip(summaries).skip(1);
    terms
        .iter()
        .zip(of_terms)
        .map(|(term, (values, summary))| RateRatio {
            term: term.name.clone(),
            change: term.change.clone(),
            rate_ratio: exp(summary.measured.estimate),
            lower: exp(summary.measured.lower),
            upper: exp(summary.measured.upper),
            prob_below_one: share_below_zero(values),
        })
        .collect()
}

/// The rate at the baseline per `coding.per` units of exposure, from the baseline's summary.
pub fn baseline_rate(coding: &Coding, summary: &LogSummary) -> BaselineRate {
    let rate = summary.measured.exp_times(coding.per);
    BaselineRate {
        rate: rate.estimate,
        lower: rate.lower,
        upper: rate.upper,
        at: coding.covariates.iter().map(at_baseline).collect(),
    }
}

/// What the answer is told about and from.
#[derive(Debug, Clone, Copy)]
pub struct Question<'a> {
    /// `[study] answer`: a term, or `baseline`.
    pub term: &'a str,
    /// Column of the incident counts.
    pub incidents: &'a str,
    /// Level of every interval.
    pub interval: f64,
}

/// The answer to the study's question; `None` when the coding has no such term.
pub fn answer(question: Question, coding: &Coding, draws: &Draws, summaries: &[LogSummary]) -> Option<Answer> {
    let place = draws.parameters.iter().position(|name| name == question.term)?;
    let summary = summaries.get(place)?;
    let is_baseline = place == 0;
    let measured = summary.measured.exp_times(if is_baseline { coding.per } else { 1.0 });
    let prob_below_one = share_below_zero(draws.values.get(place)?);
    let evidence = Evidence {
        measured,
        interval: question.interval,
        prob_below_one,
        effective_draws: summary.effective_draws,
    };
    let sentence = if is_baseline {
        let at: Vec<String> = coding.covariates.iter().map(at_baseline).collect();
        baseline_sentence(
            question.incidents,
            coding.exposure_column.as_deref(),
            coding.per,
            &at,
            &evidence,
        )
    } else {
        let (_, meaning) = meanings(coding).into_iter().find(|(name, _)| name == question.term)?;
        let others = if coding.covariates.len() > 1 {
            Others::HeldTheSame
        } else {
            Others::None
        };
        ratio_sentence(&meaning, question.incidents, others, &evidence)
    };
    Some(Answer {
        sentence,
        term: question.term.to_owned(),
        estimate: measured.estimate,
        lower: measured.lower,
        upper: measured.upper,
        prob_below_one: (!is_baseline).then_some(prob_below_one),
    })
}

/// The share of values below 0.
fn share_below_zero(values: &[f64]) -> f64 {
    if values.is_empty() {
        return 0.5;
    }
    values.iter().filter(|&&value| value < 0.0).count() as f64 / values.len() as f64
}
