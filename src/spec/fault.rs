//! All that can be wrong with a spec, each with its facts in fields.

use crate::diagnostic::one_line;
use std::fmt;
use std::ops::Range;

use super::study::{At, Source};

/// Why a spec was refused: every problem that was found, in the order of the text.
#[derive(Debug, Clone, PartialEq)]
pub struct SpecError {
    /// The text; empty where the file could not be read as text.
    pub source: Source,
    /// The problems, at least one.
    pub faults: Vec<SpecFault>,
}

/// One problem of a spec. Spans are byte ranges into [`Source::text`].
#[derive(Debug, Clone, PartialEq)]
pub enum SpecFault {
    /// The file could not be read.
    Unreadable {
        /// What the system said.
        reason: String,
    },
    /// The file is larger than [`MOST_BYTES`](super::MOST_BYTES).
    TooLarge,
    /// `period` names the column of the units.
    PeriodIsUnit {
        /// The column.
        column: String,
        /// Where `period` names it.
        span: Range<usize>,
    },
    /// The file is no spec and looks like a table.
    IsTable,
    /// The file holds nothing but white space and comments.
    Empty,
    /// The file is not UTF-8.
    NotUtf8 {
        /// Line of the first bad byte, counted from 1.
        line: usize,
        /// Place of the first bad byte, counted from 0.
        offset: usize,
        /// What the file seems to be instead.
        looks_like: Encoding,
    },
    /// The text is not TOML.
    Syntax {
        /// What is wrong, in the words of the TOML reader.
        what: String,
        /// Where.
        span: Range<usize>,
    },
    /// A table or key that no spec has.
    UnknownKey {
        /// Heading of the table that holds it; `None` at the top of the spec.
        table: Option<String>,
        /// The key.
        key: At<String>,
        /// What may have been meant.
        hint: KeyHint,
    },
    /// A table, key or value that is planned.
    NotYet {
        /// As the spec has it: `[grouping]`, `as = "season"`.
        part: String,
        /// What it will say.
        what: &'static str,
        /// Where.
        span: Range<usize>,
    },
    /// A key that another value of the deciding key would need.
    Misplaced {
        /// Heading of the table.
        table: String,
        /// The key.
        key: At<String>,
        /// The key that decides, as in `as`.
        decided_by: &'static str,
        /// The value of that key.
        decided: String,
        /// Values of the deciding key that the key goes with.
        goes_with: &'static [&'static str],
    },
    /// A table that every spec needs.
    MissingTable {
        /// Its heading.
        table: String,
    },
    /// A key that its table needs.
    MissingKey {
        /// Heading of the table.
        table: String,
        /// The key, or the keys of which one must stand.
        key: String,
        /// A line that would do, to be adapted.
        example: String,
        /// Place of the table.
        span: Range<usize>,
    },
    /// A value of the wrong type.
    WrongType {
        /// The key.
        key: String,
        /// What it must be, in words.
        wanted: String,
        /// What it is, in words.
        found: &'static str,
        /// Place of the value.
        span: Range<usize>,
    },
    /// A text that is none of the allowed ones.
    NotAChoice {
        /// The key.
        key: String,
        /// The value.
        value: At<String>,
        /// The allowed values.
        choices: Vec<&'static str>,
        /// The one that is nearest, if any is near.
        nearest: Option<&'static str>,
    },
    /// A number outside its bounds, or not finite.
    OutOfBounds {
        /// The key.
        key: String,
        /// The value as the spec has it.
        value: At<String>,
        /// What it must be, in words.
        wanted: String,
    },
    /// A range that is none.
    BadRange {
        /// The key.
        key: String,
        /// What is wrong with it.
        why: RangeFault,
        /// Place of the range.
        span: Range<usize>,
    },
    /// A text or a list that is empty.
    Blank {
        /// The key.
        key: String,
        /// Place of the value.
        span: Range<usize>,
    },
    /// Two terms of one name.
    DuplicateTerm {
        /// What stands twice: a column, a joint, or a name that every fit has.
        term: String,
        /// Where it stands first; `None` for a name that every fit has.
        first: Option<Range<usize>>,
        /// Where it stands again.
        again: Range<usize>,
    },
    /// The counts have another role too.
    CountsReused {
        /// The column of the counts.
        column: String,
        /// The key that names it again.
        key: String,
        /// Place of that.
        span: Range<usize>,
    },
    /// A joint of something that is no pair of covariates.
    BadJoint {
        /// What is wrong with it.
        why: JointFault,
        /// Place.
        span: Range<usize>,
    },
    /// Levels merged in a way that means nothing.
    BadMerge {
        /// Column of the covariate.
        column: String,
        /// What is wrong.
        why: MergeFault,
        /// Place.
        span: Range<usize>,
    },
    /// A range and earlier data for one baseline.
    TwoBaselines {
        /// Place of the range.
        range: Range<usize>,
        /// Place of the earlier data.
        earlier: Range<usize>,
    },
    /// Earlier data that no exact prior comes of.
    EarlierRefused {
        /// Why.
        why: EarlierFault,
        /// Place.
        span: Range<usize>,
    },
    /// An answer that is no term of this spec.
    NoSuchAnswer {
        /// The answer.
        answer: At<String>,
        /// Why it is none.
        why: AnswerFault,
        /// Names of the terms that the spec has, a level of a category written as `LEVEL`.
        terms: Vec<String>,
    },
}

/// What a file that is not UTF-8 seems to be.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Encoding {
    /// It starts with a byte-order mark of UTF-16.
    Utf16,
    /// Anything else, most often a Latin alphabet in one byte a letter.
    Other,
}

/// What an unknown key may have been meant for.
#[derive(Debug, Clone, PartialEq)]
pub enum KeyHint {
    /// A known key of the same table is spelt like it.
    Nearest(&'static str),
    /// It is a key of the table with this heading.
    BelongsTo(String),
    /// Nothing near.
    Nothing,
}

/// What is wrong with a range.
#[derive(Debug, Clone, PartialEq)]
pub enum RangeFault {
    /// It has not two ends.
    NotTwo {
        /// How many it has.
        ends: usize,
    },
    /// An end is not a finite number.
    NotFinite {
        /// The end as the spec has it.
        end: String,
    },
    /// An end is 0 or below.
    NotPositive {
        /// That end.
        end: f64,
    },
    /// The larger end stands first.
    Reversed {
        /// The end that stands first.
        lo: f64,
        /// The end that stands second.
        hi: f64,
    },
    /// Both ends are equal.
    Empty {
        /// The ends.
        at: f64,
    },
    /// The ends differ by less than [`NARROWEST`](super::NARROWEST) allows.
    TooNarrow {
        /// The smaller end.
        lo: f64,
        /// The larger end.
        hi: f64,
    },
    /// `{ }` without `from` and `to`.
    NoEnds,
}

/// What is wrong with a joint.
#[derive(Debug, Clone, PartialEq)]
pub enum JointFault {
    /// Not two columns.
    NotTwo {
        /// How many.
        columns: usize,
    },
    /// One column twice.
    SameTwice {
        /// The column.
        column: String,
    },
    /// No `[[covariate]]` has this column.
    NoCovariate {
        /// The column.
        column: String,
        /// The covariate that is spelt like it.
        nearest: Option<String>,
    },
}

/// What is wrong with merged levels.
#[derive(Debug, Clone, PartialEq)]
pub enum MergeFault {
    /// A level is taken into two others, or twice into one.
    TakenTwice {
        /// The level.
        level: String,
    },
    /// A new level is itself taken away by another merge.
    NewLevelTaken {
        /// The new level.
        into: String,
    },
    /// The reference is taken away.
    ReferenceTaken {
        /// The reference.
        reference: String,
        /// The level that takes it in.
        into: String,
    },
}

/// Why earlier data cannot be used.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum EarlierFault {
    /// The family is not Poisson.
    NotPoisson,
    /// They were not seen at the reference.
    NotAtReference,
    /// They are marked as provisional.
    Provisional,
}

/// Why an answer is no term.
#[derive(Debug, Clone, PartialEq)]
pub enum AnswerFault {
    /// No term has such a name.
    Unknown {
        /// The name that is spelt like it.
        nearest: Option<String>,
    },
    /// It names the level that the others are compared with.
    IsReference {
        /// That level.
        level: String,
    },
    /// It names a level that is merged into another.
    MergedAway {
        /// That level.
        level: String,
        /// The level that takes it in.
        into: String,
    },
}

impl SpecFault {
    /// Where it starts in the text, to tell problems in the order of the text.
    pub(super) fn start(&self) -> usize {
        self.span().map_or(0, |span| span.start)
    }

    /// The characters at fault, where the fault has some.
    pub fn span(&self) -> Option<Range<usize>> {
        match self {
            SpecFault::Unreadable { .. }
            | SpecFault::TooLarge
            | SpecFault::IsTable
            | SpecFault::Empty
            | SpecFault::NotUtf8 { .. }
            | SpecFault::MissingTable { .. } => None,
            SpecFault::UnknownKey { key, .. } | SpecFault::Misplaced { key, .. } => Some(key.span.clone()),
            SpecFault::NotAChoice { value, .. } | SpecFault::OutOfBounds { value, .. } => Some(value.span.clone()),
            SpecFault::NoSuchAnswer { answer, .. } => Some(answer.span.clone()),
            SpecFault::DuplicateTerm { again, .. } => Some(again.clone()),
            SpecFault::TwoBaselines { earlier, .. } => Some(earlier.clone()),
            SpecFault::Syntax { span, .. }
            | SpecFault::NotYet { span, .. }
            | SpecFault::MissingKey { span, .. }
            | SpecFault::WrongType { span, .. }
            | SpecFault::BadRange { span, .. }
            | SpecFault::Blank { span, .. }
            | SpecFault::CountsReused { span, .. }
            | SpecFault::PeriodIsUnit { span, .. }
            | SpecFault::BadJoint { span, .. }
            | SpecFault::BadMerge { span, .. }
            | SpecFault::EarlierRefused { span, .. } => Some(span.clone()),
        }
    }
}

impl fmt::Display for SpecError {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        write!(f, "the spec {} cannot be used: ", self.source.file)?;
        f.write_str(&one_line(&self.diagnostics()))
    }
}

impl std::error::Error for SpecError {}
