//! What a column of an unprepared table looks like.

use crate::numeric::mean;
use crate::table::{Column, Table};
use std::collections::HashMap;

/// Texts that people write where they have no value.
const USUAL_GAP_MARKS: [&str; 14] = [
    "NA", "N/A", "n/a", "#N/A", "NaN", "nan", "NULL", "null", "-", "--", ".", "..", "?", "missing",
];

/// Different levels are counted up to here; a column with more is no category.
const COUNTED_LEVELS: usize = 1000;

/// A column and what it looks like.
pub(super) struct Facts<'t> {
    pub column: &'t Column,
    /// Empty cells and usual gap marks.
    pub gaps: usize,
    /// The different labels with their rows, in order of first appearance, up to [`COUNTED_LEVELS`] and one more.
    pub levels: Vec<(String, usize)>,
    /// What its numbers look like, when every cell that holds something holds a finite number.
    pub numbers: Option<Numbers>,
    /// The rows whose cells hold something else than a finite number.
    pub no_numbers: Vec<usize>,
    /// The cells that begin as a number does, be it written `1,234` or `12 km`.
    number_like: usize,
    /// Mean length of its cells, in characters.
    pub length: f64,
}

/// A column of numbers.
pub(super) struct Numbers {
    pub whole: bool,
    pub least: f64,
    pub greatest: f64,
    pub mean: f64,
    pub sd: f64,
    /// The smallest number above 0.
    pub least_positive: f64,
    /// Whether each number is the one before and 1: a row number.
    pub counts_up: bool,
}

/// Looks at every column of a table.
pub(super) fn facts(table: &Table) -> Vec<Facts<'_>> {
    table
        .columns
        .iter()
        .map(|column| of_column(column, table.rows()))
        .collect()
}

fn of_column(column: &Column, rows: usize) -> Facts<'_> {
    let filled: Vec<usize> = (0..rows).filter(|&row| !is_gap(column, row)).collect();
    let mut places: HashMap<String, usize> = HashMap::new();
    let mut levels: Vec<(String, usize)> = Vec::new();
    let mut length = 0;
    for &row in &filled {
        let label = column.label(row);
        length += label.chars().count();
        // Past the limit the column is no category, and its levels need no counting.
        if levels.len() > COUNTED_LEVELS {
            continue;
        }
        match places.get(label.as_ref()) {
            Some(&place) => levels[place].1 += 1,
            None => {
                places.insert(label.clone().into_owned(), levels.len());
                levels.push((label.into_owned(), 1));
            }
        }
    }
    let finite = |row: usize| column.number(row).filter(|number| number.is_finite());
    let no_numbers: Vec<usize> = filled.iter().copied().filter(|&row| finite(row).is_none()).collect();
    let numbers: Vec<f64> = filled.iter().filter_map(|&row| finite(row)).collect();
    let number_like = filled.iter().filter(|&&row| begins_as_number(&column.label(row)));
    Facts {
        column,
        gaps: rows - filled.len(),
        number_like: number_like.count(),
        numbers: (no_numbers.is_empty() && !numbers.is_empty()).then(|| of_numbers(&numbers)),
        no_numbers,
        levels,
        length: length as f64 / filled.len().max(1) as f64,
    }
}

fn is_gap(column: &Column, row: usize) -> bool {
    let label = column.label(row);
    label.is_empty() || USUAL_GAP_MARKS.contains(&label.as_ref())
}

fn begins_as_number(cell: &str) -> bool {
    cell.trim_start_matches(['+', '-', '.'])
        .starts_with(|sign: char| sign.is_ascii_digit())
}

fn of_numbers(numbers: &[f64]) -> Numbers {
    let centre = mean(numbers);
    let squares: Vec<f64> = numbers
        .iter()
        .map(|number| (number - centre) * (number - centre))
        .collect();
    Numbers {
        whole: numbers.iter().all(|number| number.fract() == 0.0),
        least: numbers.iter().copied().fold(f64::INFINITY, f64::min),
        greatest: numbers.iter().copied().fold(f64::NEG_INFINITY, f64::max),
        mean: centre,
        sd: mean(&squares).sqrt(),
        least_positive: numbers
            .iter()
            .copied()
            .filter(|&number| number > 0.0)
            .fold(f64::INFINITY, f64::min),
        counts_up: numbers.len() > 2 && numbers.windows(2).all(|pair| pair[1] - pair[0] == 1.0),
    }
}

impl Facts<'_> {
    pub fn name(&self) -> &str {
        &self.column.name
    }

    /// Whether a cell is empty or a usual gap mark.
    pub fn is_gap(&self, row: usize) -> bool {
        is_gap(self.column, row)
    }

    /// Whether most of the cells that hold something begin as a number does, so that the others
    /// spoil a column of numbers.
    pub fn is_number_like(&self, rows: usize) -> bool {
        2 * self.number_like > rows - self.gaps
    }

    /// The usual gap marks that occur.
    pub fn gap_marks(&self, rows: usize) -> Vec<&'static str> {
        let occurs = |mark: &&str| (0..rows).any(|row| self.column.label(row) == *mark);
        USUAL_GAP_MARKS.into_iter().filter(occurs).collect()
    }

    /// Whether one of the words that the name is made of is among `words`.
    pub fn is_named(&self, words: &[&str]) -> bool {
        words_of(self.name()).iter().any(|word| words.contains(&word.as_str()))
    }
}

/// The words of a column name, in small letters: `staffHours_2` is staff, hours, 2.
fn words_of(name: &str) -> Vec<String> {
    let mut words = vec![String::new()];
    let mut before = ' ';
    for sign in name.chars() {
        let new_word = !sign.is_alphanumeric() || (before.is_lowercase() && sign.is_uppercase());
        if new_word {
            words.push(String::new());
        }
        if sign.is_alphanumeric()
            && let Some(word) = words.last_mut()
        {
            word.extend(sign.to_lowercase());
        }
        before = sign;
    }
    words.retain(|word| !word.is_empty());
    words
}

#[cfg(test)]
mod tests {
    use super::words_of;

    #[test]
    fn names_fall_into_words() {
        assert_eq!(words_of("staffHours_2"), ["staff", "hours", "2"]);
        assert_eq!(words_of("N. of FALLS"), ["n", "of", "falls"]);
        assert_eq!(words_of("county"), ["county"]);
    }
}
