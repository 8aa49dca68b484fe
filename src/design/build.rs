//! Builds the design of a study.
//!
//! In: a checked spec and a table. Out: the numbers that the model needs. On the way every cell
//! that the fit will use is judged, and all problems of all kinds are told together.

use super::coding::Source;
use super::collinear::determined;
use super::covariates::{self, Values, Wanted};
use super::fault::{CollinearTerm, DesignError, DesignFault};
use super::outcome;
use super::rows::{self, Reading, Rows, labels, uses};
use super::types::{Audit, Coding, CovariateCoding, Design, PARAMETERS, Term};
use crate::diagnostic::nearest;
use crate::numeric::ln;
use crate::spec::Spec;
use crate::table::{Cells, Column, Table, TextCells};
use std::collections::HashMap;
use std::ops::Range;

/// Builds the design of `spec` from `table`.
///
/// Rows stay in the order of the file. `[data] keep` is applied first, then rows with gaps are
/// refused or dropped. A centre "mean" is the mean over the rows used, each row once, whatever it
/// stands for.
///
/// # Errors
/// Everything in which spec and table do not fit together, all of it at once; what can only be
/// judged on a design that stands (collinear terms, the answer) is judged when nothing else is wrong.
pub fn build(spec: &Spec, table: &Table) -> Result<Design, DesignError> {
    let mut faults = Vec::new();
    match assemble(spec, table, &mut faults) {
        Some(design) if faults.is_empty() => Ok(design),
        _ => Err(refused(spec, table, faults)),
    }
}

fn refused(spec: &Spec, table: &Table, faults: Vec<DesignFault>) -> DesignError {
    DesignError {
        spec_file: spec.source.file.clone(),
        table_file: table.file.clone(),
        faults,
    }
}

/// More coefficients than this are a mistake in the spec: a name taken for a category.
pub(super) const MOST_COEFFICIENTS: usize = 1_000;

fn assemble(spec: &Spec, table: &Table, faults: &mut Vec<DesignFault>) -> Option<Design> {
    rows::missing_columns(spec, table, faults);
    let chosen = rows::choose(spec, table, faults);
    let used = &chosen.used;
    if used.rows.is_empty() {
        return None;
    }
    let outcome = outcome::read(spec, used, faults);
    let (coding, values) = coding_of(spec, used, faults)?;
    taken_names(spec, &coding, faults);
    if !faults.is_empty() {
        return None;
    }
    let columns = match coding.columns(used, &values) {
        Ok(columns) => columns,
        Err(found) => {
            faults.extend(found);
            return None;
        }
    };
    unknown_answer(spec, &coding, faults);
    if used.len() < columns.len() + 1 {
        faults.push(DesignFault::FewRows {
            rows: used.len(),
            coefficients: columns.len() + 1,
        });
    } else {
        collinear_terms(spec, &coding, &columns, faults);
    }
    let (unit_of, units) = labels(table.column(&spec.data.unit.value)?, used.rows.iter().copied());
    Some(Design {
        terms: terms_of(spec, &coding),
        columns,
        log_exposure: outcome.exposure.iter().map(|&exposure| ln(exposure)).collect(),
        exposure: outcome.exposure,
        counts: outcome.counts,
        stands_for: outcome.stands_for,
        lines: used.rows.iter().map(|&row| table.lines[row]).collect(),
        audit: Audit {
            rows_read: table.rows(),
            rows_not_kept: chosen.not_kept,
            lines_dropped: chosen.lines_with_gaps,
            rows_used: used.len(),
            units: units.len(),
        },
        unit_of,
        units,
        coding,
    })
}

/// The columns that a fit of `spec` uses, each once: unit, period, incidents, exposure,
/// stands-for, covariates, and those that `keep` looks at.
pub fn used_columns(spec: &Spec) -> Vec<String> {
    uses(spec).into_iter().map(|(name, _)| name.to_owned()).collect()
}

/// The rows and columns that a fit of `spec` uses, typed: numbers for counts, exposure,
/// stands-for, number covariates and `keep` by numbers; text for all else, and for a column that
/// is used both ways. Lines are those of the original file.
///
/// [`build`] makes the same design of it as of `table`, but for the rows that the audit counts as
/// read, not kept or dropped.
///
/// # Errors
/// As [`build`] has for columns, gaps and `keep`.
pub fn used_rows(spec: &Spec, table: &Table) -> Result<Table, DesignError> {
    let mut faults = Vec::new();
    rows::missing_columns(spec, table, &mut faults);
    let chosen = rows::choose(spec, table, &mut faults);
    if !faults.is_empty() {
        return Err(refused(spec, table, faults));
    }
    let rows = &chosen.used.rows;
    let narrowed = |(name, reading): (&str, Reading)| {
        let column = table.column(name)?;
        let cells = match reading {
            Reading::Number => Cells::Numbers(rows.iter().map(|&row| column.number(row)).collect()),
            Reading::Text => {
                let mut cells = TextCells::default();
                rows.iter().for_each(|&row| cells.push(&column.label(row)));
                Cells::Text(cells)
            }
        };
        Some(Column {
            name: name.to_owned(),
            cells,
        })
    };
    Ok(Table {
        file: table.file.clone(),
        columns: uses(spec).into_iter().filter_map(narrowed).collect(),
        lines: rows.iter().map(|&row| table.lines[row]).collect(),
    })
}

/// The coding and, for each covariate, the values that it was made from.
fn coding_of(spec: &Spec, used: &Rows, faults: &mut Vec<DesignFault>) -> Option<(Coding, Vec<Values>)> {
    let mut covariates = Vec::new();
    let mut all_values = Vec::new();
    for covariate in &spec.covariates {
        let wanted = Wanted::by_spec(&covariate.kind);
        let Some(values) = covariates::read(used, &covariate.column.value, wanted, faults) else {
            continue;
        };
        let Some(coding) = covariates::coding_of(covariate, &values, faults) else {
            continue;
        };
        covariates.push(CovariateCoding {
            column: covariate.column.value.clone(),
            coding,
        });
        all_values.push(values);
    }
    let joints = joints_of(spec, faults)?;
    if covariates.len() < spec.covariates.len() {
        return None;
    }
    let mut coding = Coding {
        exposure_column: spec.exposure.as_ref().map(|exposure| exposure.column.value.clone()),
        per: spec.exposure.as_ref().map_or(1.0, |exposure| exposure.per),
        covariates,
        joints,
        terms: Vec::new(),
    };
    // Before anything is made for each term: two categories of a thousand levels and their joint term
    // would be a million columns, from a file of twenty kilobytes.
    let coefficients = coding.coefficients();
    if coefficients > MOST_COEFFICIENTS {
        faults.push(DesignFault::TooManyTerms { coefficients });
        return None;
    }
    coding.terms = coding.names_and_changes().into_iter().map(|(name, _)| name).collect();
    Some((coding, all_values))
}

fn joints_of(spec: &Spec, faults: &mut Vec<DesignFault>) -> Option<Vec<[usize; 2]>> {
    let mut place = |column: &crate::spec::At<String>| {
        let found = spec
            .covariates
            .iter()
            .position(|covariate| covariate.column.value == column.value);
        if found.is_none() {
            faults.push(DesignFault::JointColumn {
                column: column.value.clone(),
                span: column.span.clone(),
            });
        }
        found
    };
    let places: Vec<[Option<usize>; 2]> = spec
        .joints
        .iter()
        .map(|joint| [place(&joint.of[0]), place(&joint.of[1])])
        .collect();
    places
        .into_iter()
        .map(|[first, second]| Some([first?, second?]))
        .collect()
}

/// Place in the spec of each term.
fn spans_of(spec: &Spec, coding: &Coding) -> Vec<Range<usize>> {
    let span = |source| match source {
        Source::Covariate(place) => spec.covariates[place].column.span.clone(),
        Source::Joint(place) => spec.joints[place].span.clone(),
    };
    coding.sources().into_iter().map(span).collect()
}

fn taken_names(spec: &Spec, coding: &Coding, faults: &mut Vec<DesignFault>) {
    let spans = spans_of(spec, coding);
    let mut places: HashMap<&str, Vec<usize>> = HashMap::new();
    for (place, name) in coding.terms.iter().enumerate() {
        places.entry(name).or_default().push(place);
    }
    for (place, name) in coding.terms.iter().enumerate() {
        let same = &places[name.as_str()];
        let first = same[0] == place;
        if first && (same.len() > 1 || PARAMETERS.contains(&name.as_str())) {
            faults.push(DesignFault::TakenName {
                name: name.clone(),
                spans: same.iter().map(|&place| spans[place].clone()).collect(),
            });
        }
    }
}

fn collinear_terms(spec: &Spec, coding: &Coding, columns: &[Vec<f64>], faults: &mut Vec<DesignFault>) {
    let spans = spans_of(spec, coding);
    let terms: Vec<CollinearTerm> = determined(columns)
        .into_iter()
        .map(|found| CollinearTerm {
            name: coding.terms[found.column].clone(),
            follows_from: found.by.iter().map(|&place| coding.terms[place].clone()).collect(),
            span: spans[found.column].clone(),
        })
        .collect();
    if !terms.is_empty() {
        faults.push(DesignFault::Collinear { terms });
    }
}

fn unknown_answer(spec: &Spec, coding: &Coding, faults: &mut Vec<DesignFault>) {
    let answer = &spec.study.answer;
    if answer.value != "baseline" && !coding.terms.contains(&answer.value) {
        let candidates = coding.terms.iter().map(String::as_str).chain(["baseline"]);
        faults.push(DesignFault::UnknownAnswer {
            answer: answer.value.clone(),
            span: answer.span.clone(),
            nearest: nearest(&answer.value, candidates).map(str::to_owned),
            terms: coding.terms.clone(),
        });
    }
}

fn terms_of(spec: &Spec, coding: &Coding) -> Vec<Term> {
    let words = coding.names_and_changes();
    let term = |((name, change), source)| {
        let range = match source {
            Source::Covariate(place) => &spec.covariates[place].plausible_ratio,
            Source::Joint(place) => &spec.joints[place].plausible_ratio,
        };

        Term {
            name,
            change,
            prior_mean: range.log_mean(),
            prior_sd: range.log_sd(),
        }
    };
    words.into_iter().zip(coding.sources()).map(term).collect()
}
