//! What `fit` tells on the terminal: the answer first, then what it rests on.
//!
//! Every figure is read from the findings; nothing is computed here but its rounding.

use crate::answer::{self, Measured, as_written, figure, level, probability, roughly, whole};
use crate::check::{UnitCheck, UnitState};
use crate::design::Audit;
use crate::output::findings::{CoefficientFinding, Findings, SamplingFinding, StopReason};
use crate::output::gather::NOTE_ON_UNITS;
use crate::output::shown::{Audience, Observed};
use crate::output::soundness::failed_limits;
use crate::output::text::{Align, Line, Page, shell_word};
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
    not_precise_enough(page, findings, Reasons::InFull);
    page.paragraph(&findings.answer.sentence);
}

/// How much of why a simulation failed is told.
#[derive(Clone, Copy)]
enum Reasons {
    /// Every limit that failed.
    InFull,
    /// They stand further up.
    Above,
}

/// Stands before every block of estimates of a simulation that failed a limit.
fn not_precise_enough(page: &mut Page, findings: &Findings, reasons: Reasons) {
    let failed = failed_limits(&findings.sampling);
    if failed.is_empty() {
        return;
    }
    page.paragraph(&match reasons {
        Reasons::InFull => format!("NOT PRECISE ENOUGH TO REPORT: {}.", failed.join("; ")),
        Reasons::Above => "NOT PRECISE ENOUGH TO REPORT, for the reasons above.".to_owned(),
    });
}

fn rate_ratios(page: &mut Page, findings: &Findings) {
    if findings.rate_ratios.is_empty() {
        return;
    }
    page.heading("Rate ratios");
    not_precise_enough(page, findings, Reasons::Above);
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
            ratio.term.clone(),
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
        not_precise_enough(page, findings, Reasons::Above);
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
    let shown = audience.observed(&check.units);
    let judged: Vec<bool> = check
        .units
        .iter()
        .zip(&shown)
        .filter_map(|(unit, shown)| shown.is_outside(unit))
        .collect();
    let outside = judged.iter().filter(|&&outside| outside).count();
    let interval = level(findings.study.interval);
    let all = check.units.len();
    let left_out = all - judged.len();
    if left_out == 0 {
        page.paragraph(&format!(
            "Of {} (column {}), {} outside the {interval} interval that the model predicts. If the model were right, \
             about {} would by chance.",
            counted(all, "unit"),
            findings.study.unit_column,
            lying(outside),
            roughly(check.outside_by_chance)
        ));
    } else if judged.is_empty() {
        page.paragraph(&format!(
            "Of {} (column {}), none is judged here, so that no small count can be worked out.",
            counted(all, "unit"),
            findings.study.unit_column
        ));
    } else {
        page.paragraph(&format!(
            "Of {} (column {}), {} judged here, and of those {} outside the {interval} interval that the model \
             predicts. The other {} left out of this so that no small count can be worked out. If the model were \
             right, about {} of all {} would lie outside by chance.",
            counted(all, "unit"),
            findings.study.unit_column,
            be(judged.len()),
            lying(outside),
            if left_out == 1 {
                "one is".to_owned()
            } else {
                be(left_out)
            },
            roughly(check.outside_by_chance),
            whole(all as f64)
        ));
    }

    let mut by_tail: Vec<&UnitCheck> = check
        .units
        .iter()
        .zip(&shown)
        .filter(|(_, shown)| matches!(shown, Observed::Count(_)))
        .map(|(unit, _)| unit)
        .collect();
    let hidden = all - by_tail.len();
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
    if hidden > 0 {
        let second = if shown.contains(&Observed::HiddenToo) {
            " Only one is so small: the other is left out so that the first does not follow from a total."
        } else {
            ""
        };
        page.paragraph(&format!(
            "Not named here or judged one by one: {}, since a count below {} could identify a person.{second}",
            counted(hidden, "unit"),
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
        unit.unit.clone(),
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
    page.paragraph(&match (audit.rows_used, audit.rows_read) {
        (1, 1) => "The one row of the file is used.".to_owned(),
        (used, read) if used == read => format!("All {} rows of the file are used.", whole(read as f64)),
        (used, read) => format!("Of the {} of the file, {} used.", counted(read, "row"), be(used)),
    });
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
    let failed = failed_limits(s);
    if !failed.is_empty() {
        page.paragraph("What failed:");
        for limit in &failed {
            page.item(&format!("{limit}."));
        }
    }
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

/// `1 unit`, `1,200 units`.
fn counted(number: usize, noun: &str) -> String {
    match number {
        1 => format!("1 {noun}"),
        more => format!("{} {noun}s", whole(more as f64)),
    }
}

/// `1 is`, `1,200 are`, `none is`.
fn be(number: usize) -> String {
    match number {
        0 => "none is".to_owned(),
        1 => "1 is".to_owned(),
        more => format!("{} are", whole(more as f64)),
    }
}

/// `1 lies`, `3 lie`, `none lies`.
fn lying(number: usize) -> String {
    match number {
        0 => "none lies".to_owned(),
        1 => "1 lies".to_owned(),
        more => format!("{} lie", whole(more as f64)),
    }
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
