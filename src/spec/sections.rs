//! One function for each table of the spec but the covariates and joints.

use toml::Spanned;
use toml::de::{DeString, DeTable, DeValue};

use super::fault::{EarlierFault, RangeFault, SpecFault};
use super::fields::{Faults, Fields};
use super::study::{
    At, Baseline, Chances, Data, Exposure, Family, Incidents, Keep, KeepOnly, PlausibleRange, Reporting, RowsWithGaps,
    Sampling, Standing, Steps, Study, ZeroCounts,
};
use super::tables::{EARLIER, KEEP_ENDS};

pub(super) fn read_study(fields: &Fields<'_>, faults: &mut Faults) -> Option<Study> {
    let title = fields.text("title", faults);
    let question = fields.text("question", faults);
    let answer = fields.text("answer", faults);
    let seed = fields.whole("seed", faults);
    Some(Study {
        title: title?.value,
        question: question?.value,
        answer: answer?,
        seed: u64::try_from(seed?).ok()?,
    })
}

pub(super) fn read_data(fields: &Fields<'_>, faults: &mut Faults) -> Option<Data> {
    let file = fields.text("file", faults);
    let unit = fields.text("unit", faults);
    let period = fields.text("period", faults);
    let rows_with_gaps = fields.choice("rows_with_gaps", faults);
    let gap_marks = fields.texts("gap_marks", faults).unwrap_or_default();
    let keep = read_keep(fields, faults);
    let stands_for = fields.text("stands_for", faults);
    Some(Data {
        file: file?,
        unit: unit?,
        period,
        rows_with_gaps: match rows_with_gaps? {
            "drop" => RowsWithGaps::Drop,
            _ => RowsWithGaps::Refuse,
        },
        gap_marks: gap_marks.into_iter().map(|mark| mark.value).collect(),
        keep,
        stands_for,
    })
}

/// The conditions of `keep`, in the order of the text.
fn read_keep(fields: &Fields<'_>, faults: &mut Faults) -> Vec<Keep> {
    let Some((_, table)) = fields.inline("keep", faults) else {
        return Vec::new();
    };
    let mut conditions = Vec::new();
    for (column, value) in in_order(table) {
        let key = format!("`keep.{}` in [data]", column.get_ref());
        if column.get_ref().trim().is_empty() {
            faults.push(SpecFault::Blank {
                key,
                span: column.span(),
            });
            continue;
        }
        if let Some(only) = read_keep_only(fields, &key, value, faults) {
            conditions.push(Keep {
                column: At {
                    value: column.get_ref().to_string(),
                    span: column.span(),
                },
                only,
            });
        }
    }
    conditions
}

fn read_keep_only(
    fields: &Fields<'_>,
    key: &str,
    value: &Spanned<DeValue<'_>>,
    faults: &mut Faults,
) -> Option<KeepOnly> {
    let wanted = "a list of levels in quotes, or { from = …, to = … }";
    match value.get_ref() {
        DeValue::Table(table) => {
            let ends = Fields::open(&KEEP_ENDS, table, value.span(), fields.source(), faults);
            if tell_dates(&ends, faults) {
                return None;
            }
            let from = ends.number("from", faults);
            let to = ends.number("to", faults);
            let why = match (from, to) {
                (Some(lo), Some(hi)) if lo > hi => RangeFault::Reversed { lo, hi },
                (None, None) if !ends.has("from") && !ends.has("to") => RangeFault::NoEnds,
                _ => return Some(KeepOnly::Numbers { from, to }),
            };
            faults.push(SpecFault::BadRange {
                key: key.to_string(),
                why,
                span: value.span(),
            });
            None
        }
        _ => fields.texts_of(key, wanted, 1, value, faults).map(KeepOnly::Levels),
    }
}

/// Tells ends that are dates; `true` when there are some.
fn tell_dates(ends: &Fields<'_>, faults: &mut Faults) -> bool {
    let mut told = false;
    for name in ["from", "to"] {
        let Some(value) = ends.raw(name) else { continue };
        let date = match value.get_ref() {
            DeValue::Datetime(_) => true,
            DeValue::String(text) => text.parse::<toml::value::Datetime>().is_ok(),
            _ => false,
        };
        if date {
            faults.push(SpecFault::NotYet {
                part: format!("`{name}` with a date under `keep` in [data]"),
                what: "rows kept by date",
                span: value.span(),
            });
            told = true;
        }
    }
    told
}

pub(super) fn read_incidents(fields: &Fields<'_>, faults: &mut Faults) -> Option<Incidents> {
    let column = fields.text("column", faults);
    Some(Incidents { column: column? })
}

pub(super) fn read_exposure(fields: &Fields<'_>, faults: &mut Faults) -> Option<Exposure> {
    let column = fields.text("column", faults);
    let per = fields.number("per", faults);
    let one_each = fields.switch("one_incident_each_at_most", faults);
    Some(Exposure {
        column: column?,
        per: per?,
        chances: if one_each? {
            Chances::OneIncidentEach
        } else {
            Chances::Many
        },
    })
}

/// The value of `kind` in `[family]`.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum FamilyKind {
    Poisson,
    NegativeBinomial,
}

/// `[family]` as far as it could be read.
#[derive(Default)]
pub(super) struct FamilyDraft {
    /// Which family, as `[baseline]` needs to know.
    pub kind: Option<FamilyKind>,
    /// The whole, where nothing was at fault.
    pub family: Option<Family>,
}

pub(super) fn read_family(fields: &Fields<'_>, faults: &mut Faults) -> FamilyDraft {
    let kind = fields.choice("kind", faults).map(|kind| {
        fields.tell_misplaced(kind, faults);
        match kind {
            "poisson" => FamilyKind::Poisson,
            _ => FamilyKind::NegativeBinomial,
        }
    });
    let family = match kind {
        Some(FamilyKind::Poisson) => Some(Family::Poisson),
        Some(FamilyKind::NegativeBinomial) => {
            let scatter_up_to = fields.number("scatter_up_to", faults);
            let standing = read_standing(fields, faults);
            scatter_up_to
                .zip(standing)
                .map(|(scatter_up_to, standing)| Family::NegativeBinomial {
                    scatter_up_to,
                    standing,
                })
        }
        None => None,
    };
    FamilyDraft { kind, family }
}

/// Reads `[baseline]`; `kind` is that of the family, where it is known.
pub(super) fn read_baseline(fields: &Fields<'_>, kind: Option<FamilyKind>, faults: &mut Faults) -> Option<Baseline> {
    let standing = read_standing(fields, faults);
    match (fields.place("plausible_rate"), fields.place("earlier")) {
        (Some(range), Some(earlier)) => {
            faults.push(SpecFault::TwoBaselines { range, earlier });
            None
        }
        (None, Some(_)) => read_earlier(fields, kind, standing, faults),
        (Some(_), None) => {
            let range = fields.range("plausible_rate", faults);
            Some(Baseline::PlausibleRate(plausible_range(range?, standing?)))
        }
        (None, None) => {
            faults.push(SpecFault::MissingKey {
                table: fields.info.heading(),
                key: fields.info.exactly_one_of.join("` or `"),
                example: fields
                    .info
                    .exactly_one_of
                    .first()
                    .and_then(|name| fields.info.key(name))
                    .map_or_else(String::new, |key| format!("{} = {}", key.name, key.example)),
                span: fields.span.clone(),
            });
            None
        }
    }
}

fn read_earlier(
    fields: &Fields<'_>,
    kind: Option<FamilyKind>,
    standing: Option<Standing>,
    faults: &mut Faults,
) -> Option<Baseline> {
    let earlier = fields.open_inline(&EARLIER, "earlier", faults)?;
    let incidents = earlier.number("incidents", faults);
    let exposure = earlier.number("exposure", faults);
    let at_reference = earlier.switch("at_reference", faults);
    let refused = match (kind, at_reference, standing) {
        (Some(FamilyKind::NegativeBinomial), _, _) => Some(EarlierFault::NotPoisson),
        (_, Some(false), _) => Some(EarlierFault::NotAtReference),
        (_, _, Some(Standing::Provisional)) => Some(EarlierFault::Provisional),
        _ => None,
    };
    if let Some(why) = refused {
        faults.push(SpecFault::EarlierRefused {
            why,
            span: earlier.span.clone(),
        });
    }
    Some(Baseline::Earlier {
        incidents: incidents?,
        exposure: exposure?,
        span: earlier.span,
    })
}

pub(super) fn read_sampling(fields: &Fields<'_>, faults: &mut Faults) -> Option<Sampling> {
    let chains = fields.whole("chains", faults);
    let steps = fields.choice("steps", faults);
    let precision = fields.number("precision", faults);
    let most_draws = fields.whole("most_draws", faults);
    Some(Sampling {
        chains: usize::try_from(chains?).ok()?,
        steps: match steps? {
            "walk" => Steps::Walk,
            _ => Steps::Mixed,
        },
        precision: precision?,
        most_draws: usize::try_from(most_draws?).ok()?,
    })
}

pub(super) fn read_report(fields: &Fields<'_>, faults: &mut Faults) -> Option<Reporting> {
    let interval = fields.number("interval", faults);
    let hide_counts_below = fields.whole("hide_counts_below", faults);
    let show_zero = fields.switch("show_zero", faults);
    Some(Reporting {
        interval: interval?,
        hide_counts_below: u64::try_from(hide_counts_below?).ok()?,
        zero_counts: if show_zero? {
            ZeroCounts::Shown
        } else {
            ZeroCounts::Hidden
        },
    })
}

/// `provisional`, which may stand beside every prior.
pub(super) fn read_standing(fields: &Fields<'_>, faults: &mut Faults) -> Option<Standing> {
    fields.switch("provisional", faults).map(|provisional| {
        if provisional {
            Standing::Provisional
        } else {
            Standing::Settled
        }
    })
}

pub(super) fn plausible_range(ends: At<[f64; 2]>, standing: Standing) -> PlausibleRange {
    let [lo, hi] = ends.value;
    PlausibleRange {
        lo,
        hi,
        span: ends.span,
        standing,
    }
}

/// Entries of a table in the order of the text: the TOML reader keeps them by name.
pub(super) fn in_order<'t, 'a>(table: &'t DeTable<'a>) -> Vec<(&'t Spanned<DeString<'a>>, &'t Spanned<DeValue<'a>>)> {
    let mut entries: Vec<_> = table.iter().collect();
    entries.sort_by_key(|(key, _)| key.span().start);
    entries
}
