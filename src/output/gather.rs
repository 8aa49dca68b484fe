//! Gathers all that was found into one [`Findings`]; no statistic is made here.

use crate::answer::{self, LogSummary, Measured, Question};
use crate::check::{UnitsCheck, is_provisional};
use crate::design::Design;
use crate::fit::{Assessment, Fit, ScatterMode, Verdict};
use crate::output::OutputError;
use crate::output::findings::{
    AUDIENCE, CoefficientFinding, Findings, LAYOUT, ModeFinding, Note, SamplingFinding, StopReason, StudyFacts,
};
use crate::output::manifest::steps_word;
use crate::spec::{Family, Spec, ZeroCounts};

/// Code of the note that belongs to the units' check.
pub const NOTE_ON_UNITS: &str = "units-in-sample";

/// All findings of one fit.
///
/// # Errors
/// [`OutputError::NotFinite`] when draws and design do not belong together, or a parameter has no
/// figures.
pub fn findings(spec: &Spec, design: &Design, fit: &Fit, units: UnitsCheck) -> Result<Findings, OutputError> {
    let summaries: Vec<LogSummary> = fit.assessments.iter().map(log_summary).collect();
    let missing = |place: &str| OutputError::NotFinite {
        file: "findings.json",
        place: place.to_owned(),
    };
    let baseline = summaries.first().ok_or_else(|| missing("/baseline_rate"))?;
    let question = Question {
        term: &spec.study.answer.value,
        incidents: &spec.incidents.column.value,
        interval: spec.report.interval,
    };
    let answer = answer::answer(question, &design.coding, &fit.draws, &summaries).ok_or_else(|| missing("/answer"))?;
    let sampling = sampling(spec, fit);
    Ok(Findings {
        layout: LAYOUT,
        ratewright: env!("CARGO_PKG_VERSION").to_owned(),
        audience: AUDIENCE.to_owned(),
        study: study(spec, design),
        data: design.audit.clone(),
        answer,
        coefficients: coefficients(fit),
        rate_ratios: answer::rate_ratios(&design.terms, &fit.draws, &summaries),
        baseline_rate: answer::baseline_rate(&design.coding, baseline),
        units,
        mode: mode(fit),
        notes: notes(spec, design, sampling.stopped),
        sampling,
    })
}

fn study(spec: &Spec, design: &Design) -> StudyFacts {
    StudyFacts {
        title: spec.study.title.clone(),
        question: spec.study.question.clone(),
        answer_term: spec.study.answer.value.clone(),
        family: match spec.family {
            Family::Poisson => "poisson",
            Family::NegativeBinomial { .. } => "negative-binomial",
        }
        .to_owned(),
        incidents_column: spec.incidents.column.value.clone(),
        unit_column: spec.data.unit.value.clone(),
        exposure_column: design.coding.exposure_column.clone(),
        per: design.coding.per,
        interval: spec.report.interval,
        seed: spec.study.seed,
        hide_counts_below: spec.report.hide_counts_below,
        show_zero: spec.report.zero_counts == ZeroCounts::Shown,
    }
}

fn log_summary(assessment: &Assessment) -> LogSummary {
    LogSummary {
        measured: Measured {
            estimate: assessment.median,
            lower: assessment.lower,
            upper: assessment.upper,
            error_of_lower: assessment.error_of_lower,
            error_of_upper: assessment.error_of_upper,
        },
        effective_draws: assessment.effective_draws,
    }
}

fn coefficients(fit: &Fit) -> Vec<CoefficientFinding> {
    let named = fit.draws.parameters.iter().zip(&fit.assessments).enumerate();
    named
        .map(|(place, (term, a))| CoefficientFinding {
            term: term.clone(),
            median: a.median,
            lower: a.lower,
            upper: a.upper,
            mean: a.mean,
            sd: a.sd,
            error_of_mean: a.error_of_mean,
            error_of_lower: a.error_of_lower,
            error_of_upper: a.error_of_upper,
            effective_draws: a.effective_draws,
            effective_tail_draws: a.effective_tail_draws,
            split_r_hat: a.split_r_hat,
            laplace_mean: fit.laplace.mean[place],
            laplace_sd: fit.laplace.sd(place),
        })
        .collect()
}

fn sampling(spec: &Spec, fit: &Fit) -> SamplingFinding {
    // A parameter that never moved has no standard deviation to measure an error in; its
    // effective draws tell of it.
    let moved = || fit.assessments.iter().filter(|a| a.sd > 0.0);
    let worst = |errors: &mut dyn Iterator<Item = f64>| errors.fold(0.0, f64::max);
    let fewest = |draws: &mut dyn Iterator<Item = f64>| draws.fold(f64::INFINITY, f64::min);
    SamplingFinding {
        steps: steps_word(spec.sampling.steps).to_owned(),
        chains: fit.draws.chains,
        warm_up: fit.warm_up,
        draws: fit.draws.in_all(),
        accepted: fit.accepted,
        stopped: match fit.verdict {
            Verdict::Met => StopReason::PrecisionMet,
            Verdict::More { .. } => StopReason::MostDraws,
        },
        precision_asked: spec.sampling.precision,
        worst_error_of_mean: worst(&mut moved().map(|a| a.error_of_mean / a.sd)),
        worst_error_of_interval_end: worst(&mut moved().map(|a| a.error_of_lower.max(a.error_of_upper) / a.sd)),
        // One that cannot be computed is worse than any figure.
        largest_r_hat: fit
            .assessments
            .iter()
            .map(|a| a.split_r_hat)
            .reduce(|a, b| Some(a?.max(b?)))
            .flatten(),
        fewest_effective_draws: fewest(&mut fit.assessments.iter().map(|a| a.effective_draws)),
        fewest_effective_tail_draws: fewest(&mut fit.assessments.iter().map(|a| a.effective_tail_draws)),
        reference: fit.reference.clone(),
    }
}

fn mode(fit: &Fit) -> ModeFinding {
    let mut furthest = (0.0, fit.draws.parameters.first().cloned().unwrap_or_default());
    for (place, (term, a)) in fit.draws.parameters.iter().zip(&fit.assessments).enumerate() {
        let moved = (a.mean - fit.laplace.mean[place]).abs() / a.sd;
        if a.sd > 0.0 && moved > furthest.0 {
            furthest = (moved, term.clone());
        }
    }
    ModeFinding {
        steps: fit.mode.steps,
        log_density: fit.mode.log_density,
        scatter_mode: fit.mode.scatter.map(|mode| {
            match mode {
                ScatterMode::Inside => "inside",
                ScatterMode::AtZero => "at-zero",
            }
            .to_owned()
        }),
        furthest_move: furthest.0,
        furthest_term: furthest.1,
    }
}

fn notes(spec: &Spec, design: &Design, stopped: StopReason) -> Vec<Note> {
    let mut notes = Vec::new();
    let mut note = |code: &str, text: String| {
        notes.push(Note {
            code: code.to_owned(),
            text,
        });
    };
    if stopped == StopReason::MostDraws {
        note(
            "most-draws",
            "Sampling stopped at most_draws before the precision asked for was met. Raise most_draws, or ask for less \
             precision, before these figures are used."
                .to_owned(),
        );
    }
    if is_provisional(spec) {
        note(
            "provisional-range",
            "A plausible range is still the provisional one of a draft. Put in its place what you held plausible \
             before seeing the outcome, and fit again."
                .to_owned(),
        );
    }
    if !design.terms.is_empty() {
        note(
        "association",
        "These are associations: rates that differ together with a column. That the column is the cause follows only \
         from how the study was set up, for instance from a draw by lot."
            .to_owned(),
    );
    }
    if design.units.len() < design.counts.len() {
        note(
            "rows-independent",
            format!(
                "Several rows belong to one {}, and the model takes rows that look alike as independent. If rows of \
                 one are more alike than that, the intervals above are too narrow.",
                spec.data.unit.value
            ),
        );
    }
    note(
        NOTE_ON_UNITS,
        "Each count is used twice, to fit the model and then to judge it, so this check is conservative: it misses \
         some misfits, and a count that lies outside all the same deserves a look. It is no ranking."
            .to_owned(),
    );
    notes
}
