//! A starter spec for a table that nobody prepared.
//!
//! In: a table. Out: the text of a spec that parses and builds with that table as it stands, every
//! guess told in a comment beside it, for the evaluator to correct.

mod entries;
mod look;
mod roles;
mod spoilt;
mod write;

use super::build::build;
use super::cell_rule::BadCell;
use super::fault::{DesignError, DesignFault};
use super::types::Design;
use crate::diagnostic::{Diagnostic, Place, one_line};
use crate::spec::{self, Spec, SpecError};
use crate::table::{Column, Table};
use entries::{Entry, LeftOut};
use roles::NoRole;
use std::fmt;
use write::Sheet;

/// Words for what a study may be about.
const PROGRAMME: [&str; 12] = [
    "programme",
    "program",
    "treatment",
    "treated",
    "intervention",
    "arm",
    "trial",
    "policy",
    "scheme",
    "pilot",
    "after",
    "exposed",
];

/// A starter spec.
#[derive(Debug, Clone, PartialEq)]
pub struct Draft {
    /// Its text.
    pub text: String,
    /// The text as it parses.
    pub spec: Spec,
    /// The design that it makes of the table.
    pub design: Design,
}

/// A table for which no spec can be drafted.
#[derive(Debug, Clone, PartialEq)]
pub struct DraftError {
    /// The table as the person named it.
    pub table_file: String,
    /// Why.
    pub fault: DraftFault,
}

/// Why no spec can be drafted.
#[derive(Debug, Clone, PartialEq)]
pub enum DraftFault {
    /// No column could be a count, or the one that is named like incidents holds other cells too.
    NoCount {
        /// The first cell that is no count of each column that is named like one.
        spoilt: Vec<BadCell>,
    },
    /// The column that is named like an exposure holds cells that are none.
    BadExposure {
        /// Those cells.
        cells: Vec<BadCell>,
    },
    /// No column could name the unit of each row.
    NoUnit,
    /// Even without covariates the draft is no spec.
    NoSpec(SpecError),
    /// Even without covariates the draft does not fit the table.
    NoDesign(DesignError),
}

/// Why a text was refused.
enum Refusal {
    Spec(SpecError),
    Design(DesignError),
}

/// Drafts a spec for `table`, which the spec names as `table.file`.
///
/// The draft is checked as a person's spec would be, and covariates that fail are left out with a
/// comment, until it passes. The same table gives the same text.
///
/// # Errors
/// A table in which no column could be a count, or none could name the unit; or whose rows no
/// spec fits.
pub fn draft(table: &Table) -> Result<Draft, DraftError> {
    let refused = |fault| DraftError {
        table_file: table.file.clone(),
        fault,
    };
    let facts = look::facts(table);
    let roles = roles::roles(table, &facts).map_err(|missing| match missing {
        NoRole::Unit => refused(DraftFault::NoUnit),
        NoRole::Incidents => {
            let spoilt = roles::spoilt_counts(&facts, table.rows());
            let spoilt = spoilt.into_iter().map(|(column, row)| bad_cell(table, column, row));
            refused(DraftFault::NoCount {
                spoilt: spoilt.collect(),
            })
        }
        NoRole::Exposure { place, rows } => {
            let bad = |row| bad_cell(table, facts[place].column, row);
            refused(DraftFault::BadExposure {
                cells: rows.into_iter().map(bad).collect(),
            })
        }
    })?;
    let (mut entries, mut left_out) = entries::entries(table, &facts, &roles);
    loop {
        let sheet = Sheet {
            table,
            facts: &facts,
            roles: &roles,
            entries: &entries,
            left_out: &left_out,
        };
        let refusal = match finished(&sheet) {
            Ok(draft) => return Ok(draft),
            Err(refusal) => refusal,
        };
        if entries.is_empty() {
            return Err(refused(match refusal {
                Refusal::Spec(error) => DraftFault::NoSpec(error),
                Refusal::Design(error) => DraftFault::NoDesign(error),
            }));
        }
        leave_out(&refusal, &mut entries, &mut left_out);
    }
}

fn bad_cell(table: &Table, column: &Column, row: usize) -> BadCell {
    BadCell {
        line: table.lines[row],
        column: column.name.clone(),
        value: column.label(row).into_owned(),
    }
}

/// Writes the draft and checks it: first with the baseline as its answer, then, once the levels
/// have given the terms their names, with a term: of a covariate named like a programme, or the first.
fn finished(sheet: &Sheet) -> Result<Draft, Refusal> {
    let first = checked(sheet.text(&[]), sheet.table)?;
    let mut terms = first.design.coding.terms.clone();
    if terms.is_empty() {
        return Ok(first);
    }
    let of_programme = |term: &String| {
        let named = sheet
            .facts
            .iter()
            .filter(|facts| facts.is_named(&PROGRAMME))
            .map(|facts| facts.name());
        named.into_iter().any(|column| makes(column, term))
    };
    let answer = terms.iter().position(of_programme).unwrap_or(0);
    terms[..=answer].rotate_right(1);
    checked(sheet.text(&terms), sheet.table)
}

/// Whether a column's term may bear this name.
fn makes(column: &str, term: &str) -> bool {
    term.strip_prefix(column)
        .is_some_and(|rest| rest.is_empty() || rest.starts_with('='))
}

fn checked(text: String, table: &Table) -> Result<Draft, Refusal> {
    let spec = spec::parse("draft", &text).map_err(Refusal::Spec)?;
    let design = build(&spec, table).map_err(Refusal::Design)?;
    Ok(Draft { text, spec, design })
}

/// Leaves out the covariates that a refusal names; the last one where it names none.
fn leave_out(refusal: &Refusal, entries: &mut Vec<Entry>, left_out: &mut Vec<LeftOut>) {
    let mut at_fault: Vec<LeftOut> = match refusal {
        Refusal::Spec(_) => Vec::new(),
        Refusal::Design(error) => error
            .faults
            .iter()
            .flat_map(|fault| columns_at_fault(fault, entries))
            .collect(),
    };
    at_fault.retain(|fault| entries.iter().any(|entry| entry.column == fault.column));
    if at_fault.is_empty()
        && let Some(entry) = entries.last()
    {
        at_fault.push(LeftOut {
            column: entry.column.clone(),
            because: "the spec does not hold with it".to_owned(),
        });
    }
    entries.retain(|entry| at_fault.iter().all(|fault| fault.column != entry.column));
    for fault in at_fault {
        // One column may have several faults; the first says enough.
        if left_out.iter().all(|known| known.column != fault.column) {
            left_out.push(fault);
        }
    }
}

fn columns_at_fault(fault: &DesignFault, entries: &[Entry]) -> Vec<LeftOut> {
    let left = |column: &str, because: String| LeftOut {
        column: column.to_owned(),
        because,
    };
    let of_term = |name: &str| {
        let makes = |entry: &&Entry| name == entry.column || name.starts_with(&format!("{}=", entry.column));
        entries
            .iter()
            .rfind(makes)
            .map(|entry| entry.column.clone())
            .unwrap_or_default()
    };
    let few_rows_left = || "the rows without gaps leave too little of it".to_owned();
    match fault {
        DesignFault::Collinear { terms } => terms
            .iter()
            .map(|term| {
                left(
                    &of_term(&term.name),
                    format!("it follows from {}", term.follows_from.join(", ")),
                )
            })
            .collect(),
        DesignFault::TakenName { name, .. } => vec![left(&of_term(name), format!("another parameter is named {name}"))],
        DesignFault::OneLevel { column, .. }
        | DesignFault::ConstantNumber { column, .. }
        | DesignFault::ManyLevels { column, .. } => vec![left(column, few_rows_left())],
        DesignFault::UnknownLevels { unknown, .. } => unknown
            .iter()
            .map(|level| left(&level.column, few_rows_left()))
            .collect(),
        DesignFault::Cells { rule, cells } => cells
            .iter()
            .take(1)
            .map(|cell| left(&cell.column, rule.message(cells.len())))
            .collect(),
        _ => Vec::new(),
    }
}

impl DraftError {
    /// The fault in words.
    pub fn diagnostics(&self) -> Vec<Diagnostic> {
        let file = Place::File {
            file: self.table_file.clone(),
        };
        let place = |cell: &BadCell| Place::Cell {
            file: self.table_file.clone(),
            line: Some(cell.line),
            column: Some(cell.column.clone()),
            value: Some(cell.value.clone()),
        };
        match &self.fault {
            DraftFault::NoCount { spoilt } => {
                let (message, places) = if spoilt.is_empty() {
                    ("no column could be the incident counts", vec![file])
                } else {
                    (
                        "what is named like incident counts holds cells that are no counts",
                        spoilt.iter().map(place).collect(),
                    )
                };
                vec![Diagnostic::new(
                    "draft-no-count",
                    message,
                    places,
                    "a count column holds whole numbers from 0 in every cell that is not empty; correct its cells, or \
                     write the spec by hand",
                )]
            }
            DraftFault::BadExposure { cells } => vec![Diagnostic::new(
                "draft-bad-exposure",
                "the column that is named like an exposure holds cells that are no exposures",
                cells.iter().map(place).collect(),
                "write each exposure as a plain number from 0 without separators or units, and leave the cell empty \
                 where it is not known; if the column measures no opportunity for incidents, give it another name",
            )],
            DraftFault::NoUnit => vec![Diagnostic::new(
                "draft-no-unit",
                "no column could say which unit (place, team, school) each row belongs to",
                vec![file],
                "add a column with a name or number for each row's unit",
            )],
            DraftFault::NoSpec(error) => error.diagnostics(),
            DraftFault::NoDesign(error) => error.diagnostics(),
        }
    }
}

impl fmt::Display for DraftError {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        write!(f, "{}: {}", self.table_file, one_line(&self.diagnostics()))
    }
}

impl std::error::Error for DraftError {}
