//! The coding at work: from columns of a table to coded columns, names and words.
//!
//! `build` codes the rows of a study through here, and a prediction codes new rows through here:
//! one path, so that a new row means what an old one meant.

use super::cell_rule::{CellRule, MOST_STEPS};
use super::covariates::{self, Values, Wanted, merged};
use super::fault::{DesignFault, MissingColumn};
use super::rows::{BadCells, Rows};
use super::types::{Coding, ColumnCoding, CovariateCoding};
use crate::diagnostic::nearest;
use crate::numeric::ln;
use crate::table::Table;
use std::f64::consts::LN_2;

/// How many members of a merged level are named before the rest is only counted.
const MEMBERS_TOLD: usize = 10;

/// What a coded column stands for, in words.
struct Part {
    /// `decking=grooved`, `slope_deg`
    name: String,
    /// "grooved against plain", "other (mesh, paint) against plain", "per 2 more in slope_deg", "per doubling of queue"
    change: String,
    /// As the first part of a joint term: "of grooved against plain", "per 2 more in slope_deg"
    ratio: String,
    /// As the second part of a joint term: "where season is summer and not winter", "for each 2 more in slope_deg"
    condition: String,
}

/// What a coded column was made of.
#[derive(Debug, Clone, Copy)]
pub(super) enum Source {
    /// The covariate at this place.
    Covariate(usize),
    /// The joint term at this place.
    Joint(usize),
}

impl Coding {
    /// Codes rows of a table: one vector for each term, of one value for each entry of `rows`.
    ///
    /// # Errors
    /// A column that the table lacks, a number that cannot be read or taken a logarithm of, a
    /// level that the coding does not know; all of them together.
    ///
    /// # Panics
    /// On a row index past the end of the table, a mistake of the caller.
    pub fn code(&self, table: &Table, rows: &[usize]) -> Result<Vec<Vec<f64>>, Vec<DesignFault>> {
        let rows = Rows {
            table,
            rows: rows.to_vec(),
        };
        let mut faults = Vec::new();
        let names = self.covariates.iter().map(|covariate| covariate.column.as_str());
        let missing: Vec<MissingColumn> = names
            .filter(|name| table.column(name).is_none())
            .map(|name| MissingColumn {
                name: name.to_owned(),
                span: None,
                nearest: nearest(name, table.columns.iter().map(|column| column.name.as_str())).map(str::to_owned),
            })
            .collect();
        if !missing.is_empty() {
            faults.push(DesignFault::MissingColumns {
                missing,
                present: table.columns.iter().map(|column| column.name.clone()).collect(),
            });
        }
        let read = |covariate: &CovariateCoding| {
            let wanted = Wanted::by_coding(&covariate.coding);
            covariates::read(&rows, &covariate.column, wanted, &mut faults)
        };
        let values: Vec<Option<Values>> = self.covariates.iter().map(read).collect();
        let values: Option<Vec<Values>> = values.into_iter().collect();
        match values {
            Some(values) if faults.is_empty() => self.columns(&rows, &values),
            _ => Err(faults),
        }
    }

    /// The coded columns of values that have been read for each covariate.
    pub(super) fn columns(&self, rows: &Rows, values: &[Values]) -> Result<Vec<Vec<f64>>, Vec<DesignFault>> {
        let mut faults = Vec::new();
        let mut by_covariate = Vec::with_capacity(self.covariates.len());
        for (covariate, values) in self.covariates.iter().zip(values) {
            by_covariate.push(coded(covariate, rows, values, &mut faults));
        }
        if !faults.is_empty() {
            return Err(faults);
        }
        let mut columns: Vec<Vec<f64>> = by_covariate.iter().flatten().cloned().collect();
        for &[first, second] in &self.joints {
            for a in &by_covariate[first] {
                for b in &by_covariate[second] {
                    columns.push(a.iter().zip(b).map(|(a, b)| a * b).collect());
                }
            }
        }
        Ok(columns)
    }

    /// Number of coefficients: the baseline and the coded columns.
    pub fn coefficients(&self) -> usize {
        let of = |covariate: &CovariateCoding| match &covariate.coding {
            ColumnCoding::Category { levels, .. } => levels.len(),
            ColumnCoding::Number { .. } | ColumnCoding::LogNumber { .. } => 1,
        };
        let single: usize = self.covariates.iter().map(of).sum();
        let joint = |[first, second]: &[usize; 2]| of(&self.covariates[*first]) * of(&self.covariates[*second]);
        1 + single + self.joints.iter().map(joint).sum::<usize>()
    }

    /// For each coded column its name and the change that its rate ratio stands for, in words:
    /// those of each covariate in order, then those of each joint term.
    pub fn names_and_changes(&self) -> Vec<(String, String)> {
        let parts: Vec<Vec<Part>> = self.covariates.iter().map(parts).collect();
        let single = parts
            .iter()
            .flatten()
            .map(|part| (part.name.clone(), part.change.clone()));
        let joint = self.joints.iter().flat_map(|&[first, second]| {
            let seconds = &parts[second];
            parts[first].iter().flat_map(move |a| {
                seconds.iter().map(move |b| {
                    let name = format!("{} with {}", a.name, b.name);
                    (name, format!("factor on the ratio {}, {}", a.ratio, b.condition))
                })
            })
        });
        single.chain(joint).collect()
    }

    /// For each coded column, what it was made of.
    pub(super) fn sources(&self) -> Vec<Source> {
        let width = |place: usize| match &self.covariates[place].coding {
            ColumnCoding::Category { levels, .. } => levels.len(),
            ColumnCoding::Number { .. } | ColumnCoding::LogNumber { .. } => 1,
        };
        let single =
            (0..self.covariates.len()).flat_map(|place| std::iter::repeat_n(Source::Covariate(place), width(place)));
        let joint = self.joints.iter().enumerate();
        let joint = joint.flat_map(|(place, &[a, b])| std::iter::repeat_n(Source::Joint(place), width(a) * width(b)));
        single.chain(joint).collect()
    }
}

fn coded(covariate: &CovariateCoding, rows: &Rows, values: &Values, faults: &mut Vec<DesignFault>) -> Vec<Vec<f64>> {
    let mut bad = BadCells::default();
    let tell = |rule: CellRule, at: usize, bad: &mut BadCells| {
        if let Some(column) = rows.table.column(&covariate.column) {
            bad.add(rule, rows.bad(at, column));
        }
    };
    let columns = match (&covariate.coding, values) {
        (
            ColumnCoding::Category {
                reference,
                levels,
                merge,
            },
            Values::Levels { of_row, names },
        ) => {
            // For each level of the table: its coded column, none for the reference, or unknown.
            let place = |name: &String| {
                let level = merged(merge, name);
                if level == reference {
                    Some(None)
                } else {
                    levels.iter().position(|known| known == level).map(Some)
                }
            };
            let places: Vec<Option<Option<usize>>> = names.iter().map(place).collect();
            let mut columns = vec![vec![0.0; of_row.len()]; levels.len()];
            for (at, &name) in of_row.iter().enumerate() {
                match places[name] {
                    Some(Some(column)) => columns[column][at] = 1.0,
                    Some(None) => {}
                    None => tell(CellRule::NewLevel, at, &mut bad),
                }
            }
            columns
        }
        (ColumnCoding::Number { centre, step }, Values::Numbers(numbers)) => {
            vec![numbers.iter().map(|number| (number - centre) / step).collect()]
        }
        (ColumnCoding::LogNumber { centre }, Values::Numbers(numbers)) => {
            let log_centre = ln(*centre);
            vec![numbers.iter().map(|&number| (ln(number) - log_centre) / LN_2).collect()]
        }
        // `read` makes the values that the coding wants.
        _ => Vec::new(),
    };
    for column in &columns {
        for (at, value) in column.iter().enumerate() {
            // NaN comes of a centre or a step at the edge of what a float holds.
            if value.is_nan() || value.abs() > MOST_STEPS {
                tell(CellRule::CovariateFar, at, &mut bad);
            }
        }
    }
    bad.into_faults(faults);
    columns
}

fn parts(covariate: &CovariateCoding) -> Vec<Part> {
    let column = &covariate.column;
    match &covariate.coding {
        ColumnCoding::Category {
            reference,
            levels,
            merge,
        } => {
            let reference = with_members(reference, merge);
            let part = |level: &String| {
                let told = with_members(level, merge);
                Part {
                    name: format!("{column}={level}"),
                    change: format!("{told} against {reference}"),
                    ratio: format!("of {told} against {reference}"),
                    condition: format!("where {column} is {told} and not {reference}"),
                }
            };
            levels.iter().map(part).collect()
        }
        ColumnCoding::Number { step, .. } => vec![Part {
            name: column.clone(),
            change: format!("per {step} more in {column}"),
            ratio: format!("per {step} more in {column}"),
            condition: format!("for each {step} more in {column}"),
        }],
        ColumnCoding::LogNumber { .. } => vec![Part {
            name: column.clone(),
            change: format!("per doubling of {column}"),
            ratio: format!("per doubling of {column}"),
            condition: format!("for each doubling of {column}"),
        }],
    }
}

/// A level with those that were taken into it: `other (mesh, paint)` where the name is new,
/// `grooved (with mesh and paint)` where it is itself a level of the file.
fn with_members(level: &str, merge: &[(String, String)]) -> String {
    let taken = || {
        merge
            .iter()
            .filter(|(_, into)| into == level)
            .map(|(from, _)| from.as_str())
    };
    let others: Vec<&str> = taken().filter(|&from| from != level).collect();
    let rest = others.len().saturating_sub(MEMBERS_TOLD);
    let told = &others[..others.len() - rest];
    let itself = taken().any(|from| from == level);
    match (told.split_last(), rest) {
        (None, _) => level.to_owned(),
        (Some((last, [])), 0) if itself => format!("{level} (with {last})"),
        (Some((last, first)), 0) if itself => format!("{level} (with {} and {last})", first.join(", ")),
        (Some(_), 0) => format!("{level} ({})", told.join(", ")),
        (Some(_), rest) => {
            let with = if itself { "with " } else { "" };
            format!("{level} ({with}{} and {rest} more)", told.join(", "))
        }
    }
}
