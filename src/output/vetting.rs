//! What `vet` tells: the rows, what is to be known about them, and what the priors imply.

use crate::answer::{as_written, per_exposure, roughly, whole};
use crate::check::{PriorLook, PriorRange, PriorState};
use crate::design::Audit;
use crate::output::findings::Note;
use crate::output::terminal;
use crate::output::text::{Align, Line, Page};
use serde::Serialize;

/// All that `vet` found; what `vet --json` prints.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct Vetting {
    /// `[study] title`
    pub title: String,
    /// Name of the term that is to answer the question.
    pub answer_term: String,
    /// Column of the incident counts.
    pub incidents_column: String,
    /// Column of the unit.
    pub unit_column: String,
    /// Column of the exposure, where there is one.
    #[serde(skip_serializing_if = "Option::is_none")]
    pub exposure_column: Option<String>,
    /// Rates are told per this many units of exposure.
    pub per: f64,
    /// What happened to the rows.
    pub data: Audit,
    /// What should be known about rows and columns before a fit.
    pub remarks: Vec<Note>,
    /// What the priors imply.
    pub prior: PriorLook,
}

/// The vetting as text.
pub fn text(vetting: &Vetting) -> String {
    let mut page = Page::default();
    page.heading(&vetting.title);
    page.aside(
        "Spec and data fit together. What follows looks at no outcome beyond whether each count is a valid one.",
    );
    terminal::rows(&mut page, &vetting.data);
    page.paragraph(&format!(
        "{} (column {}).",
        match (vetting.data.rows_used, vetting.data.units) {
            (1, _) => "It is the one unit".to_owned(),
            (_, 1) => "They belong to one unit".to_owned(),
            (_, units) => format!("They belong to {} units", whole(units as f64)),
        },
        vetting.unit_column
    ));
    if !vetting.remarks.is_empty() {
        page.heading("To know before a fit");
        for remark in &vetting.remarks {
            page.item(&remark.text);
        }
    }
    ranges(&mut page, vetting);
    counts(&mut page, vetting);
    page.heading("Do the priors deserve a second look?");
    match vetting.prior.state {
        PriorState::Clear => {
            page.paragraph("Nothing here says so. Whether the ranges above are plausible is yours to judge.")
        }
        PriorState::Look => {
            for reason in &vetting.prior.reasons {
                page.item(reason);
            }
        }
    }
    page.finish()
}

fn ranges(page: &mut Page, vetting: &Vetting) {
    page.heading("What the priors hold plausible (central 95 %)");
    let header = [
        ("", Align::Left),
        ("from", Align::Right),
        ("middle", Align::Right),
        ("to", Align::Right),
    ];
    let cells = |label: String, range: &PriorRange| {
        Line::Cells(vec![
            label,
            roughly(range.lower),
            roughly(range.median),
            roughly(range.upper),
        ])
    };
    let prior = &vetting.prior;
    let mut lines = vec![cells(
        format!(
            "rate at the baseline, {}",
            per_exposure(vetting.exposure_column.as_deref(), vetting.per)
        ),
        &prior.baseline_rate,
    )];
    lines.push(cells("rate over all rows".to_owned(), &prior.expected_rate));
    for ratio in &prior.rate_ratios {
        lines.push(cells(format!("rate ratio, {}", ratio.term), &ratio.ratio));
        lines.push(Line::Words(ratio.change.clone()));
    }
    page.table(&header, &lines);
    if let Some(scatter) = &prior.scatter {
        page.paragraph(&format!(
            "The scatter is {} in the middle, and above {} with a probability of 5 %.",
            roughly(scatter.median),
            roughly(scatter.upper)
        ));
    }
}

fn counts(page: &mut Page, vetting: &Vetting) {
    page.heading("What counts that means");
    let prior = &vetting.prior;
    let exposure = match &vetting.exposure_column {
        Some(column) => format!("a typical row, of {} {column},", as_written(prior.typical_exposure)),
        None => "a typical row".to_owned(),
    };
    page.paragraph(&format!(
        "Before any data, {exposure} is expected to show {} to {} {} (95 % of simulated counts; the middle is {}).",
        whole(prior.count.lower),
        whole(prior.count.upper),
        vetting.incidents_column,
        whole(prior.count.median)
    ));
    if let Some(share) = prior.above_chances {
        page.paragraph(&format!(
            "{} % of the simulated counts are above their exposure, which cannot be.",
            roughly(100.0 * share)
        ));
    }
}
