//! Columns of few values, taken together into one column of small whole numbers.
//!
//! A category of 50 levels is 49 columns of zeros and ones, of which each row has at most one 1.
//! Instead of 49 products a row, the kernels take one value from a table: the rows' patterns in
//! those columns are numbered, and at each point of the parameter space the table holds, for each
//! pattern, the sum of its products. Any columns of few values can share a table (categories, joint
//! terms of categories, yes/no columns, a period from 1 to 12), as long as their joint patterns
//! stay few. It is exact: the same products are added up, once for each pattern and not for each row.

/// Most patterns of one index column, so that an index is a byte and eight tables stay in the
/// first-level cache.
pub const MOST_PATTERNS: usize = 256;
/// Yes/no columns that have nothing to do with one another double the patterns, each. They join while the
/// patterns are few for the columns that they replace, at most this many or four times the columns: with
/// 256 patterns for eight such columns, the tables of pairs of patterns that the second derivatives need took
/// 25 times as long as the columns themselves, and hundreds of megabytes.
const FEW_PATTERNS: usize = 64;
/// Columns of more different values than this stay as they are.
const MOST_VALUES: usize = 16;
/// An index column takes the place of at least this many columns. A look-up costs as much as three
/// or four products, because processors load single values no faster than whole vectors.
const FEWEST_COLUMNS: usize = 6;

/// Several columns as one.
#[derive(Debug, Clone, PartialEq)]
pub struct IndexColumn {
    /// Places of the columns among the terms, rising.
    pub terms: Vec<usize>,
    /// Where each pattern's entries begin, and the end of the last's.
    starts: Vec<usize>,
    /// The values of the patterns in turn that are not 0, each with the place of its term.
    entries: Vec<(usize, f64)>,
}

impl IndexColumn {
    /// Number of patterns.
    pub fn patterns(&self) -> usize {
        self.starts.len() - 1
    }

    /// The values of one pattern that are not 0, each with the place of its term: one or none for each
    /// category, however many levels it has.
    pub fn pattern(&self, pattern: usize) -> &[(usize, f64)] {
        &self.entries[self.starts[pattern]..self.starts[pattern + 1]]
    }
}

/// The terms, each in one of two places.
#[derive(Debug, Clone, PartialEq)]
pub struct Split {
    /// Places of the terms whose columns stay, rising.
    pub dense: Vec<usize>,
    /// The index columns that took the place of the others.
    pub index: Vec<IndexColumn>,
}

impl Split {
    /// Number of terms, those in index columns too.
    pub fn terms(&self) -> usize {
        self.dense.len() + self.index.iter().map(|index| index.terms.len()).sum::<usize>()
    }
}

/// Splits columns into those that stay and those that become index columns, and gives for each index
/// column the pattern of each row. A pure function of the
/// values: columns are tried in their order, each joins the last index column or opens the next.
pub fn split(columns: &[Vec<f64>]) -> (Split, Vec<Vec<u8>>) {
    let mut joined: Vec<Joint> = Vec::new();
    let mut dense = Vec::new();
    for (term, column) in columns.iter().enumerate() {
        let Some((codes, values)) = codes(column) else {
            dense.push(term);
            continue;
        };
        if let Some(last) = joined.last_mut()
            && let Some(more) = last.with(term, &codes, values)
        {
            *last = more;
            continue;
        }
        joined.push(Joint {
            terms: vec![term],
            patterns: values,
            of_row: codes,
        });
    }
    let (mut index, mut of_rows) = (Vec::new(), Vec::new());
    for joint in joined {
        if joint.terms.len() < FEWEST_COLUMNS {
            dense.extend(joint.terms);
        } else {
            index.push(joint.filled_from(columns));
            of_rows.push(joint.of_row);
        }
    }
    dense.sort_unstable();
    (Split { dense, index }, of_rows)
}

/// Columns that have been joined so far.
struct Joint {
    terms: Vec<usize>,
    patterns: usize,
    of_row: Vec<u8>,
}

impl Joint {
    /// These columns and one more, with its codes below `values`; `None` where the joint patterns
    /// are too many.
    fn with(&self, term: usize, codes: &[u8], values: usize) -> Option<Joint> {
        const UNSEEN: u16 = u16::MAX;
        let most = FEW_PATTERNS.max(4 * (self.terms.len() + 1)).min(MOST_PATTERNS);
        let mut joint_of = vec![UNSEEN; self.patterns * values];
        let mut patterns = 0;
        let mut of_row = Vec::with_capacity(codes.len());
        for (pattern, code) in self.of_row.iter().zip(codes) {
            let joint = &mut joint_of[usize::from(*pattern) * values + usize::from(*code)];
            if *joint == UNSEEN {
                if patterns == most {
                    return None;
                }
                *joint = patterns as u16;
                patterns += 1;
            }
            of_row.push(*joint as u8);
        }
        Some(Joint {
            terms: self.terms.iter().copied().chain([term]).collect(),
            patterns,
            of_row,
        })
    }

    fn filled_from(&self, columns: &[Vec<f64>]) -> IndexColumn {
        let mut first_row = vec![None; self.patterns];
        for (row, pattern) in self.of_row.iter().enumerate() {
            first_row[usize::from(*pattern)].get_or_insert(row);
        }
        let (mut starts, mut entries) = (vec![0], Vec::new());
        for row in first_row.into_iter().flatten() {
            let values = self.terms.iter().map(|term| (*term, columns[*term][row]));
            entries.extend(values.filter(|(_, value)| *value != 0.0));
            starts.push(entries.len());
        }
        IndexColumn {
            terms: self.terms.clone(),
            starts,
            entries,
        }
    }
}

/// The number of each row's value among the column's values, in order of first appearance, and how
/// many values there are; `None` where they are many.
fn codes(column: &[f64]) -> Option<(Vec<u8>, usize)> {
    let mut values: Vec<f64> = Vec::new();
    let mut codes = Vec::new();
    for value in column {
        let code = match values.iter().position(|known| known == value) {
            Some(code) => code,
            None if values.len() == MOST_VALUES => return None,
            None => {
                values.push(*value);
                values.len() - 1
            }
        };
        codes.push(code as u8);
    }
    Some((codes, values.len()))
}

#[cfg(test)]
mod tests {
    use super::*;

    /// The 0/1 columns of a category: one for each level but the first.
    fn category(levels: usize, of_row: impl Fn(usize) -> usize, rows: usize) -> Vec<Vec<f64>> {
        (1..levels)
            .map(|level| (0..rows).map(|row| f64::from(u8::from(of_row(row) == level))).collect())
            .collect()
    }

    fn restored((split, of_rows): &(Split, Vec<Vec<u8>>), columns: &[Vec<f64>]) -> Vec<Vec<f64>> {
        let mut out = columns.to_vec();
        for (index, of_row) in split.index.iter().zip(of_rows) {
            for term in &index.terms {
                let value = |pattern: usize| index.pattern(pattern).iter().find(|(of, _)| of == term);
                let values = of_row.iter().map(|pattern| value(usize::from(*pattern)));
                out[*term] = values.map(|entry| entry.map_or(0.0, |(_, value)| *value)).collect();
            }
        }
        out
    }

    #[test]
    fn categories_share_an_index_column_and_a_number_stays() {
        let rows = 600;
        let mut columns = category(4, |row| row % 4, rows);
        columns.push((0..rows).map(|row| row as f64).collect());
        columns.extend(category(6, |row| row / 7 % 6, rows));
        let found = split(&columns);
        let split = &found.0;
        assert_eq!(split.dense, [3]);
        assert_eq!(split.index.len(), 1);
        assert_eq!(split.index[0].patterns(), 24);
        assert_eq!(restored(&found, &columns), columns);
    }

    #[test]
    fn a_long_category_takes_two() {
        let columns = category(300, |row| row % 300, 900);
        let found = split(&columns);
        let split = &found.0;
        assert!(split.dense.is_empty());
        assert_eq!(split.index.len(), 2);
        assert!(split.index.iter().all(|index| index.patterns() <= MOST_PATTERNS));
        assert_eq!(restored(&found, &columns), columns);
    }

    /// Patterns of unrelated columns multiply; the second derivatives keep a table for each pair of patterns.
    #[test]
    fn unrelated_columns_share_few_patterns() {
        let bit = |row: usize, column: usize| {
            f64::from(u8::from(
                (row * (2 * column + 3) / 7 + row / (column + 2)).is_multiple_of(2),
            ))
        };
        let columns: Vec<Vec<f64>> = (0..24)
            .map(|column| (0..4_000).map(|row| bit(row, column)).collect())
            .collect();
        let found = split(&columns);
        let split = &found.0;
        assert!(split.index.len() >= 3, "{}", split.index.len());
        assert!(split.index.iter().all(|index| index.patterns() <= FEW_PATTERNS));
        assert_eq!(restored(&found, &columns), columns);
    }

    #[test]
    fn two_columns_do_not_pay() {
        let columns = category(3, |row| row % 3, 90);
        assert_eq!(split(&columns).0.dense, [0, 1]);
    }

    #[test]
    fn without_rows_or_columns_nothing_breaks() {
        assert_eq!(split(&[]).0.dense, [0_usize; 0]);
        let (empty, _) = split(&vec![Vec::new(); 8]);
        assert_eq!(empty.terms(), 8);
    }
}
