//! Which columns a spec uses, and which rows of the table.

use super::cell_rule::{BadCell, CellRule};
use super::fault::{DesignFault, LevelRole, MissingColumn, UnknownLevel};
use crate::diagnostic::nearest;
use crate::spec::{At, CovariateKind, Keep, KeepOnly, RowsWithGaps, Spec};
use crate::table::{Column, Table};
use std::collections::{BTreeMap, HashMap};

/// How a column is read.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Reading {
    Text,
    Number,
}

/// Every mention of a column in the spec, in the order unit, period, incidents, exposure,
/// stands-for, covariates, keep.
pub(super) fn mentions(spec: &Spec) -> Vec<(&At<String>, Reading)> {
    let data = &spec.data;
    let mut all = vec![(&data.unit, Reading::Text)];
    all.extend(data.period.iter().map(|column| (column, Reading::Text)));
    all.push((&spec.incidents.column, Reading::Number));
    all.extend(spec.exposure.iter().map(|exposure| (&exposure.column, Reading::Number)));
    all.extend(data.stands_for.iter().map(|column| (column, Reading::Number)));
    all.extend(spec.covariates.iter().map(|covariate| {
        let reading = match covariate.kind {
            CovariateKind::Category { .. } => Reading::Text,
            CovariateKind::Number { .. } | CovariateKind::LogNumber { .. } => Reading::Number,
        };
        (&covariate.column, reading)
    }));
    all.extend(data.keep.iter().map(|keep| {
        let reading = match keep.only {
            KeepOnly::Levels(_) => Reading::Text,
            KeepOnly::Numbers { .. } => Reading::Number,
        };
        (&keep.column, reading)
    }));
    all
}

/// The columns that a spec uses, each once, in the order of [`mentions`]; a column that is read
/// as text anywhere is text, from which its numbers can be read as well.
pub(super) fn uses(spec: &Spec) -> Vec<(&str, Reading)> {
    let mut uses: Vec<(&str, Reading)> = Vec::new();
    for (column, reading) in mentions(spec) {
        match uses.iter_mut().find(|(name, _)| *name == column.value) {
            Some((_, known)) if reading == Reading::Text => *known = Reading::Text,
            Some(_) => {}
            None => uses.push((&column.value, reading)),
        }
    }
    uses
}

/// The table narrowed to the rows that are used.
pub(super) struct Rows<'t> {
    pub table: &'t Table,
    /// Places of the rows in the table, rising.
    pub rows: Vec<usize>,
}

impl Rows<'_> {
    pub fn len(&self) -> usize {
        self.rows.len()
    }

    /// The cell of the `at`-th row used, as a fault shows it.
    pub fn bad(&self, at: usize, column: &Column) -> BadCell {
        bad_cell(self.table, self.rows[at], column)
    }
}

fn bad_cell(table: &Table, row: usize, column: &Column) -> BadCell {
    BadCell {
        line: table.lines[row],
        column: column.name.clone(),
        value: column.label(row).into_owned(),
    }
}

/// Cells that break rules, sorted by rule.
#[derive(Default)]
pub(super) struct BadCells(BTreeMap<CellRule, Vec<BadCell>>);

impl BadCells {
    pub fn add(&mut self, rule: CellRule, cell: BadCell) {
        self.0.entry(rule).or_default().push(cell);
    }

    pub fn into_faults(self, faults: &mut Vec<DesignFault>) {
        faults.extend(
            self.0
                .into_iter()
                .map(|(rule, cells)| DesignFault::Cells { rule, cells }),
        );
    }
}

/// The rows chosen and what became of the others.
pub(super) struct Chosen<'t> {
    pub used: Rows<'t>,
    pub not_kept: usize,
    pub lines_with_gaps: Vec<u64>,
}

/// Columns that the spec names and the table lacks.
pub(super) fn missing_columns(spec: &Spec, table: &Table, faults: &mut Vec<DesignFault>) {
    let names = || table.columns.iter().map(|column| column.name.as_str());
    let missing: Vec<MissingColumn> = mentions(spec)
        .into_iter()
        .filter(|(column, _)| table.column(&column.value).is_none())
        .map(|(column, _)| MissingColumn {
            name: column.value.clone(),
            span: Some(column.span.clone()),
            nearest: nearest(&column.value, names()).map(str::to_owned),
        })
        .collect();
    if !missing.is_empty() {
        faults.push(DesignFault::MissingColumns {
            missing,
            present: names().map(str::to_owned).collect(),
        });
    }
}

/// Chooses the rows: first what `keep` keeps, then, among those, the rows without gaps.
///
/// A gap in a row that another column already excludes is no problem of the study. A row whose
/// `keep` cannot be decided because of a gap counts as a row with a gap.
pub(super) fn choose<'t>(spec: &Spec, table: &'t Table, faults: &mut Vec<DesignFault>) -> Chosen<'t> {
    let marks = &spec.data.gap_marks;
    let mut kept = vec![true; table.rows()];
    let mut bad = BadCells::default();
    for keep in &spec.data.keep {
        let Some(column) = table.column(&keep.column.value) else {
            continue;
        };
        for (row, kept) in kept.iter_mut().enumerate() {
            *kept &= column.is_gap(row, marks) || keeps(keep, table, column, row, &mut bad);
        }
    }
    bad.into_faults(faults);

    let columns: Vec<&Column> = uses(spec).iter().filter_map(|(name, _)| table.column(name)).collect();
    let mut rows = Vec::with_capacity(table.rows());
    let mut gaps = Vec::new();
    let mut lines_with_gaps = Vec::new();
    for row in (0..table.rows()).filter(|&row| kept[row]) {
        let before = gaps.len();
        let empty = columns.iter().filter(|column| column.is_gap(row, marks));
        gaps.extend(empty.map(|column| bad_cell(table, row, column)));
        if gaps.len() == before {
            rows.push(row);
        } else {
            lines_with_gaps.push(table.lines[row]);
        }
    }
    if !gaps.is_empty() && spec.data.rows_with_gaps == RowsWithGaps::Refuse {
        faults.push(DesignFault::Cells {
            rule: CellRule::Gap,
            cells: gaps,
        });
    }
    let chosen = Chosen {
        used: Rows { table, rows },
        not_kept: kept.iter().filter(|kept| !**kept).count(),
        lines_with_gaps,
    };
    unknown_keep_levels(spec, &chosen.used, faults);
    if chosen.used.rows.is_empty() {
        faults.push(DesignFault::NoRows {
            read: table.rows(),
            not_kept: chosen.not_kept,
            with_gaps: chosen.lines_with_gaps.len(),
        });
    }
    chosen
}

/// Whether one condition keeps a row whose cell is no gap.
fn keeps(keep: &Keep, table: &Table, column: &Column, row: usize, bad: &mut BadCells) -> bool {
    match &keep.only {
        KeepOnly::Levels(levels) => {
            let label = column.label(row);
            levels.iter().any(|level| level.value == label)
        }
        KeepOnly::Numbers { from, to } => match column.number(row) {
            Some(number) if !number.is_nan() => {
                from.is_none_or(|from| number >= from) && to.is_none_or(|to| number <= to)
            }
            _ => {
                bad.add(CellRule::KeepNumber, bad_cell(table, row, column));
                true
            }
        },
    }
}

/// A level that `keep` names must occur in a row used: a slip in its name would silently leave
/// rows out. Judged on the rows used, so that the rows of a finished run are judged alike; where
/// no row is left at all, on the whole file, so that only a slip is told.
fn unknown_keep_levels(spec: &Spec, used: &Rows, faults: &mut Vec<DesignFault>) {
    let mut unknown = Vec::new();
    for keep in &spec.data.keep {
        let (KeepOnly::Levels(levels), Some(column)) = (&keep.only, used.table.column(&keep.column.value)) else {
            continue;
        };
        let (_, mut everywhere) = labels(column, 0..used.table.rows());
        everywhere.retain(|level| !level.is_empty());
        let among_used = match used.rows.as_slice() {
            [] => everywhere.clone(),
            rows => labels(column, rows.iter().copied()).1,
        };
        for level in levels.iter().filter(|level| !among_used.contains(&level.value)) {
            unknown.push(UnknownLevel {
                column: keep.column.value.clone(),
                level: level.value.clone(),
                span: level.span.clone(),
                nearest: nearest(&level.value, everywhere.iter().map(String::as_str))
                    .map(str::to_owned)
                    .filter(|near| *near != level.value),
                present: everywhere.clone(),
            });
        }
    }
    if !unknown.is_empty() {
        faults.push(DesignFault::UnknownLevels {
            role: LevelRole::Keep,
            unknown,
        });
    }
}

/// For each of some rows the place of its label among the different labels, and those labels in
/// order of first appearance.
pub(super) fn labels(column: &Column, rows: impl IntoIterator<Item = usize>) -> (Vec<usize>, Vec<String>) {
    let mut places: HashMap<String, usize> = HashMap::new();
    let mut names: Vec<String> = Vec::new();
    let mut of_row = Vec::new();
    for row in rows {
        let label = column.label(row);
        let place = places.get(label.as_ref()).copied().unwrap_or_else(|| {
            places.insert(label.clone().into_owned(), names.len());
            names.push(label.into_owned());
            names.len() - 1
        });
        of_row.push(place);
    }
    (of_row, names)
}
