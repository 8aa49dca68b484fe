//! The faults of a design in words.

use super::build::MOST_COEFFICIENTS;
use super::cell_rule::BadCell;
use super::fault::{CollinearTerm, DesignError, DesignFault, LevelRole, MissingColumn, UnknownLevel};
use crate::diagnostic::{Diagnostic, PLACES_SHOWN, Place, one_line};
use std::fmt;
use std::ops::Range;

impl DesignError {
    /// The faults in words, one diagnostic for each kind.
    pub fn diagnostics(&self) -> Vec<Diagnostic> {
        let mut told: Vec<Diagnostic> = Vec::new();
        for fault in of_one_kind_together(&self.faults) {
            let next = self.diagnostic(&fault);
            match told.iter_mut().find(|known| known.code == next.code) {
                Some(known) => {
                    known.message = format!("{}; {}", known.message, next.message);
                    known.places.extend(next.places);
                    known.places.truncate(PLACES_SHOWN);
                    known.places_in_all += next.places_in_all;
                }
                None => told.push(next),
            }
        }
        told
    }

    fn spec(&self, span: &Range<usize>, label: impl Into<String>) -> Place {
        Place::Spec {
            file: self.spec_file.clone(),
            span: span.clone(),
            label: label.into(),
        }
    }

    fn diagnostic(&self, fault: &DesignFault) -> Diagnostic {
        match fault {
            DesignFault::MissingColumns { missing, present } => self.missing_columns(missing, present),
            DesignFault::Cells { rule, cells } => {
                let place = |cell: &BadCell| Place::Cell {
                    file: self.table_file.clone(),
                    line: Some(cell.line),
                    column: Some(cell.column.clone()),
                    value: Some(cell.value.clone()),
                };
                Diagnostic::new(
                    rule.code(),
                    rule.message(cells.len()),
                    cells.iter().map(place).collect(),
                    rule.help(cells),
                )
            }
            DesignFault::UnknownLevels { role, unknown } => self.unknown_levels(*role, unknown),
            DesignFault::NoRows {
                read,
                not_kept,
                with_gaps,
            } => Diagnostic::new(
                "no-rows-left",
                format!("no row is left: of {read}, `keep` leaves out {not_kept} and {with_gaps} have gaps"),
                vec![Place::File {
                    file: self.table_file.clone(),
                }],
                "look at `keep` and `gap_marks` in `[data]`, and at the columns that are mostly empty",
            ),
            DesignFault::OneLevel { column, level, span } => Diagnostic::new(
                "one-level",
                format!("the category `{column}` has one level, \"{level}\", in all rows used"),
                vec![self.spec(span, format!("always \"{level}\""))],
                "with one level there is nothing to compare: take the covariate out, or look at what `keep` and `merge` leave of it",
            ),
            DesignFault::ManyLevels {
                column,
                levels,
                rows,
                span,
            } => Diagnostic::new(
                "too-many-levels",
                format!("the category `{column}` has {levels} levels in {rows} rows"),
                vec![self.spec(span, format!("{levels} levels"))],
                "a column that is nearly different in every row is a name or a measure and no category: take it out, \
                 code it `as = \"number\"`, or `merge` its levels",
            ),
            DesignFault::ConstantNumber { column, value, span } => Diagnostic::new(
                "constant-number",
                format!("`{column}` is {value} in all rows used"),
                vec![self.spec(span, format!("always {value}"))],
                "the rate ratio of what never changes cannot be told from the baseline: take the covariate out, or look at what \
                 `keep` leaves of it",
            ),
            DesignFault::JointColumn { column, span } => Diagnostic::new(
                "joint-column",
                format!("`[[joint]]` names `{column}`, which is no covariate of the spec"),
                vec![self.spec(span, "no covariate")],
                "add a `[[covariate]]` for it: a joint term comes on top of the terms of both columns",
            ),
            DesignFault::TakenName { name, spans } => Diagnostic::new(
                "taken-name",
                format!("`{name}` would name more than one parameter of the model"),
                spans
                    .iter()
                    .map(|span| self.spec(span, format!("makes `{name}`")))
                    .collect(),
                "rename the column or the level in the data file, or take one of the terms out",
            ),
            DesignFault::FewRows { rows, coefficients } => Diagnostic::new(
                "few-rows",
                format!(
                    "the spec asks for {coefficients} coefficients (the baseline and its terms), and {rows} rows are used"
                ),
                vec![Place::File {
                    file: self.table_file.clone(),
                }],
                "take covariates out or merge levels until the rows are well above the coefficients",
            ),
            DesignFault::TooManyTerms { coefficients } => Diagnostic::new(
                "too-many-terms",
                format!(
                    "the spec asks for {coefficients} coefficients (the baseline and its terms), and {MOST_COEFFICIENTS} are the most"
                ),
                vec![Place::File {
                    file: self.table_file.clone(),
                }],
                "take out covariates that are names rather than kinds, merge levels, or take out a joint term",
            ),
            DesignFault::Collinear { terms } => self.collinear(terms),
            DesignFault::UnknownAnswer {
                answer,
                span,
                nearest,
                terms,
            } => Diagnostic::new(
                "unknown-answer",
                format!("`[study] answer` is `{answer}`, and the model has no such term"),
                vec![self.spec(span, did_you_mean(nearest))],
                format!("name one of {}", listed(&with_baseline(terms))),
            ),
        }
    }

    fn missing_columns(&self, missing: &[MissingColumn], present: &[String]) -> Diagnostic {
        let place = |column: &MissingColumn| match &column.span {
            Some(span) => self.spec(span, did_you_mean(&column.nearest)),
            None => Place::Cell {
                file: self.table_file.clone(),
                line: None,
                column: Some(column.name.clone()),
                value: None,
            },
        };
        let mut names: Vec<String> = missing.iter().map(|column| column.name.clone()).collect();
        names.dedup();
        Diagnostic::new(
            "missing-column",
            format!("the table `{}` has no column {}", self.table_file, listed(&names)),
            missing.iter().map(place).collect(),
            format!("the table has {}", listed(present)),
        )
    }

    fn unknown_levels(&self, role: LevelRole, unknown: &[UnknownLevel]) -> Diagnostic {
        let places = unknown
            .iter()
            .map(|level| self.spec(&level.span, did_you_mean(&level.nearest)))
            .collect();
        let (code, what) = match role {
            LevelRole::Keep => ("unknown-keep-level", "`keep` names"),
            LevelRole::Merge => ("unknown-merge-level", "`merge` names"),
            LevelRole::Reference => ("unknown-reference", "`reference` names"),
        };
        let names: Vec<String> = unknown
            .iter()
            .map(|level| format!("{}={}", level.column, level.level))
            .collect();
        let mut help = Vec::new();
        for level in unknown {
            let among = match role {
                LevelRole::Keep => "",
                LevelRole::Merge | LevelRole::Reference => "in the rows used ",
            };
            let line = format!("{among}`{}` has {}", level.column, listed(&level.present));
            if !help.contains(&line) {
                help.push(line);
            }
        }
        Diagnostic::new(
            code,
            format!("{what} {}, which no row used has", listed(&names)),
            places,
            format!("{}; capital letters count", help.join("; ")),
        )
    }

    fn collinear(&self, terms: &[CollinearTerm]) -> Diagnostic {
        let told = |term: &CollinearTerm| match term.follows_from.as_slice() {
            [] => format!("`{}` is the same in every row", term.name),
            others => format!("`{}` follows from {}", term.name, listed(others)),
        };
        let message: Vec<String> = terms.iter().map(told).collect();
        Diagnostic::new(
            "collinear",
            format!("the rows cannot tell these terms apart: {}", message.join("; ")),
            terms.iter().map(|term| self.spec(&term.span, told(term))).collect(),
            "take one of the terms out, or merge levels: which one is a matter of the question, not of the data",
        )
    }
}

/// Faults that list cells or levels, joined with those of their kind.
fn of_one_kind_together(faults: &[DesignFault]) -> Vec<DesignFault> {
    let mut joined: Vec<DesignFault> = Vec::new();
    for fault in faults {
        let merged = joined.iter_mut().any(|known| match (known, fault) {
            (DesignFault::Cells { rule: known, cells }, DesignFault::Cells { rule, cells: more }) if known == rule => {
                cells.extend_from_slice(more);
                true
            }
            (
                DesignFault::UnknownLevels { role: known, unknown },
                DesignFault::UnknownLevels { role, unknown: more },
            ) if known == role => {
                unknown.extend_from_slice(more);
                true
            }
            _ => false,
        });
        if !merged {
            joined.push(fault.clone());
        }
    }
    joined
}

/// Names in backticks, the first dozen and a count.
fn listed(names: &[String]) -> String {
    const SHOWN: usize = 12;
    let shown: Vec<String> = names.iter().take(SHOWN).map(|name| format!("`{name}`")).collect();
    let rest = names.len().saturating_sub(SHOWN);
    match rest {
        0 => shown.join(", "),
        _ => format!("{} and {rest} more", shown.join(", ")),
    }
}

fn did_you_mean(nearest: &Option<String>) -> String {
    nearest
        .as_ref()
        .map(|name| format!("did you mean `{name}`?"))
        .unwrap_or_default()
}

fn with_baseline(terms: &[String]) -> Vec<String> {
    terms.iter().cloned().chain(["baseline".to_owned()]).collect()
}

impl fmt::Display for DesignError {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        write!(
            f,
            "{} with {}: {}",
            self.spec_file,
            self.table_file,
            one_line(&self.diagnostics())
        )
    }
}

impl std::error::Error for DesignError {}
