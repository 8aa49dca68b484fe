//! Takes a data file; gives typed columns and, for every row, the line that it came from.

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

/// Text cells in one buffer: a million rows need no million allocations.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct TextCells {
    text: String,
    ends: Vec<usize>,
}

impl TextCells {
    /// Adds one cell.
    pub fn push(&mut self, cell: &str) {
        self.text.push_str(cell);
        self.ends.push(self.text.len());
    }

    /// The cell of a row.
    pub fn get(&self, row: usize) -> &str {
        let start = if row == 0 { 0 } else { self.ends[row - 1] };
        &self.text[start..self.ends[row]]
    }

    /// Number of cells.
    pub fn len(&self) -> usize {
        self.ends.len()
    }

    /// Whether there is none.
    pub fn is_empty(&self) -> bool {
        self.ends.is_empty()
    }

    /// The cells in order.
    pub fn iter(&self) -> impl Iterator<Item = &str> {
        (0..self.len()).map(|row| self.get(row))
    }
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
