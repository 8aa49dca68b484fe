//! From the columns of the covariates to the coding: centres, levels, merges.

use super::cell_rule::CellRule;
use super::fault::{DesignFault, LevelRole, UnknownLevel};
use super::outcome::numbers;
use super::rows::{Rows, labels};
use super::types::ColumnCoding;
use crate::diagnostic::nearest;
use crate::numeric::{exp, ln, mean};
use crate::spec::{Centre, Covariate, CovariateKind, Merge};

/// A category with more levels than this is a mistake, whatever the number of rows.
const MOST_LEVELS: usize = 1000;

/// Up to this many levels a category may differ in nearly every row (the other limits still hold).
const FEW_LEVELS: usize = 10;

/// The cells of one covariate in the rows used.
pub(super) enum Values {
    /// The place in `names` of each row's level; `names` in order of first appearance.
    Levels { of_row: Vec<usize>, names: Vec<String> },
    /// Numbers; for a log-number all above 0.
    Numbers(Vec<f64>),
}

/// What a column has to be before it can be coded.
#[derive(Clone, Copy)]
pub(super) enum Wanted {
    Levels,
    Numbers,
    Positive,
}

impl Wanted {
    pub fn by_spec(kind: &CovariateKind) -> Self {
        match kind {
            CovariateKind::Category { .. } => Wanted::Levels,
            CovariateKind::Number { .. } => Wanted::Numbers,
            CovariateKind::LogNumber { .. } => Wanted::Positive,
        }
    }

    pub fn by_coding(coding: &ColumnCoding) -> Self {
        match coding {
            ColumnCoding::Category { .. } => Wanted::Levels,
            ColumnCoding::Number { .. } => Wanted::Numbers,
            ColumnCoding::LogNumber { .. } => Wanted::Positive,
        }
    }
}

/// Reads a covariate's column; `None` when the table lacks it or a cell breaks a rule, which is told in `faults`.
pub(super) fn read(rows: &Rows, name: &str, wanted: Wanted, faults: &mut Vec<DesignFault>) -> Option<Values> {
    let column = rows.table.column(name)?;
    let before = faults.len();
    let values = match wanted {
        Wanted::Levels => {
            let (of_row, names) = labels(column, rows.rows.iter().copied());
            Values::Levels { of_row, names }
        }
        Wanted::Numbers => Values::Numbers(numbers(rows, name, faults, |_, cell| finite(cell))),
        Wanted::Positive => Values::Numbers(numbers(rows, name, faults, |_, cell| match finite(cell)? {
            number if number > 0.0 => Ok(number),
            _ => Err(CellRule::CovariatePositive),
        })),
    };
    (faults.len() == before).then_some(values)
}

fn finite(cell: Option<f64>) -> Result<f64, CellRule> {
    let number = cell.ok_or(CellRule::CovariateNumber)?;
    if number.is_finite() {
        Ok(number)
    } else {
        Err(CellRule::CovariateFinite)
    }
}

/// The coding of one covariate; `None` when it has none, which is told in `faults`.
pub(super) fn coding_of(covariate: &Covariate, values: &Values, faults: &mut Vec<DesignFault>) -> Option<ColumnCoding> {
    let before = faults.len();
    let coding = match (&covariate.kind, values) {
        (CovariateKind::Category { reference, merge }, Values::Levels { of_row, names }) => {
            unknown_merge_levels(covariate, merge, names, faults);
            let merge = taken_into(merge, names);
            let mut levels: Vec<String> = Vec::new();
            for name in names {
                let merged = merged(&merge, name);
                // A linear search, but over levels and not over rows, and past the limit it stops.
                if levels.len() <= MOST_LEVELS && !levels.iter().any(|level| level == merged) {
                    levels.push(merged.to_owned());
                }
            }
            level_faults(covariate, &levels, names.len(), of_row.len(), faults);
            if !levels.is_empty() && !levels.contains(&reference.value) {
                faults.push(DesignFault::UnknownLevels {
                    role: LevelRole::Reference,
                    unknown: vec![UnknownLevel {
                        column: covariate.column.value.clone(),
                        level: reference.value.clone(),
                        span: reference.span.clone(),
                        nearest: nearest(&reference.value, levels.iter().map(String::as_str)).map(str::to_owned),
                        present: levels.clone(),
                    }],
                });
            }
            levels.retain(|level| *level != reference.value);
            ColumnCoding::Category {
                reference: reference.value.clone(),
                levels,
                merge,
            }
        }
        (CovariateKind::Number { centre, step }, Values::Numbers(numbers)) => {
            constant(covariate, numbers, faults);
            let centre = match centre {
                Centre::Value(centre) => *centre,
                Centre::Mean => exact_mean(numbers),
            };
            ColumnCoding::Number { centre, step: *step }
        }
        (CovariateKind::LogNumber { centre }, Values::Numbers(numbers)) => {
            constant(covariate, numbers, faults);
            let centre = match centre {
                Centre::Value(centre) => *centre,
                Centre::Mean => exp(exact_mean(
                    &numbers.iter().map(|&number| ln(number)).collect::<Vec<f64>>(),
                )),
            };
            ColumnCoding::LogNumber { centre }
        }
        // `read` makes the values that the kind wants; there is nothing to code otherwise.
        _ => return None,
    };
    (faults.len() == before).then_some(coding)
}

/// The levels of the file with the level that each is taken into. A merged name that is itself a
/// level of the file is taken into itself: whoever reads the coding must see it among the members.
fn taken_into(merge: &[Merge], names: &[String]) -> Vec<(String, String)> {
    let mut taken = Vec::new();
    for Merge { into, levels } in merge {
        let itself = names.contains(&into.value) && !levels.iter().any(|level| level.value == into.value);
        let levels = itself.then_some(into).into_iter().chain(levels);
        taken.extend(levels.map(|level| (level.value.clone(), into.value.clone())));
    }
    taken
}

/// The level that a level of the file is taken into.
pub(super) fn merged<'a>(merge: &'a [(String, String)], level: &'a str) -> &'a str {
    merge
        .iter()
        .find(|(from, _)| from == level)
        .map_or(level, |(_, into)| into)
}

/// The mean, with a second pass that takes up the rounding of the first: the centre of a number is
/// written into the run, and should be the mean to the last digits however long the column.
pub(super) fn exact_mean(numbers: &[f64]) -> f64 {
    let first = mean(numbers);
    let rest: Vec<f64> = numbers.iter().map(|number| number - first).collect();
    first + mean(&rest)
}

fn constant(covariate: &Covariate, numbers: &[f64], faults: &mut Vec<DesignFault>) {
    if let Some(&value) = numbers.first()
        && numbers.iter().all(|&number| number == value)
    {
        faults.push(DesignFault::ConstantNumber {
            column: covariate.column.value.clone(),
            value,
            span: covariate.column.span.clone(),
        });
    }
}

fn level_faults(covariate: &Covariate, levels: &[String], in_file: usize, rows: usize, faults: &mut Vec<DesignFault>) {
    let column = covariate.column.value.clone();
    let span = covariate.column.span.clone();
    match levels {
        [level] => faults.push(DesignFault::OneLevel {
            column,
            level: level.clone(),
            span,
        }),
        _ if levels.len() > MOST_LEVELS || (levels.len() > FEW_LEVELS && 10 * levels.len() > 9 * rows) => {
            faults.push(DesignFault::ManyLevels {
                column,
                levels: in_file.max(levels.len()),
                rows,
                span,
            })
        }
        _ => {}
    }
}

fn unknown_merge_levels(covariate: &Covariate, merge: &[Merge], names: &[String], faults: &mut Vec<DesignFault>) {
    let unknown: Vec<UnknownLevel> = merge
        .iter()
        .flat_map(|merge| &merge.levels)
        .filter(|level| !names.contains(&level.value))
        .map(|level| UnknownLevel {
            column: covariate.column.value.clone(),
            level: level.value.clone(),
            span: level.span.clone(),
            nearest: nearest(&level.value, names.iter().map(String::as_str)).map(str::to_owned),
            present: names.to_vec(),
        })
        .collect();
    if !unknown.is_empty() {
        faults.push(DesignFault::UnknownLevels {
            role: LevelRole::Merge,
            unknown,
        });
    }
}
