//! Text cells, kept in one buffer.

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
