//! What `fit` tells on the terminal: the answer first, then what it rests on.
//!
//! Every figure is read from the findings; nothing is computed here but its rounding.

use crate::answer::{self, Measured, as_written, figure, level, probability, roughly, whole};
use crate::check::{UnitCheck, UnitState};
use crate::design::Audit;
use crate::output::findings::{CoefficientFinding, Findings, SamplingFinding, StopReason};
use crate::output::gather::NOTE_ON_UNITS;
use crate::output::shown::{Audience, Observed};
use crate::output::text::{Align, Line, Page, name, shell_word};
use std::path::Path;

/// Most units outside that are listed; `units.csv` has them all.
const OUTSIDE_SHOWN: usize = 20;
/// Units inside that are listed because they are nearest to an end.
const NEAREST_SHOWN: usize = 3;

/// The findings of a fit as text; `run` is where they were left.
pub fn findings(findings: &Findings, audience: Audience, run: &Path) -> String {
    let mut page = Page::default();
    page.heading(&findings.study.title);
    page.aside(&findings.study.question);
    the_answer(&mut page, findings);
    rate_ratios(&mut page, findings);
    rate_and_scatter(&mut page, findings);
    units(&mut page, findings, audience);
    rows(&mut page, &findings.data);
    simulation(&mut page, findings);
    notes(&mut page, findings);
    the_run(&mut page, run);
    page.finish()
}

fn the_answer(page: &mut Page, findings: &Findings) {
    page.heading("The answer");
    page.paragraph(&findings.answer.sentence);
    if findings.sampling.stopped == StopReason::MostDraws {
        page.paragraph(
            "Sampling stopped before the precision asked for was met: see \"The simulation\" below before using this.",
        );
    }
}

fn rate_ratios(page: &mut Page, findings: &Findings) {
    if findings.rate_ratios.is_empty() {
        return;
    }
    page.heading("Rate ratios");
    let interval = format!("{} interval", level(findings.study.interval));
    let header = [
        ("term", Align::Left),
        ("rate ratio", Align::Right),
        (interval.as_str(), Align::Right),
        ("probability below 1", Align::Right),
    ];
    let mut lines = Vec::new();
    for ratio in &findings.rate_ratios {
        let Some(coefficient) = parameter(findings, &ratio.term) else {
            continue;
        };
        let told = measured(coefficient).exp_times(1.0).told_apart_from_one();
        lines.push(Line::Cells(vec![
            name(&ratio.term),
            told.estimate,
            format!("{} to {}", told.lower, told.upper),
            probability(ratio.prob_below_one, coefficient.effective_draws),
        ]));
        lines.push(Line::Words(ratio.change.clone()));
    }
    page.table(&header, &lines);
    page.paragraph(
        "A rate ratio is the factor on the rate for the change named below its term: 1 is no difference, 0.8 a rate \
         one fifth lower. Figures are posterior medians with equal-tailed intervals.",
    );
}

fn rate_and_scatter(page: &mut Page, findings: &Findings) {
    let study = &findings.study;
    let scatter = parameter(findings, "scatter");
    // The answer has told it already where it is the answer.
    let baseline = parameter(findings, "baseline").filter(|baseline| findings.answer.term != baseline.term);
    if baseline.is_some() || scatter.is_some() {
        page.heading("The rate itself");
    }
    if let Some(baseline) = baseline {
        let evidence = answer::Evidence {
            measured: measured(baseline).exp_times(study.per),
            interval: study.interval,
            prob_below_one: 0.0,
            effective_draws: baseline.effective_draws,
        };
        page.paragraph(&answer::baseline_sentence(
            &study.incidents_column,
            study.exposure_column.as_deref(),
            study.per,
            &findings.baseline_rate.at,
            &evidence,
        ));
    }
    if let Some(scatter) = scatter {
        let told = measured(scatter).told();
        page.paragraph(&format!(
            "The scatter is {} ({} interval {} to {}): rows that look alike in every column of the model differ in \
             their true rate by that share of it, as a standard deviation.",
            told.estimate,
            level(study.interval),
            told.lower,
            told.upper
        ));
    }
}

fn units(page: &mut Page, findings: &Findings, audience: Audience) {
    let check = &findings.units;
    page.heading("Does each count fit the model?");
    let judged = |wanted: Option<bool>| {
        check
            .units
            .iter()
            .filter(|unit| audience.is_outside(unit) == wanted)
            .count()
    };
    let outside = judged(Some(true));
    let not_judged = match judged(None) {
        0 => String::new(),
        units => format!(" ({} with small counts left open)", whole(units as f64)),
    };
    page.paragraph(&format!(
        "Of {} (column {}), {} outside the {} interval that the model predicts{not_judged}; if the model \
         were right, about {} would by chance.",
        if check.units.len() == 1 {
            "1 unit".to_owned()
        } else {
            format!("{} units", whole(check.units.len() as f64))
        },
        findings.study.unit_column,
        match outside {
            0 => "none lies".to_owned(),
            1 => "1 lies".to_owned(),
            more => format!("{} lie", whole(more as f64)),
        },
        level(findings.study.interval),
        roughly(check.outside_by_chance)
    ));

    let is_shown = |unit: &&UnitCheck| matches!(audience.observed(unit), Observed::Count(_));
    let mut by_tail: Vec<&UnitCheck> = check.units.iter().filter(is_shown).collect();
    let nearness = |unit: &UnitCheck| unit.tail_probability.min(1.0 - unit.tail_probability);
    by_tail.sort_by(|a, b| nearness(a).total_cmp(&nearness(b)));
    let (inside, outside): (Vec<&UnitCheck>, Vec<&UnitCheck>) =
        by_tail.into_iter().partition(|unit| unit.state == UnitState::Inside);
    let nearest = inside.len().min(NEAREST_SHOWN);
    let listed = outside
        .iter()
        .take(OUTSIDE_SHOWN)
        .chain(inside.iter().take(NEAREST_SHOWN));
    let lines: Vec<Line> = listed.map(|unit| unit_line(unit)).collect();
    if !lines.is_empty() {
        let header = [
            ("unit", Align::Left),
            ("observed", Align::Right),
            ("expected", Align::Right),
            ("predicted", Align::Right),
            ("", Align::Left),
        ];
        page.table(&header, &lines);
    }
    if nearest > 0 {
        page.paragraph("Those inside that are listed come nearest to an end of their interval.");
    }
    if outside.len() > OUTSIDE_SHOWN {
        page.paragraph(&format!(
            "Not listed: {} more outside; see units.csv.",
            whole((outside.len() - OUTSIDE_SHOWN) as f64)
        ));
    }
    let hidden = check.units.len() - check.units.iter().filter(is_shown).count();
    if hidden > 0 {
        page.paragraph(&format!(
            "{} of the units {} not named here or judged one by one: a count below {} could identify a person.",
            whole(hidden as f64),
            if hidden == 1 { "is" } else { "are" },
            findings.study.hide_counts_below
        ));
    }
    if let Some(note) = findings.notes.iter().find(|note| note.code == NOTE_ON_UNITS) {
        page.paragraph(&note.text);
    }
}

fn unit_line(unit: &UnitCheck) -> Line {
    let state = match unit.state {
        UnitState::Below => "below",
        UnitState::Above => "above",
        UnitState::Inside => "inside",
    };
    Line::Cells(vec![
        name(&unit.unit),
        whole(unit.observed),
        if unit.expected < 100.0 {
            figure(unit.expected, -1)
        } else {
            whole(unit.expected)
        },
        format!("{} to {}", whole(unit.lower), whole(unit.upper)),
        state.to_owned(),
    ])
}

/// What happened to the rows of the file.
pub(super) fn rows(page: &mut Page, audit: &Audit) {
    page.heading("The rows");
    page.paragraph(&format!(
        "{} of the {} rows of the file are used.",
        whole(audit.rows_used as f64),
        whole(audit.rows_read as f64)
    ));
    if audit.rows_not_kept > 0 {
        let rows = audit.rows_not_kept;
        page.paragraph(&format!("{} {} left out by keep.", whole(rows as f64), was(rows)));
    }
    if !audit.lines_dropped.is_empty() {
        const LINES_SHOWN: usize = 10;
        let lines = &audit.lines_dropped;
        let shown: Vec<String> = lines.iter().take(LINES_SHOWN).map(u64::to_string).collect();
        let more = match lines.len().saturating_sub(LINES_SHOWN) {
            0 => String::new(),
            more => format!(" and {more} more, all in manifest.json"),
        };
        page.paragraph(&format!(
            "{} {} dropped because a value is missing: line {}{more}.",
            whole(lines.len() as f64),
            was(lines.len()),
            shown.join(", ")
        ));
    }
}

fn simulation(page: &mut Page, findings: &Findings) {
    page.heading("The simulation");
    let s = &findings.sampling;
    let draws = format!("{} kept draws of {} chains", whole(s.draws as f64), s.chains);
    page.paragraph(&match s.stopped {
        StopReason::PrecisionMet => format!("It stopped because the precision asked for was met, after {draws}."),
        StopReason::MostDraws => format!(
            "It stopped at the limit that most_draws sets, after {draws}, BEFORE the precision asked for was met. The \
             figures above show only digits that the simulation supports; raise most_draws for more."
        ),
    });
    page.paragraph(&errors_in_words(s));
    let r_hat = match s.largest_r_hat {
        Some(r_hat) => format!(
            "The chains agree to an R-hat of {} at worst (1.01 or less is wanted)",
            figure(r_hat, -3)
        ),
        None => "R-hat, the agreement of the chains, could not be computed".to_owned(),
    };
    page.paragraph(&format!(
        "{r_hat}; the draws are worth at least {} independent ones in the middle and {} in the tails (400 or more is \
         wanted).",
        whole(s.fewest_effective_draws.floor()),
        whole(s.fewest_effective_tail_draws.floor())
    ));
    page.paragraph(&format!(
        "The normal approximation at the mode (Laplace) and the draws differ most for {}: {} posterior standard \
         deviations. The draws are what is told here.",
        findings.mode.furthest_term,
        roughly(findings.mode.furthest_move)
    ));
}

fn errors_in_words(s: &SamplingFinding) -> String {
    format!(
        "Done again with another seed, posterior means would move by about {} posterior standard deviations at worst \
         ({} asked), interval ends by about {} ({} asked).",
        roughly(s.worst_error_of_mean),
        as_written(s.precision_asked),
        roughly(s.worst_error_of_interval_end),
        roughly(2.5 * s.precision_asked)
    )
}

fn notes(page: &mut Page, findings: &Findings) {
    let mut notes = findings
        .notes
        .iter()
        .filter(|note| note.code != NOTE_ON_UNITS)
        .peekable();
    if notes.peek().is_some() {
        page.heading("To bear in mind");
    }
    for note in notes {
        page.item(&note.text);
    }
}

fn the_run(page: &mut Page, run: &Path) {
    page.heading("The run");
    page.paragraph(
        "Tables, draws and all findings are in the folder below. findings.json there holds small counts in full and \
         is not for publication.",
    );
    page.verbatim(&run.display().to_string());
    page.paragraph("To repeat it to the last digit:");
    page.verbatim(&format!("ratewright replay {}", shell_word(run)));
}

/// `was` for one, `were` for any other number.
fn was(number: usize) -> &'static str {
    if number == 1 { "was" } else { "were" }
}

fn parameter<'a>(findings: &'a Findings, term: &str) -> Option<&'a CoefficientFinding> {
    findings
        .coefficients
        .iter()
        .find(|coefficient| coefficient.term == term)
}

fn measured(coefficient: &CoefficientFinding) -> Measured {
    Measured {
        estimate: coefficient.median,
        lower: coefficient.lower,
        upper: coefficient.upper,
        error_of_lower: coefficient.error_of_lower,
        error_of_upper: coefficient.error_of_upper,
    }
}
