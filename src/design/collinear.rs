//! Which terms the others determine, decided in a fixed order of additions: a library's rank may
//! differ between machines, and a study must not be accepted on one and refused on another.

use super::covariates::exact_mean;
use crate::numeric::dot;

/// A term is determined by those before it when they leave open less than this share of its
/// variance.
///
/// Columns that determine one another exactly (shares that sum to 1, a level told twice) leave
/// about 1e-15 times the condition of the others; 1e-8 is a correlation of 1 - 5e-9, at which a
/// coefficient would rest on the last digits of the file. What is merely close is a remark.
pub const OPEN_SHARE: f64 = 1e-8;

/// How much a term must weigh, in standard deviations, to be named as one that determines another.
const NAMED_WEIGHT: f64 = 1e-6;

/// A column that earlier columns determine.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct Determined {
    /// Its place.
    pub column: usize,
    /// The places of those that determine it; none when it is constant.
    pub by: Vec<usize>,
}

/// Finds the columns that the constant and the columns before them determine.
///
/// A Cholesky factorisation of the correlation matrix in the order of the columns, which sets a
/// column aside where its pivot (the share of its variance that the earlier columns leave open)
/// is below [`OPEN_SHARE`]. The order of the columns and not the size of the pivots decides, so
/// that the term blamed is the later one in the spec.
pub(super) fn determined(columns: &[Vec<f64>]) -> Vec<Determined> {
    let mut found = Vec::new();
    let mut kept: Vec<usize> = Vec::new();
    let mut units: Vec<Vec<f64>> = Vec::new();
    // Row k: the factor's entries of the k-th kept column.
    let mut factor: Vec<Vec<f64>> = Vec::new();
    for (place, column) in columns.iter().enumerate() {
        let Some(unit) = standardised(column) else {
            found.push(Determined {
                column: place,
                by: Vec::new(),
            });
            continue;
        };
        let mut entries: Vec<f64> = Vec::with_capacity(kept.len() + 1);
        let mut open = 1.0;
        for k in 0..kept.len() {
            let mut entry = dot(&unit, &units[k]);
            for j in 0..k {
                entry -= entries[j] * factor[k][j];
            }
            entry /= factor[k][k];
            open -= entry * entry;
            entries.push(entry);
        }
        if open < OPEN_SHARE {
            let weights = back_substituted(&factor, &entries);
            let by = (0..kept.len())
                .filter(|&k| weights[k].abs() > NAMED_WEIGHT)
                .map(|k| kept[k])
                .collect();
            found.push(Determined { column: place, by });
        } else {
            entries.push(open.sqrt());
            factor.push(entries);
            units.push(unit);
            kept.push(place);
        }
    }
    found
}

/// Centred, and of length 1; `None` when it does not vary.
fn standardised(column: &[f64]) -> Option<Vec<f64>> {
    let first = column.first()?;
    if column.iter().all(|value| value == first) {
        return None;
    }
    let mean = exact_mean(column);
    let centred: Vec<f64> = column.iter().map(|value| value - mean).collect();
    let length = dot(&centred, &centred).sqrt();
    (length > 0.0).then(|| centred.iter().map(|value| value / length).collect())
}

/// The x of L' x = b.
fn back_substituted(factor: &[Vec<f64>], b: &[f64]) -> Vec<f64> {
    let mut x = b.to_vec();
    for k in (0..factor.len()).rev() {
        for j in k + 1..factor.len() {
            x[k] -= factor[j][k] * x[j];
        }
        x[k] /= factor[k][k];
    }
    x
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn independent_columns_pass() {
        let columns = [vec![0.0, 1.0, 0.0, 1.0, 0.0], vec![1.0, 2.0, 3.0, 4.0, 6.0]];
        assert!(determined(&columns).is_empty());
    }

    #[test]
    fn a_sum_of_columns_is_named_with_its_parts_and_no_bystander() {
        let a = vec![1.0, 2.0, 5.0, 3.0, 8.0, 1.5];
        let bystander = vec![0.0, 1.0, 0.0, 0.0, 1.0, 1.0];
        let b = vec![2.0, 0.5, 1.0, 7.0, 3.0, 4.0];
        let sum: Vec<f64> = a.iter().zip(&b).map(|(a, b)| 100.0 - a - 3.0 * b).collect();
        let found = determined(&[a, bystander, b, sum]);
        assert_eq!(
            found,
            [Determined {
                column: 3,
                by: vec![0, 2]
            }]
        );
    }

    #[test]
    fn the_levels_of_a_category_without_reference_determine_one_another() {
        let level = |wanted: usize| {
            (0..9)
                .map(|row| f64::from(u8::from(row % 3 == wanted)))
                .collect::<Vec<f64>>()
        };
        let found = determined(&[level(0), level(1), level(2)]);
        assert_eq!(
            found,
            [Determined {
                column: 2,
                by: vec![0, 1]
            }]
        );
    }

    #[test]
    fn a_constant_column_is_determined_by_none() {
        let found = determined(&[vec![3.0; 4], vec![1.0, 2.0, 3.0, 5.0]]);
        assert_eq!(found, [Determined { column: 0, by: vec![] }]);
    }

    #[test]
    fn what_is_only_close_is_no_fault() {
        let a: Vec<f64> = (0..40).map(f64::from).collect();
        // A correlation of about 1 - 4e-7 (checked by hand: noise variance 1e-4 over 133).
        let b: Vec<f64> = a
            .iter()
            .map(|a| a + if (*a as u32).is_multiple_of(2) { 0.01 } else { -0.01 })
            .collect();
        assert!(determined(&[a, b]).is_empty());
    }

    #[test]
    fn offset_and_scale_do_not_matter() {
        let a: Vec<f64> = (0..30).map(|k| 2_000.0 + f64::from(k % 7)).collect();
        let b: Vec<f64> = a.iter().map(|a| 1e9 * a + 5e12).collect();
        assert_eq!(determined(&[a, b]).len(), 1);
    }
}
