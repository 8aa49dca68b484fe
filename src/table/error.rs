//! What can be wrong with a data file before anyone asks what its columns mean.

use crate::diagnostic::{Diagnostic, Place, one_line};
use std::fmt;

/// A data file that cannot be read as a table, with everything that is wrong with it.
#[derive(Debug, Clone, PartialEq)]
pub struct TableError {
    /// The file as the person named it.
    pub file: String,
    /// What is wrong, in the order in which it was found; never empty.
    pub faults: Vec<TableFault>,
}

/// One kind of problem of a data file.
#[derive(Debug, Clone, PartialEq)]
pub enum TableFault {
    /// The file cannot be opened or read.
    Unreadable {
        /// What the system said.
        reason: String,
    },
    /// Nothing in it, or blank lines only.
    Empty,
    /// A byte sequence that is no UTF-8.
    NotUtf8 {
        /// Bytes before it.
        offset: usize,
        /// Its line, counted from 1.
        line: u64,
        /// The first byte of the sequence.
        byte: u8,
    },
    /// The file starts as UTF-16 text does.
    Utf16,
    /// A NUL byte: the file is no text.
    Nul {
        /// Bytes before it.
        offset: usize,
        /// Its line, counted from 1.
        line: u64,
    },
    /// One column only, whose name holds another separator.
    OtherSeparator {
        /// That separator.
        separator: char,
    },
    /// Columns without a name.
    UnnamedColumns {
        /// Where they are.
        columns: Vec<HeaderPlace>,
    },
    /// Column names that stand more than once in the header.
    RepeatedColumns {
        /// Each place where a name stands again.
        columns: Vec<HeaderPlace>,
    },
    /// A header and no row.
    NoRows,
    /// Rows with more or fewer cells than the header.
    Ragged {
        /// Cells in the header.
        header: usize,
        /// The rows.
        rows: Vec<RaggedRow>,
    },
    /// A quotation mark that opens a cell and is never closed: the cell swallows the rest of the file.
    UnclosedQuote {
        /// Line on which its row starts.
        line: u64,
    },
}

/// A place in the header.
#[derive(Debug, Clone, PartialEq)]
pub struct HeaderPlace {
    /// Position of the column, counted from 1.
    pub position: usize,
    /// Its name.
    pub name: String,
    /// Line of the header.
    pub line: u64,
}

/// A row whose number of cells is not the header's.
#[derive(Debug, Clone, PartialEq)]
pub struct RaggedRow {
    /// Line on which it starts.
    pub line: u64,
    /// Cells that it has.
    pub cells: usize,
    /// How its text begins.
    pub text: String,
}

impl TableError {
    /// The faults in words, one diagnostic for each kind.
    pub fn diagnostics(&self) -> Vec<Diagnostic> {
        self.faults.iter().map(|fault| fault.diagnostic(&self.file)).collect()
    }
}

impl TableFault {
    fn diagnostic(&self, file: &str) -> Diagnostic {
        let whole = || vec![Place::File { file: file.to_owned() }];
        let at = |line: u64, column: Option<String>, value: Option<String>| Place::Cell {
            file: file.to_owned(),
            line: Some(line),
            column,
            value,
        };
        match self {
            TableFault::Unreadable { reason } => Diagnostic::new(
                "data-unreadable",
                format!("the data file cannot be read: {reason}"),
                whole(),
                "check the name in `[data] file` (it is relative to the spec) and that the file may be read",
            ),
            TableFault::Empty => Diagnostic::new(
                "data-empty",
                "the data file is empty",
                whole(),
                "export the table again: a line of column names, then one line for each row",
            ),
            TableFault::NotUtf8 { offset, line, byte } => Diagnostic::new(
                "data-not-utf8",
                format!("the data file is not UTF-8 text: byte {offset} (counted from 0) is 0x{byte:02X}"),
                vec![at(*line, None, None)],
                "save it again as \"CSV UTF-8\"; a file from an older program is often Latin-1 or Windows-1252",
            ),
            TableFault::Utf16 => Diagnostic::new(
                "data-not-utf8",
                "the data file is UTF-16 text",
                whole(),
                "save it again as \"CSV UTF-8\"",
            ),
            TableFault::Nul { offset, line } => Diagnostic::new(
                "data-nul",
                format!("the data file holds a NUL byte (byte {offset}, counted from 0): it is no plain text"),
                vec![at(*line, None, None)],
                "this version reads comma-separated text; export a workbook or database table as \"CSV UTF-8\"",
            ),
            TableFault::OtherSeparator { separator } => {
                let name = if *separator == '\t' { "tabs" } else { "semicolons" };
                Diagnostic::new(
                    "data-separator",
                    format!(
                        "the cells of the data file are separated by {name}; this version reads comma-separated tables"
                    ),
                    whole(),
                    "export it again with commas between the cells and a point in decimal numbers",
                )
            }
            TableFault::UnnamedColumns { columns } => Diagnostic::new(
                "data-unnamed-column",
                format!(
                    "{} of the header {} no name",
                    positions(columns),
                    if columns.len() == 1 { "has" } else { "have" }
                ),
                columns.iter().map(|place| at(place.line, None, None)).take(1).collect(),
                "name every column; a comma at the end of the header makes a last column without a name",
            ),
            TableFault::RepeatedColumns { columns } => Diagnostic::new(
                "data-repeated-column",
                "column names stand more than once in the header",
                columns
                    .iter()
                    .map(|place| at(place.line, Some(place.name.clone()), None))
                    .collect(),
                "give each column a name of its own",
            ),
            TableFault::NoRows => Diagnostic::new(
                "data-no-rows",
                "the data file has a header and no row",
                whole(),
                "export the table again, with its rows",
            ),
            TableFault::Ragged { header, rows } => Diagnostic::new(
                "data-ragged",
                format!(
                    "{} not have the {header} cells that the header has{}",
                    do_rows(rows.len()),
                    cells_found(rows)
                ),
                rows.iter()
                    .map(|row| at(row.line, None, Some(row.text.clone())))
                    .collect(),
                "look for a comma inside a cell that lacks quotation marks, or for a missing or surplus comma",
            ),
            TableFault::UnclosedQuote { line } => Diagnostic::new(
                "data-unclosed-quote",
                "a quotation mark opens a cell and is never closed, so that the cell takes in the rest of the file",
                vec![at(*line, None, None)],
                "close the quotation mark, or take it out; inside a quoted cell a quotation mark is written twice",
            ),
        }
    }
}

/// "column 7" or "columns 3, 7".
fn positions(columns: &[HeaderPlace]) -> String {
    let listed: Vec<String> = columns.iter().map(|place| place.position.to_string()).collect();
    format!(
        "column{} {}",
        if columns.len() == 1 { "" } else { "s" },
        listed.join(", ")
    )
}

fn do_rows(rows: usize) -> String {
    if rows == 1 {
        "1 row does".to_owned()
    } else {
        format!("{rows} rows do")
    }
}

/// The numbers of cells that were found instead, where they are few.
fn cells_found(rows: &[RaggedRow]) -> String {
    let mut found: Vec<usize> = rows.iter().map(|row| row.cells).collect();
    found.sort_unstable();
    found.dedup();
    match found.as_slice() {
        [one] => format!(", but {one}"),
        [one, other] => format!(", but {one} or {other}"),
        [] => String::new(),
        [least, .., most] => format!(", but from {least} to {most}"),
    }
}

impl fmt::Display for TableError {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        write!(f, "{}: {}", self.file, one_line(&self.diagnostics()))
    }
}

impl std::error::Error for TableError {}
