//! How close the terms are to determining one another, and which rows carry a term alone.
//!
//! For remarks only: whether a study is refused is `collinear`'s to decide.

use crate::numeric::dot;

/// Sweeps of Jacobi rotations after which the eigenvalues stand, whatever is left; each sweep
/// after the fourth or so squares what is left, so that this is never reached.
const MOST_SWEEPS: usize = 60;

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
    /// Takes columns of equal length that do not determine one another.
    pub fn new(coded: &[Vec<f64>], rows: usize) -> Self {
        let baseline = vec![1.0; rows];
        let scale = |column: &Vec<f64>| {
            let length = dot(column, column).sqrt();
            column.iter().map(|value| value / length).collect()
        };
        let columns: Vec<Vec<f64>> = std::iter::once(&baseline).chain(coded).map(scale).collect();
        let products = columns
            .iter()
            .map(|a| columns.iter().map(|b| dot(a, b)).collect())
            .collect();
        let (values, vectors) = eigen(products);
        Scaled {
            columns,
            values,
            vectors,
        }
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

/// Eigenvalues and eigenvectors of a symmetric matrix by cyclic Jacobi rotations in a fixed order.
///
/// Source: Golub & Van Loan 2013, Matrix Computations, section 8.5 (from memory).
fn eigen(mut a: Vec<Vec<f64>>) -> (Vec<f64>, Vec<Vec<f64>>) {
    let size = a.len();
    let mut vectors: Vec<Vec<f64>> = (0..size)
        .map(|i| (0..size).map(|j| if i == j { 1.0 } else { 0.0 }).collect())
        .collect();
    for _ in 0..MOST_SWEEPS {
        let mut turned = false;
        for p in 0..size {
            for q in p + 1..size {
                // What is below the rounding of the diagonal is 0: the scaled columns have length 1.
                if a[p][q].abs() < 1e-17 {
                    continue;
                }
                turned = true;
                let half = (a[q][q] - a[p][p]) / (2.0 * a[p][q]);
                let sign = if half < 0.0 { -1.0 } else { 1.0 };
                let tangent = sign / (half.abs() + (half * half + 1.0).sqrt());
                let cosine = 1.0 / (tangent * tangent + 1.0).sqrt();
                let sine = tangent * cosine;
                for k in 0..size {
                    let (left, right) = (a[k][p], a[k][q]);
                    a[k][p] = cosine * left - sine * right;
                    a[k][q] = sine * left + cosine * right;
                }
                for k in 0..size {
                    let (left, right) = (a[p][k], a[q][k]);
                    a[p][k] = cosine * left - sine * right;
                    a[q][k] = sine * left + cosine * right;
                    let (left, right) = (vectors[p][k], vectors[q][k]);
                    vectors[p][k] = cosine * left - sine * right;
                    vectors[q][k] = sine * left + cosine * right;
                }
            }
        }
        if !turned {
            break;
        }
    }
    ((0..size).map(|k| a[k][k]).collect(), vectors)
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
        let scaled = Scaled::new(&columns(), 12);
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

    #[test]
    fn the_condition_number_is_that_of_lapack() {
        use ndarray_linalg::{Eigh, UPLO};
        let scaled = Scaled::new(&columns(), 12);
        let products = ndarray::Array2::from_shape_fn((4, 4), |(i, j)| dot(&scaled.columns[i], &scaled.columns[j]));
        let (values, _) = products.eigh(UPLO::Lower).unwrap();
        let reference = (values[3] / values[0]).sqrt();
        assert!(
            (scaled.number() / reference - 1.0).abs() < 1e-9,
            "{} {reference}",
            scaled.number()
        );
        assert!(scaled.number() > 30.0);
        assert_eq!(scaled.involved(), [1, 2, 3]);
    }

    #[test]
    fn leverages_lie_between_0_and_1_and_sum_to_the_columns() {
        let leverage = Scaled::new(&columns(), 12).leverage();
        assert!(leverage.iter().all(|&h| (0.0..=1.0).contains(&h)));
        assert!((leverage.iter().sum::<f64>() - 4.0).abs() < 1e-9);
    }

    #[test]
    fn a_row_that_a_term_rests_on_alone_has_leverage_1() {
        let mut lonely = vec![0.0; 20];
        lonely[7] = 1.0;
        let leverage = Scaled::new(&[lonely], 20).leverage();
        assert!((leverage[7] - 1.0).abs() < 1e-12);
        // The others share the baseline: 1/19 each, by hand.
        assert!((leverage[0] - 1.0 / 19.0).abs() < 1e-12);
    }
}
