//! How close the terms are to determining one another, and which rows carry a term alone.
//!
//! For remarks only, and the only place where the program asks a matrix library: its last bits
//! depend on the processor, so nothing here may reach a file of a run. Whether a study is refused is
//! `collinear`'s to decide.

use crate::numeric::dot;
use ndarray::Array2;
use ndarray_linalg::{Eigh, UPLO};

/// The coded columns together with the baseline's, each scaled to length 1 and not centred, by
/// the eigenvalues of their products.
pub(super) struct Scaled {
    /// The scaled columns, the baseline's first.
    columns: Vec<Vec<f64>>,
    /// Eigenvalues of the matrix of their products.
    values: Vec<f64>,
    /// `vectors[k]` belongs to `values[k]`.
    vectors: Vec<Vec<f64>>,
}

impl Scaled {
    /// Takes columns of equal length that do not determine one another; `None` where the matrix
    /// library finds no eigenvalues.
    pub fn new(coded: &[Vec<f64>], rows: usize) -> Option<Self> {
        let baseline = vec![1.0; rows];
        let scale = |column: &Vec<f64>| {
            let length = dot(column, column).sqrt();
            column.iter().map(|value| value / length).collect()
        };
        let columns: Vec<Vec<f64>> = std::iter::once(&baseline).chain(coded).map(scale).collect();
        let size = columns.len();
        let products = Array2::from_shape_fn((size, size), |(i, j)| dot(&columns[i], &columns[j]));
        let (values, vectors) = products.eigh(UPLO::Lower).ok()?;
        Some(Scaled {
            columns,
            values: values.to_vec(),
            vectors: vectors.columns().into_iter().map(|vector| vector.to_vec()).collect(),
        })
    }

    /// The condition number: root of the largest eigenvalue over the smallest.
    ///
    /// Source: Belsley, Kuh & Welsch 1980, Regression Diagnostics, section 3.2 (from memory), who
    /// scale to length 1 without centring and take a condition number above 30 as harmful.
    pub fn number(&self) -> f64 {
        let least = self.values.iter().copied().fold(f64::INFINITY, f64::min);
        let greatest = self.values.iter().copied().fold(0.0, f64::max);
        (greatest / least).sqrt()
    }

    /// The columns, the baseline being 0, more than half of whose variance comes from the weakest
    /// direction: those that are close to determining one another.
    pub fn involved(&self) -> Vec<usize> {
        let weakest = (0..self.values.len())
            .min_by(|&a, &b| self.values[a].total_cmp(&self.values[b]))
            .unwrap_or(0);
        let part = |k: usize, column: usize| self.vectors[k][column] * self.vectors[k][column] / self.values[k];
        let whole = |column: usize| (0..self.values.len()).map(|k| part(k, column)).sum::<f64>();
        (0..self.columns.len())
            .filter(|&column| part(weakest, column) > 0.5 * whole(column))
            .collect()
    }

    /// The leverage of each row: x (X'X)^-1 x'.
    pub fn leverage(&self) -> Vec<f64> {
        let mut leverage = vec![0.0; self.columns[0].len()];
        let mut along = leverage.clone();
        for (value, vector) in self.values.iter().zip(&self.vectors) {
            along.fill(0.0);
            for (column, part) in self.columns.iter().zip(vector) {
                along.iter_mut().zip(column).for_each(|(along, x)| *along += part * x);
            }
            leverage
                .iter_mut()
                .zip(&along)
                .for_each(|(leverage, along)| *leverage += along * along / value);
        }
        leverage
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn columns() -> Vec<Vec<f64>> {
        let a: Vec<f64> = (0..12).map(|k| f64::from(k * k % 7)).collect();
        let b: Vec<f64> = (0..12).map(|k| f64::from(k % 5) - 2.0).collect();
        let c: Vec<f64> = a
            .iter()
            .zip(&b)
            .enumerate()
            .map(|(k, (a, b))| a - b + 0.01 * f64::from(k as u32 % 3))
            .collect();
        vec![a, b, c]
    }

    #[test]
    fn the_eigenvectors_multiply_back() {
        let scaled = Scaled::new(&columns(), 12).unwrap();
        for i in 0..4 {
            for j in 0..4 {
                let product = dot(&scaled.columns[i], &scaled.columns[j]);
                let back: f64 = (0..4)
                    .map(|k| scaled.values[k] * scaled.vectors[k][i] * scaled.vectors[k][j])
                    .sum();
                assert!((product - back).abs() < 1e-14);
            }
        }
    }

    /// Two columns of length 1 with product r have eigenvalues 1 + r and 1 - r.
    #[test]
    fn the_condition_number_of_two_columns_is_the_closed_form() {
        let column: Vec<f64> = (0..10).map(|k| 5.0 + f64::from(k)).collect();
        let sum: f64 = column.iter().sum();
        let r = sum / (10.0 * dot(&column, &column)).sqrt();
        let found = Scaled::new(&[column], 10).unwrap().number();
        approx::assert_relative_eq!(found, ((1.0 + r) / (1.0 - r)).sqrt(), max_relative = 1e-12);
    }

    #[test]
    fn near_collinear_columns_are_found_together() {
        let scaled = Scaled::new(&columns(), 12).unwrap();
        assert!(scaled.number() > 30.0);
        assert_eq!(scaled.involved(), [1, 2, 3]);
    }

    #[test]
    fn leverages_lie_between_0_and_1_and_sum_to_the_columns() {
        let leverage = Scaled::new(&columns(), 12).unwrap().leverage();
        assert!(leverage.iter().all(|&h| (0.0..=1.0).contains(&h)));
        assert!((leverage.iter().sum::<f64>() - 4.0).abs() < 1e-9);
    }

    #[test]
    fn a_row_that_a_term_rests_on_alone_has_leverage_1() {
        let mut lonely = vec![0.0; 20];
        lonely[7] = 1.0;
        let leverage = Scaled::new(&[lonely], 20).unwrap().leverage();
        assert!((leverage[7] - 1.0).abs() < 1e-12);
        // The others share the baseline: 1/19 each, by hand.
        assert!((leverage[0] - 1.0 / 19.0).abs() < 1e-12);
    }
}
