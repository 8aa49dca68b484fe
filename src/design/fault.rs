//! What can be wrong once the spec and the table meet.

use super::cell_rule::{BadCell, CellRule};
use std::ops::Range;

/// A study whose spec and table do not fit together, with everything that is wrong.
#[derive(Debug, Clone, PartialEq)]
pub struct DesignError {
    /// The spec as the person named it.
    pub spec_file: String,
    /// The table as the person named it.
    pub table_file: String,
    /// What is wrong, in the order in which the study is built; never empty.
    pub faults: Vec<DesignFault>,
}

/// One kind of problem of a study.
#[derive(Debug, Clone, PartialEq)]
pub enum DesignFault {
    /// Columns that the spec names and the table lacks.
    MissingColumns {
        /// Each place where such a column is named.
        missing: Vec<MissingColumn>,
        /// The columns that the table has.
        present: Vec<String>,
    },
    /// Cells that break a rule.
    Cells {
        /// The rule.
        rule: CellRule,
        /// The cells, in the order of the file.
        cells: Vec<BadCell>,
    },
    /// Levels that the spec names and no row used has.
    UnknownLevels {
        /// What the levels are named for.
        role: LevelRole,
        /// Each level.
        unknown: Vec<UnknownLevel>,
    },
    /// No row is left to fit.
    NoRows {
        /// Rows in the file.
        read: usize,
        /// Rows that `keep` leaves out.
        not_kept: usize,
        /// Rows with gaps.
        with_gaps: usize,
    },
    /// A category with one level in the rows used.
    OneLevel {
        /// The column.
        column: String,
        /// Its level.
        level: String,
        /// Its place in the spec.
        span: Range<usize>,
    },
    /// A category with too many levels to be one.
    ManyLevels {
        /// The column.
        column: String,
        /// How many levels it has.
        levels: usize,
        /// How many rows there are.
        rows: usize,
        /// Its place in the spec.
        span: Range<usize>,
    },
    /// A number that is the same in every row used.
    ConstantNumber {
        /// The column.
        column: String,
        /// Its value.
        value: f64,
        /// Its place in the spec.
        span: Range<usize>,
    },
    /// A joint term of a column that is no covariate of the spec.
    JointColumn {
        /// The column.
        column: String,
        /// Its place in the spec.
        span: Range<usize>,
    },
    /// Two terms of one name, or a term named like another parameter.
    TakenName {
        /// The name.
        name: String,
        /// The places in the spec whose terms bear it.
        spans: Vec<Range<usize>>,
    },
    /// Fewer rows than coefficients.
    FewRows {
        /// Rows used.
        rows: usize,
        /// Coefficients: the terms and the baseline.
        coefficients: usize,
    },
    /// More coefficients than a study can mean.
    TooManyTerms {
        /// Coefficients: the terms and the baseline.
        coefficients: usize,
    },
    /// Terms that the other terms determine.
    Collinear {
        /// Each such term.
        terms: Vec<CollinearTerm>,
    },
    /// `[study] answer` names no term.
    UnknownAnswer {
        /// What it names.
        answer: String,
        /// Its place in the spec.
        span: Range<usize>,
        /// The term of the most similar name.
        nearest: Option<String>,
        /// All terms.
        terms: Vec<String>,
    },
}

/// A column that the table lacks.
#[derive(Debug, Clone, PartialEq)]
pub struct MissingColumn {
    /// Its name.
    pub name: String,
    /// Where the spec names it; absent when new rows are coded without a spec.
    pub span: Option<Range<usize>>,
    /// The most similar name that the table has.
    pub nearest: Option<String>,
}

/// What a level is named for.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum LevelRole {
    /// `[data] keep`
    Keep,
    /// `merge` of a category.
    Merge,
    /// `reference` of a category.
    Reference,
}

/// A level that no row used has.
#[derive(Debug, Clone, PartialEq)]
pub struct UnknownLevel {
    /// The column.
    pub column: String,
    /// The level.
    pub level: String,
    /// Its place in the spec.
    pub span: Range<usize>,
    /// The most similar level that the column has.
    pub nearest: Option<String>,
    /// The levels that the column has, in order of first appearance.
    pub present: Vec<String>,
}

/// A term that other terms determine.
#[derive(Debug, Clone, PartialEq)]
pub struct CollinearTerm {
    /// The term.
    pub name: String,
    /// The terms that determine it; none when it does not vary at all.
    pub follows_from: Vec<String>,
    /// Its place in the spec.
    pub span: Range<usize>,
}
