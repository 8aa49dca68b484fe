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

#[cfg(test)]
mod tests {
    use super::*;
    use crate::design::{ColumnCoding, CovariateCoding};

    fn coding() -> Coding {
        let category = |column: &str, reference: &str, levels: &[&str]| CovariateCoding {
            column: column.to_owned(),
            coding: ColumnCoding::Category {
                reference: reference.to_owned(),
                levels: levels.iter().map(|&level| level.to_owned()).collect(),
                merge: vec![],
            },
        };
        let slope = CovariateCoding {
            column: "slope_deg".into(),
            coding: ColumnCoding::Number { centre: 8.0, step: 2.0 },
        };
        let mut coding = Coding {
            exposure_column: Some("boardings".into()),
            per: 10_000.0,
            covariates: vec![
                category("decking", "plain", &["grooved", "mesh"]),
                category("season", "summer", &["winter", "spring"]),
                slope,
            ],
            joints: vec![[0, 1], [2, 0]],
            terms: vec![],
        };
        coding.terms = coding.names_and_changes().into_iter().map(|(name, _)| name).collect();
        coding
    }

    /// Two draws of each parameter, and summaries that stand where the draws do.
    fn draws_and_summaries(coding: &Coding, value: f64) -> (Draws, Vec<LogSummary>) {
        let mut parameters = vec!["baseline".to_owned()];
        parameters.extend(coding.terms.iter().cloned());
        let summary = |estimate: f64| LogSummary {
            measured: Measured {
                estimate,
                lower: estimate - 0.1,
                upper: estimate + 0.1,
                error_of_lower: 1e-3,
                error_of_upper: 1e-3,
            },
            effective_draws: 1e4,
        };
        let mut summaries = vec![summary(-7.0)];
        summaries.resize(parameters.len(), summary(value));
        let draws = Draws {
            chains: 1,
            per_chain: 4,
            values: parameters.iter().map(|_| vec![value, value, value, -value]).collect(),
            parameters,
        };
        (draws, summaries)
    }

    #[test]
    fn every_term_of_a_coding_has_a_meaning() {
        let names: Vec<String> = meanings(&coding()).into_iter().map(|(name, _)| name).collect();
        assert_eq!(names, coding().terms);
    }

    #[test]
    fn every_term_can_be_the_answer() {
        let coding = coding();
        let (draws, summaries) = draws_and_summaries(&coding, -0.3);
        for term in &draws.parameters {
            let question = Question {
                term,
                incidents: "falls",
                interval: 0.95,
            };
            let answer = answer(question, &coding, &draws, &summaries).unwrap();
            assert_eq!(answer.prob_below_one.is_none(), term == "baseline");
            assert!(answer.sentence.contains("falls"), "{}", answer.sentence);
            if term != "baseline" {
                assert_eq!(answer.prob_below_one, Some(0.75));
                assert!(answer.sentence.contains("26 % lower"), "{}", answer.sentence);
            }
        }
        let unknown = Question {
            term: "decking=rubber",
            incidents: "falls",
            interval: 0.95,
        };
        assert_eq!(answer(unknown, &coding, &draws, &summaries), None);
    }

    #[test]
    fn ratios_are_the_exponentials_of_the_summaries() {
        let coding = coding();
        let (draws, summaries) = draws_and_summaries(&coding, -0.3);
        let terms: Vec<Term> = coding
            .names_and_changes()
            .into_iter()
            .map(|(name, change)| Term {
                name,
                change,
                prior_mean: 0.0,
                prior_sd: 1.0,
            })
            .collect();
        let ratios = rate_ratios(&terms, &draws, &summaries);
        assert_eq!(ratios.len(), terms.len());
        assert_eq!(
            (ratios[0].rate_ratio, ratios[0].lower, ratios[0].upper),
            (exp(-0.3), exp(-0.3 - 0.1), exp(-0.3 + 0.1))
        );
        let rate = baseline_rate(&coding, &summaries[0]);
        assert_eq!(rate.rate, exp(-7.0) * 10_000.0);
        assert_eq!(rate.at, ["decking is plain", "season is summer", "slope_deg is 8"]);
    }
}
