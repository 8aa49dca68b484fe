//! Takes a data file; gives typed columns and, for every row, the line that it came from.

mod cell;
mod error;
mod read;
mod text;

pub use error::{HeaderPlace, RaggedRow, TableError, TableFault};
pub use read::{parse_csv, read_bytes, read_csv};
pub use text::TextCells;

/// A table as it was read: named columns of equal length, nothing judged yet.
#[derive(Debug, Clone, PartialEq)]
pub struct Table {
    /// The file as the person named it.
    pub file: String,
    /// The columns, in the order of the file.
    pub columns: Vec<Column>,
    /// For each row, the line of the file that it starts on, counted from 1 with the header.
    pub lines: Vec<u64>,
}

/// One column.
#[derive(Debug, Clone, PartialEq)]
pub struct Column {
    /// Its name in the header, white space at both ends removed.
    pub name: String,
    /// Its cells.
    pub cells: Cells,
}

/// The cells of a column, as the file typed them.
#[derive(Debug, Clone, PartialEq)]
pub enum Cells {
    /// Text, as CSV has it: one string for each row, white space at both ends removed.
    Text(TextCells),
    /// Numbers, as a run's own `rows.parquet` has them; `None` is a gap.
    Numbers(Vec<Option<f64>>),
}

impl Table {
    /// Number of rows.
    pub fn rows(&self) -> usize {
        self.lines.len()
    }

    /// The column of this exact name.
    pub fn column(&self, name: &str) -> Option<&Column> {
        self.columns.iter().find(|column| column.name == name)
    }
}
