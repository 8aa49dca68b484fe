//! Cholesky factors of small symmetric positive-definite matrices, in a fixed order of operations.
//!
//! A LAPACK picks its kernels by processor, and the last bits follow; whatever a run decides goes
//! through this file instead. Matrices are square, row-major, `dimension * dimension` values; only
//! the lower triangle of the input is read.

use super::ln;

/// A = L L', L lower triangular.
#[derive(Debug, Clone, PartialEq)]
pub struct Cholesky {
    dimension: usize,
    /// L, row-major, zeros above the diagonal.
    lower: Vec<f64>,
}

/// The matrix is not positive definite: the pivot of this row came out at 0 or below, or NaN.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct NotPositiveDefinite {
    /// Row, from 0, of the failing pivot.
    pub row: usize,
    /// The failing pivot.
    pub pivot: f64,
}

impl Cholesky {
    /// Factors a matrix.
    ///
    /// # Errors
    /// [`NotPositiveDefinite`] names the first pivot that is not above 0.
    pub fn factor(matrix: &[f64], dimension: usize) -> Result<Self, NotPositiveDefinite> {
        let d = dimension;
        let mut lower = vec![0.0; d * d];
        for i in 0..d {
            for j in 0..=i {
                let mut rest = matrix[i * d + j];
                for k in 0..j {
                    rest -= lower[i * d + k] * lower[j * d + k];
                }
                if i == j {
                    // Written so that NaN fails too.
                    if !(rest > 0.0 && rest < f64::INFINITY) {
                        return Err(NotPositiveDefinite { row: i, pivot: rest });
                    }
                    lower[i * d + i] = rest.sqrt();
                } else {
                    lower[i * d + j] = rest / lower[j * d + j];
                }
            }
        }
        Ok(Cholesky { dimension, lower })
    }

    /// Number of rows.
    pub fn dimension(&self) -> usize {
        self.dimension
    }

    /// log det A.
    pub fn log_determinant(&self) -> f64 {
        (0..self.dimension)
            .map(|i| 2.0 * ln(self.lower[i * self.dimension + i]))
            .sum()
    }

    /// L z, for z of `dimension` values: of covariance A where z is standard normal.
    pub fn times(&self, z: &[f64], out: &mut [f64]) {
        let d = self.dimension;
        for i in 0..d {
            let mut sum = 0.0;
            for j in 0..=i {
                sum += self.lower[i * d + j] * z[j];
            }
            out[i] = sum;
        }
    }

    /// Solves L x = v in place.
    pub fn solve_lower(&self, v: &mut [f64]) {
        let d = self.dimension;
        for i in 0..d {
            let mut rest = v[i];
            for j in 0..i {
                rest -= self.lower[i * d + j] * v[j];
            }
            v[i] = rest / self.lower[i * d + i];
        }
    }

    /// Solves A x = v in place.
    pub fn solve(&self, v: &mut [f64]) {
        let d = self.dimension;
        self.solve_lower(v);
        for i in (0..d).rev() {
            let mut rest = v[i];
            for j in i + 1..d {
                rest -= self.lower[j * d + i] * v[j];
            }
            v[i] = rest / self.lower[i * d + i];
        }
    }

    /// L^-1, row-major, lower triangular: rows of it make a quadratic form v' A^-1 v a sum of
    /// squares without a division for each entry.
    pub fn inverse_lower(&self) -> Vec<f64> {
        let d = self.dimension;
        let mut inverse = vec![0.0; d * d];
        for j in 0..d {
            inverse[j * d + j] = 1.0 / self.lower[j * d + j];
            for i in j + 1..d {
                let mut sum = 0.0;
                for k in j..i {
                    sum -= self.lower[i * d + k] * inverse[k * d + j];
                }
                inverse[i * d + j] = sum / self.lower[i * d + i];
            }
        }
        inverse
    }

    /// A^-1, row-major, symmetric to the last bit.
    pub fn inverse(&self) -> Vec<f64> {
        let d = self.dimension;
        let half = self.inverse_lower();
        let mut inverse = vec![0.0; d * d];
        for i in 0..d {
            for j in 0..=i {
                let mut sum = 0.0;
                for k in i..d {
                    sum += half[k * d + i] * half[k * d + j];
                }
                inverse[i * d + j] = sum;
                inverse[j * d + i] = sum;
            }
        }
        inverse
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Entries of the inverse of the 4 x 4 Hilbert matrix are whole numbers (Choi 1983,
    /// American Mathematical Monthly 90, 301-312, its formula; first row from it).
    #[test]
    fn the_inverse_of_a_hilbert_matrix_is_the_published_one() {
        let d = 4;
        let hilbert: Vec<f64> = (0..d * d).map(|k| 1.0 / ((k / d + k % d + 1) as f64)).collect();
        let factor = Cholesky::factor(&hilbert, d).unwrap();
        let inverse = factor.inverse();
        for (found, published) in inverse[..d].iter().zip([16.0, -120.0, 240.0, -140.0]) {
            approx::assert_relative_eq!(*found, published, max_relative = 1e-11);
        }
        // det = 1/6048000 (the same paper).
        approx::assert_relative_eq!(factor.log_determinant(), -ln(6_048_000.0), max_relative = 1e-13);
    }

    #[test]
    fn solving_and_multiplying_back_agree() {
        let d = 3;
        let a = [4.0, 0.0, 0.0, 1.0, 3.0, 0.0, -0.5, 0.25, 2.0];
        let factor = Cholesky::factor(&a, d).unwrap();
        let mut x = [1.0, -2.0, 0.5];
        factor.solve(&mut x);
        let full = |i: usize, j: usize| if i >= j { a[i * d + j] } else { a[j * d + i] };
        for (i, b) in [1.0, -2.0, 0.5].iter().enumerate() {
            let back: f64 = (0..d).map(|j| full(i, j) * x[j]).sum();
            approx::assert_abs_diff_eq!(back, *b, epsilon = 1e-15);
        }
    }

    #[test]
    fn the_failing_pivot_is_named() {
        let indefinite = [1.0, 0.0, 2.0, 1.0];
        assert_eq!(
            Cholesky::factor(&indefinite, 2),
            Err(NotPositiveDefinite { row: 1, pivot: -3.0 })
        );
        assert_eq!(Cholesky::factor(&[f64::NAN], 1).unwrap_err().row, 0);
    }
}
