//! The covariates and joints: what the linear predictor is made of.

use std::ops::Range;

use toml::de::DeValue;

use super::fault::{JointFault, MergeFault, SpecFault};
use super::fields::{Faults, Fields};
use super::keys::Bounds;
use super::sections::{in_order, plausible_range, read_standing};
use super::study::{At, Centre, Covariate, CovariateKind, Joint, Merge, PlausibleRange};

/// The value of `as`.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Form {
    Category,
    Number,
    LogNumber,
}

/// One `[[covariate]]` as far as it could be read: relations between tables are checked on what is
/// known, so that one bad value hides no other problem.
pub(super) struct CovariateDraft {
    pub column: Option<At<String>>,
    pub form: Option<Form>,
    /// Levels merged, also where the reference is missing.
    pub merge: Vec<Merge>,
    /// The reference, also where the merges are at fault.
    pub reference: Option<At<String>>,
    kind: Option<CovariateKind>,
    plausible_ratio: Option<PlausibleRange>,
}

impl CovariateDraft {
    /// The covariate, where nothing was at fault.
    pub fn finish(self) -> Option<Covariate> {
        Some(Covariate {
            column: self.column?,
            kind: self.kind?,
            plausible_ratio: self.plausible_ratio?,
        })
    }
}

/// One `[[joint]]` as far as it could be read.
pub(super) struct JointDraft {
    pub of: Option<[At<String>; 2]>,
    plausible_ratio: Option<PlausibleRange>,
    span: Range<usize>,
}

impl JointDraft {
    /// The joint, where nothing was at fault.
    pub fn finish(self) -> Option<Joint> {
        Some(Joint {
            of: self.of?,
            plausible_ratio: self.plausible_ratio?,
            span: self.span,
        })
    }
}

pub(super) fn read_covariate(fields: &Fields<'_>, faults: &mut Faults) -> CovariateDraft {
    let column = fields.text("column", faults);
    let form = fields.choice("as", faults).map(|form| {
        fields.tell_misplaced(form, faults);
        match form {
            "category" => Form::Category,
            "number" => Form::Number,
            _ => Form::LogNumber,
        }
    });
    let mut reference = None;
    let mut merge = Vec::new();
    let kind = match form {
        Some(Form::Category) => {
            reference = fields.text("reference", faults);
            merge = read_merge(fields, column.as_ref(), reference.as_ref(), faults);
            reference.clone().map(|reference| CovariateKind::Category {
                reference,
                merge: merge.clone(),
            })
        }
        Some(Form::Number) => {
            let centre = read_centre(fields, Bounds::NONE, faults);
            let step = fields.number("step", faults);
            centre
                .zip(step)
                .map(|(centre, step)| CovariateKind::Number { centre, step })
        }
        Some(Form::LogNumber) => {
            read_centre(fields, Bounds::POSITIVE, faults).map(|centre| CovariateKind::LogNumber { centre })
        }
        None => None,
    };
    CovariateDraft {
        column,
        form,
        merge,
        reference,
        kind,
        plausible_ratio: read_ratio(fields, faults),
    }
}

fn read_ratio(fields: &Fields<'_>, faults: &mut Faults) -> Option<PlausibleRange> {
    let range = fields.range("plausible_ratio", faults);
    let standing = read_standing(fields, faults);
    Some(plausible_range(range?, standing?))
}

/// A number within bounds, or `"mean"`.
fn read_centre(fields: &Fields<'_>, bounds: Bounds, faults: &mut Faults) -> Option<Centre> {
    let (info, value) = fields.value("centre", faults)?;
    if let DeValue::String(text) = value.get_ref()
        && text == "mean"
    {
        return Some(Centre::Mean);
    }
    let wanted = if bounds == Bounds::NONE {
        info.kind.in_words()
    } else {
        format!("{}, or \"mean\"", bounds.in_words())
    };
    fields
        .number_of(&fields.title("centre"), &wanted, bounds, value, faults)
        .map(Centre::Value)
}

/// The merges of a category, each level taken in once and the reference left.
fn read_merge(
    fields: &Fields<'_>,
    column: Option<&At<String>>,
    reference: Option<&At<String>>,
    faults: &mut Faults,
) -> Vec<Merge> {
    let Some((_, table)) = fields.inline("merge", faults) else {
        return Vec::new();
    };
    let mut merges = Vec::new();
    for (into, value) in in_order(table) {
        let key = format!("`merge.{}` in {}", into.get_ref(), fields.info.heading());
        if into.get_ref().trim().is_empty() {
            faults.push(SpecFault::Blank { key, span: into.span() });
            continue;
        }
        if let Some(levels) = fields.texts_of(&key, "a list of levels in quotes", 1, value, faults) {
            merges.push(Merge {
                into: At {
                    value: into.get_ref().to_string(),
                    span: into.span(),
                },
                levels,
            });
        }
    }
    check_merges(column.map_or("", |column| &column.value), reference, &merges, faults);
    merges
}

fn check_merges(column: &str, reference: Option<&At<String>>, merges: &[Merge], faults: &mut Faults) {
    let mut tell = |why, span: &Range<usize>| {
        faults.push(SpecFault::BadMerge {
            column: column.to_string(),
            why,
            span: span.clone(),
        });
    };
    let mut taken: Vec<&str> = Vec::new();
    for level in merges.iter().flat_map(|merge| &merge.levels) {
        if taken.contains(&level.value.as_str()) {
            let why = MergeFault::TakenTwice {
                level: level.value.clone(),
            };
            tell(why, &level.span);
        }
        taken.push(&level.value);
    }
    for merge in merges {
        // A new level may bear the name of a level that it takes in itself, but a name that another
        // merge takes away would make the outcome depend on the order of the merges.
        if merged_into(merges, &merge.into.value).is_some() {
            let why = MergeFault::NewLevelTaken {
                into: merge.into.value.clone(),
            };
            tell(why, &merge.into.span);
        }
    }
    if let Some(reference) = reference
        && let Some(into) = merged_into(merges, &reference.value)
    {
        let why = MergeFault::ReferenceTaken {
            reference: reference.value.clone(),
            into: into.to_string(),
        };
        tell(why, &reference.span);
    }
}

/// The other level that a level is merged into, if any.
pub(super) fn merged_into<'m>(merges: &'m [Merge], level: &str) -> Option<&'m str> {
    merges
        .iter()
        .find(|merge| merge.into.value != level && merge.levels.iter().any(|taken| taken.value == level))
        .map(|merge| merge.into.value.as_str())
}

pub(super) fn read_joint(fields: &Fields<'_>, faults: &mut Faults) -> JointDraft {
    let of = fields.texts("of", faults).and_then(|columns| {
        let why = match columns.as_slice() {
            [first, second] if first.value == second.value => JointFault::SameTwice {
                column: first.value.clone(),
            },
            [first, second] => return Some([first.clone(), second.clone()]),
            other => JointFault::NotTwo { columns: other.len() },
        };
        faults.push(SpecFault::BadJoint {
            why,
            span: fields.place("of").unwrap_or_else(|| fields.span.clone()),
        });
        None
    });
    JointDraft {
        of,
        plausible_ratio: read_ratio(fields, faults),
        span: fields.span.clone(),
    }
}
