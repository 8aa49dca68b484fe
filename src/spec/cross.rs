//! What holds between the tables of a spec: one term of each name, joints of covariates, an answer
//! that is a term, counts that are nothing else.

use std::ops::Range;

use super::fault::{AnswerFault, JointFault, SpecFault};
use super::fields::Faults;
use super::predictor::{CovariateDraft, Form, JointDraft, merged_into};
use super::study::{At, Data, Exposure, Incidents};
use crate::diagnostic::nearest;

/// Parameters that every fit may have: no term can share their name.
const RESERVED: [&str; 3] = ["baseline", "scatter", "spread"];

/// Between the names of the two parts of a joint term.
const WITH: &str = " with ";

/// Stands for the levels of a category, which only the data can tell.
const ANY_LEVEL: &str = "LEVEL";

/// Tells covariates and joints that would make two terms of one name, and joints of no covariate.
pub(super) fn check_terms(covariates: &[CovariateDraft], joints: &[JointDraft], faults: &mut Faults) {
    let mut seen: Vec<(&str, Range<usize>)> = Vec::new();
    for covariate in covariates {
        let Some(column) = &covariate.column else { continue };
        if covariate.form != Some(Form::Category) && RESERVED.contains(&column.value.as_str()) {
            faults.push(SpecFault::DuplicateTerm {
                term: column.value.clone(),
                first: None,
                again: column.span.clone(),
            });
        }
        match seen.iter().find(|(name, _)| *name == column.value) {
            Some((_, first)) => faults.push(SpecFault::DuplicateTerm {
                term: column.value.clone(),
                first: Some(first.clone()),
                again: column.span.clone(),
            }),
            None => seen.push((&column.value, column.span.clone())),
        }
    }
    let all_known = covariates.iter().all(|covariate| covariate.column.is_some());
    let mut pairs: Vec<[&At<String>; 2]> = Vec::new();
    for [a, b] in joints.iter().filter_map(|joint| joint.of.as_ref()) {
        let same = |pair: &&[&At<String>; 2]| {
            (pair[0].value == a.value && pair[1].value == b.value)
                || (pair[0].value == b.value && pair[1].value == a.value)
        };
        if let Some(first) = pairs.iter().find(same) {
            faults.push(SpecFault::DuplicateTerm {
                term: format!("{}{WITH}{}", a.value, b.value),
                first: Some(first[0].span.start..first[1].span.end),
                again: a.span.start..b.span.end,
            });
        }
        pairs.push([a, b]);
        // A covariate whose column could not be read may be the one that is meant.
        if all_known {
            for column in [a, b] {
                if !seen.iter().any(|(name, _)| *name == column.value) {
                    faults.push(SpecFault::BadJoint {
                        why: JointFault::NoCovariate {
                            column: column.value.clone(),
                            nearest: nearest(&column.value, seen.iter().map(|(name, _)| *name)).map(str::to_string),
                        },
                        span: column.span.clone(),
                    });
                }
            }
        }
    }
}

/// Tells a column of counts that has another role too: counts explained by themselves mean nothing.
pub(super) fn check_counts_column(
    incidents: Option<&Incidents>,
    exposure: Option<&Exposure>,
    data: Option<&Data>,
    covariates: &[CovariateDraft],
    faults: &mut Faults,
) {
    let Some(counts) = incidents.map(|incidents| &incidents.column.value) else {
        return;
    };
    let exposure = exposure.map(|exposure| ("`column` in [exposure]", &exposure.column));
    let unit = data.map(|data| ("`unit` in [data]", &data.unit));
    let period = data
        .and_then(|data| data.period.as_ref())
        .map(|column| ("`period` in [data]", column));
    let stands_for = data
        .and_then(|data| data.stands_for.as_ref())
        .map(|column| ("`stands_for` in [data]", column));
    let columns = covariates.iter().filter_map(|covariate| covariate.column.as_ref());
    let covariates = columns.map(|column| ("`column` in [[covariate]]", column));
    for (key, column) in exposure
        .into_iter()
        .chain(unit)
        .chain(period)
        .chain(stands_for)
        .chain(covariates)
    {
        if column.value == *counts {
            faults.push(SpecFault::CountsReused {
                column: counts.clone(),
                key: key.to_string(),
                span: column.span.clone(),
            });
        }
    }
}

/// Tells a period that is the unit: it would order nothing, and each row of a unit would seem entered twice.
pub(super) fn check_period(data: Option<&Data>, faults: &mut Faults) {
    if let Some(data) = data
        && let Some(period) = &data.period
        && period.value == data.unit.value
    {
        faults.push(SpecFault::PeriodIsUnit {
            column: period.value.clone(),
            span: period.span.clone(),
        });
    }
}

/// Tells an answer that cannot be a term of this spec, whatever levels the data hold.
pub(super) fn check_answer(
    answer: &At<String>,
    covariates: &[CovariateDraft],
    joints: &[JointDraft],
    faults: &mut Faults,
) {
    let readable = covariates
        .iter()
        .all(|covariate| covariate.column.is_some() && covariate.form.is_some());
    if !readable || joints.iter().any(|joint| joint.of.is_none()) {
        // The term that is meant may be one that could not be read.
        return;
    }
    let name = answer.value.as_str();
    let mut terms = vec!["baseline".to_string()];
    let mut verdicts = Vec::new();
    if name == "baseline" {
        return;
    }
    for covariate in covariates {
        terms.push(pattern(covariate));
        verdicts.push(part(covariate, name));
    }
    for [a, b] in joints.iter().filter_map(|joint| joint.of.as_ref()) {
        let (Some(a), Some(b)) = (of_column(covariates, &a.value), of_column(covariates, &b.value)) else {
            return;
        };
        terms.push(format!("{}{WITH}{}", pattern(a), pattern(b)));
        // A level may itself hold " with ": every place where the name can be parted is tried.
        for (place, _) in name.match_indices(WITH) {
            let (left, right) = (&name[..place], &name[place + WITH.len()..]);
            verdicts.push(match (part(a, left), part(b, right)) {
                (Part::Other, _) | (_, Part::Other) => Part::Other,
                (Part::Term, verdict) | (verdict, _) => verdict,
            });
        }
    }
    if verdicts.iter().any(|verdict| matches!(verdict, Part::Term)) {
        return;
    }
    let refused = verdicts.into_iter().find_map(|verdict| match verdict {
        Part::No(why) => Some(why),
        _ => None,
    });
    let why = refused.unwrap_or_else(|| {
        // Levels are taken as they are spelt, so that the likeness is that of the columns.
        let level = name
            .split_once('=')
            .map_or(ANY_LEVEL, |(_, rest)| rest.split(WITH).next().unwrap_or(rest));
        let spelt: Vec<String> = terms.iter().map(|term| term.replacen(ANY_LEVEL, level, 1)).collect();
        AnswerFault::Unknown {
            nearest: nearest(name, spelt.iter().map(String::as_str)).map(str::to_string),
        }
    });
    faults.push(SpecFault::NoSuchAnswer {
        answer: answer.clone(),
        why,
        terms,
    });
}

/// What a name, or one part of it, is to a covariate.
enum Part {
    /// One of its terms, as far as the spec can tell.
    Term,
    /// A name of its form that can be no term.
    No(AnswerFault),
    /// Not a name of its form.
    Other,
}

fn part(covariate: &CovariateDraft, name: &str) -> Part {
    let Some(column) = &covariate.column else {
        return Part::Other;
    };
    if covariate.form != Some(Form::Category) {
        return if name == column.value { Part::Term } else { Part::Other };
    }
    let Some(level) = name
        .strip_prefix(column.value.as_str())
        .and_then(|rest| rest.strip_prefix('='))
    else {
        return Part::Other;
    };
    if level.is_empty() {
        return Part::Other;
    }
    if covariate
        .reference
        .as_ref()
        .is_some_and(|reference| reference.value == level)
    {
        return Part::No(AnswerFault::IsReference {
            level: level.to_string(),
        });
    }
    match merged_into(&covariate.merge, level) {
        Some(into) => Part::No(AnswerFault::MergedAway {
            level: level.to_string(),
            into: into.to_string(),
        }),
        None => Part::Term,
    }
}

/// How the terms of a covariate are named.
fn pattern(covariate: &CovariateDraft) -> String {
    let column = covariate.column.as_ref().map_or("", |column| &column.value);
    match covariate.form {
        Some(Form::Category) => format!("{column}={ANY_LEVEL}"),
        _ => column.to_string(),
    }
}

fn of_column<'c>(covariates: &'c [CovariateDraft], column: &str) -> Option<&'c CovariateDraft> {
    covariates
        .iter()
        .find(|covariate| covariate.column.as_ref().is_some_and(|known| known.value == column))
}
