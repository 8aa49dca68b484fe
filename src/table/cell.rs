//! What one cell says: a gap, a level, a number.

use super::{Cells, Column};
use std::borrow::Cow;

impl Column {
    /// Whether the cell of `row` holds no value: it is empty, or its text is one of `gap_marks`.
    ///
    /// In a number column only the missing number is a gap: its marks were taken out when it was
    /// first read as text, and a mark such as `-9` must not swallow a number that was written `-9.0`.
    pub fn is_gap(&self, row: usize, gap_marks: &[String]) -> bool {
        match &self.cells {
            Cells::Text(cells) => {
                let cell = cells.get(row);
                cell.is_empty() || gap_marks.iter().any(|mark| mark.trim() == cell)
            }
            Cells::Numbers(numbers) => numbers[row].is_none(),
        }
    }

    /// The cell of `row` as text: a level, a unit, a period. A number is written in its shortest
    /// form, a gap is the empty text.
    pub fn label(&self, row: usize) -> Cow<'_, str> {
        match &self.cells {
            Cells::Text(cells) => Cow::Borrowed(cells.get(row)),
            Cells::Numbers(numbers) => Cow::Owned(numbers[row].map(|number| number.to_string()).unwrap_or_default()),
        }
    }

    /// The cell of `row` as a number; `None` where it is none. A text that is a number too large
    /// for 64 bits is infinite, and `NaN` and `inf` are read as such, for the caller to refuse.
    pub fn number(&self, row: usize) -> Option<f64> {
        match &self.cells {
            Cells::Text(cells) => cells.get(row).parse().ok(),
            Cells::Numbers(numbers) => numbers[row],
        }
    }
}

#[cfg(test)]
mod tests {
    use super::super::TextCells;
    use super::*;

    fn text(cells: &[&str]) -> Column {
        let mut all = TextCells::default();
        cells.iter().for_each(|cell| all.push(cell));
        Column {
            name: "c".into(),
            cells: Cells::Text(all),
        }
    }

    #[test]
    fn gaps_are_the_empty_cell_and_the_marks_named() {
        let column = text(&["", "NA", "n/a", "0"]);
        let marks = vec!["NA".to_owned()];
        let gaps: Vec<bool> = (0..4).map(|row| column.is_gap(row, &marks)).collect();
        assert_eq!(gaps, [true, true, false, false]);
    }

    #[test]
    fn numbers_are_read_as_written_and_nothing_else_is_a_number() {
        let column = text(&["12", "-3.5", "1e400", "nan", "1,000", "12 km", "+7", ""]);
        let read: Vec<Option<f64>> = (0..8).map(|row| column.number(row)).collect();
        assert_eq!(read[0], Some(12.0));
        assert_eq!(read[1], Some(-3.5));
        assert_eq!(read[2], Some(f64::INFINITY));
        assert!(read[3].is_some_and(f64::is_nan));
        assert_eq!(read[4], None);
        assert_eq!(read[5], None);
        assert_eq!(read[6], Some(7.0));
        assert_eq!(read[7], None);
    }

    #[test]
    fn a_number_column_gives_its_shortest_text_back() {
        let column = Column {
            name: "c".into(),
            cells: Cells::Numbers(vec![Some(2.0), Some(0.1), None]),
        };
        assert_eq!(column.label(0), "2");
        assert_eq!(column.label(1), "0.1");
        assert_eq!(column.label(2), "");
        assert!(column.is_gap(2, &[]) && !column.is_gap(0, &["2".to_owned()]));
    }
}
