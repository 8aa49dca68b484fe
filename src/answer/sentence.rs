//! The answer in words, fit for a board: what was found, how sure one can be, and no more.
//!
//! A ratio counts as settled when its whole interval lies on one side of 1 by more than twice the
//! simulation error of the nearer end. Otherwise the sentence says plainly that the data do not
//! settle it, and what is still possible. Every sentence speaks of association ("is lower
//! where"), never of cause.

use crate::answer::meaning::{Meaning, Part};
use crate::answer::number::{Measured, Told, as_written, change_in_words, level, probability};

/// The figures that a sentence tells, on the scale that it tells them on.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Evidence {
    /// The rate ratio, or the rate.
    pub measured: Measured,
    /// Level of its interval.
    pub interval: f64,
    /// Posterior probability that a ratio is below 1; unused for a rate.
    pub prob_below_one: f64,
    /// Bulk effective draws behind it.
    pub effective_draws: f64,
}

/// Whether the data tell on which side of 1 a ratio lies.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Verdict {
    /// Its interval lies below 1.
    Lower,
    /// Its interval lies above 1.
    Higher,
    /// Its interval reaches 1, or comes too near for the simulation to tell.
    Open,
}

impl Evidence {
    /// On which side of 1 the ratio lies, if the data tell.
    pub fn verdict(&self) -> Verdict {
        let m = &self.measured;
        if m.upper + 2.0 * m.error_of_upper < 1.0 {
            Verdict::Lower
        } else if m.lower - 2.0 * m.error_of_lower > 1.0 {
            Verdict::Higher
        } else {
            Verdict::Open
        }
    }

    fn chance(&self, verdict: Verdict) -> String {
        let (side, p) = match verdict {
            Verdict::Higher => ("higher", 1.0 - self.prob_below_one),
            Verdict::Lower | Verdict::Open => ("lower", self.prob_below_one),
        };
        format!(
            "The probability that it is {side} is {}.",
            probability(p, self.effective_draws)
        )
    }
}

/// The sentence for a rate ratio.
///
/// `incidents` is the column of the counts; `others` says whether the model holds more columns
/// than the term's own.
pub fn ratio_sentence(meaning: &Meaning, incidents: &str, others: Others, evidence: &Evidence) -> String {
    match meaning {
        Meaning::Alone { part, while_at } => alone(part, while_at, incidents, others, evidence),
        Meaning::Joint(first, second) => joint(first, second, incidents, evidence),
    }
}

/// Whether the model holds more columns than a term's own.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Others {
    /// It does: they are held the same.
    HeldTheSame,
    /// It does not.
    None,
}

fn alone(part: &Part, while_at: &[String], incidents: &str, others: Others, evidence: &Evidence) -> String {
    let told = evidence.measured.told_apart_from_one();
    let circumstance = part.circumstance();
    let compared = part.compared_with();
    let level = level(evidence.interval);
    let verdict = evidence.verdict();
    let figures = format!(
        "rate ratio {} ({level} interval {} to {})",
        told.estimate, told.lower, told.upper
    );
    let mut text = match verdict {
        Verdict::Open => format!(
            "The data do not settle whether the rate of {incidents} is lower or higher {circumstance}{compared}: \
             {figures}, {}. {}",
            still_possible(&told),
            evidence.chance(verdict)
        ),
        Verdict::Lower | Verdict::Higher => {
            let change = change_in_words(&told.estimate);
            let compared = match (change.as_str(), part) {
                // "2.5 times as high than" is no English.
                (change, Part::Level { reference, .. }) if change.ends_with("as high") => {
                    format!(" as where it is {reference}")
                }
                ("about the same", Part::Level { reference, .. }) => format!(" as where it is {reference}"),
                _ => compared,
            };
            format!(
                "{}, the rate of {incidents} is {change}{compared}: {figures}. {}",
                capitalised(&circumstance),
                evidence.chance(verdict)
            )
        }
    };
    if !while_at.is_empty() {
        text.push_str(&format!(" This holds where {}.", in_a_row(while_at)));
    }
    if others == Others::HeldTheSame {
        text.push_str(" The other columns of the model are held the same.");
    }
    text
}

fn joint(first: &Part, second: &Part, incidents: &str, evidence: &Evidence) -> String {
    let told = evidence.measured.told_apart_from_one();
    let verdict = evidence.verdict();
    let level = level(evidence.interval);
    let subject = format!("the rate ratio of {incidents} for {}", first.as_change());
    let circumstance = second.circumstance();
    let figures = format!(
        "factor {} ({level} interval {} to {})",
        told.estimate, told.lower, told.upper
    );
    match verdict {
        Verdict::Open => format!(
            "The data do not settle whether {subject} is lower or higher {circumstance}{}: {figures}, {}. {}",
            second.compared_with(),
            still_possible(&told),
            evidence.chance(verdict)
        ),
        Verdict::Lower | Verdict::Higher => {
            let change = change_in_words(&told.estimate);
            let compared = match second {
                Part::Level { reference, .. } if change.contains(" as high") || change.starts_with("about") => {
                    format!(" as where it is {reference}")
                }
                _ => second.compared_with(),
            };
            format!(
                "{}, {subject} is {change}{compared}: {figures}. {}",
                capitalised(&circumstance),
                evidence.chance(verdict)
            )
        }
    }
}

/// What an interval around 1 leaves open: `from 29 % lower to 21 % higher`.
fn still_possible(told: &Told) -> String {
    let (lower, upper) = (change_in_words(&told.lower), change_in_words(&told.upper));
    format!("anything from {lower} to {upper}")
}

/// The sentence for the rate at the baseline. `at` says where the baseline sits, one entry for
/// each column of the model.
pub fn baseline_sentence(
    incidents: &str,
    exposure: Option<&str>,
    per: f64,
    at: &[String],
    evidence: &Evidence,
) -> String {
    let told = evidence.measured.told();
    let unit = format!("{incidents} {}", per_exposure(exposure, per));
    let place = if at.is_empty() {
        String::new()
    } else {
        format!("Where {}, the", in_a_row(at))
    };
    let subject = if place.is_empty() { "The" } else { &place };
    format!(
        "{subject} rate is {} {unit} ({} interval {} to {}).",
        told.estimate,
        level(evidence.interval),
        told.lower,
        told.upper
    )
}

/// What a rate is told per: `per 10,000 boardings`, `per unit of boardings`, `per row`.
pub fn per_exposure(exposure: Option<&str>, per: f64) -> String {
    match exposure {
        None => "per row".to_owned(),
        Some(exposure) if per == 1.0 => format!("per unit of {exposure}"),
        Some(exposure) => format!("per {} {exposure}", as_written(per)),
    }
}

/// `a`, `a and b`, `a, b and c`.
pub fn in_a_row(items: &[String]) -> String {
    match items {
        [] => String::new(),
        [only] => only.clone(),
        [most @ .., last] => format!("{} and {last}", most.join(", ")),
    }
}

fn capitalised(text: &str) -> String {
    let mut letters = text.chars();
    letters
        .next()
        .map_or_else(String::new, |first| first.to_uppercase().chain(letters).collect())
}

#[cfg(test)]
mod tests {
    use super::*;

    fn evidence(estimate: f64, lower: f64, upper: f64, prob_below_one: f64) -> Evidence {
        Evidence {
            measured: Measured {
                estimate,
                lower,
                upper,
                error_of_lower: 1e-3,
                error_of_upper: 1e-3,
            },
            interval: 0.95,
            prob_below_one,
            effective_draws: 2e4,
        }
    }

    fn grooved() -> Part {
        Part::Level {
            column: "decking".into(),
            level: "grooved".into(),
            reference: "plain".into(),
        }
    }

    fn slope() -> Part {
        Part::Step {
            column: "slope_deg".into(),
            step: 2.0,
            centre: 8.0,
        }
    }

    fn alone(part: Part) -> Meaning {
        Meaning::Alone { part, while_at: vec![] }
    }

    #[test]
    fn a_settled_level_is_told_with_its_size_and_probability() {
        let told = ratio_sentence(
            &alone(grooved()),
            "falls",
            Others::None,
            &evidence(0.761, 0.612, 0.939, 0.992),
        );
        assert_eq!(
            told,
            "Where decking is grooved, the rate of falls is 24 % lower than where it is plain: rate ratio 0.76 \
             (95 % interval 0.61 to 0.94). The probability that it is lower is above 99 %."
        );
    }

    #[test]
    fn a_higher_rate_is_told_as_higher_and_its_probability_too() {
        let told = ratio_sentence(
            &alone(slope()),
            "falls",
            Others::HeldTheSame,
            &evidence(1.21, 1.07, 1.36, 0.001),
        );
        assert_eq!(
            told,
            "For each 2 more in slope_deg, the rate of falls is 21 % higher: rate ratio 1.21 (95 % interval 1.07 to \
             1.36). The probability that it is higher is above 99 %. The other columns of the model are held the same."
        );
    }

    #[test]
    fn a_large_ratio_is_told_as_times_as_high() {
        let told = ratio_sentence(
            &alone(grooved()),
            "falls",
            Others::None,
            &evidence(2.467, 1.93, 3.28, 1e-4),
        );
        assert!(
            told.contains("is 2.5 times as high as where it is plain: rate ratio 2.5"),
            "{told}"
        );
    }

    #[test]
    fn an_interval_around_one_is_told_as_open() {
        let told = ratio_sentence(
            &alone(grooved()),
            "falls",
            Others::None,
            &evidence(0.93, 0.712, 1.213, 0.71),
        );
        assert_eq!(
            told,
            "The data do not settle whether the rate of falls is lower or higher where decking is grooved than where \
             it is plain: rate ratio 0.93 (95 % interval 0.71 to 1.21), anything from 29 % lower to 21 % higher. The \
             probability that it is lower is 71 %."
        );
    }

    #[test]
    fn percentages_agree_with_the_ratios_beside_them() {
        let mut rough = evidence(1.21, 0.781, 1.904, 0.3);
        rough.measured.error_of_lower = 0.03;
        rough.measured.error_of_upper = 0.03;
        let told = ratio_sentence(&alone(grooved()), "falls", Others::None, &rough);
        assert!(
            told.contains("rate ratio 1.2 (95 % interval 0.8 to 1.9), anything from 20 % lower to 90 % higher."),
            "{told}"
        );
    }

    #[test]
    fn an_end_within_the_simulation_error_of_one_is_open() {
        assert_eq!(evidence(0.85, 0.72, 0.9985, 0.97).verdict(), Verdict::Open);
        assert_eq!(evidence(0.85, 0.72, 0.9975, 0.97).verdict(), Verdict::Lower);
        assert_eq!(evidence(1.3, 1.0015, 1.7, 0.02).verdict(), Verdict::Open);
    }

    #[test]
    fn a_ratio_with_a_joint_term_says_where_it_holds() {
        let meaning = Meaning::Alone {
            part: grooved(),
            while_at: vec!["slope_deg is 8".into()],
        };
        let told = ratio_sentence(
            &meaning,
            "falls",
            Others::HeldTheSame,
            &evidence(0.761, 0.612, 0.939, 0.992),
        );
        assert!(told.contains(" This holds where slope_deg is 8."), "{told}");
    }

    #[test]
    fn a_joint_term_speaks_of_the_ratio_and_not_of_the_rate() {
        let meaning = Meaning::Joint(grooved(), slope());
        let told = ratio_sentence(
            &meaning,
            "falls",
            Others::HeldTheSame,
            &evidence(0.82, 0.71, 0.94, 0.99),
        );
        assert_eq!(
            told,
            "For each 2 more in slope_deg, the rate ratio of falls for decking grooved against plain is 18 % lower: \
             factor 0.82 (95 % interval 0.71 to 0.94). The probability that it is lower is 99 %."
        );
    }

    #[test]
    fn the_baseline_is_a_rate_with_its_place() {
        let at = ["decking is plain".to_owned(), "slope_deg is 8".to_owned()];
        let told = baseline_sentence(
            "falls",
            Some("boardings"),
            10_000.0,
            &at,
            &evidence(16.34, 13.19, 20.12, 0.0),
        );
        assert_eq!(
            told,
            "Where decking is plain and slope_deg is 8, the rate is 16.3 falls per 10,000 boardings (95 % interval \
             13.2 to 20.1)."
        );
        let plain = baseline_sentence("falls", Some("hours"), 1.0, &[], &evidence(3.2, 2.9, 3.6, 0.0));
        assert!(plain.contains("3.20 falls per unit of hours"), "{plain}");
        let bare = baseline_sentence("falls", None, 1.0, &[], &evidence(3.2, 2.9, 3.6, 0.0));
        assert_eq!(bare, "The rate is 3.20 falls per row (95 % interval 2.90 to 3.60).");
    }
}
