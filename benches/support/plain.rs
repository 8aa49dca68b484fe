//! The likelihood as any competent programmer would first write it: row by row, a dot product, the standard library's
//! exponential and log(1 + x), and under the negative binomial a log-gamma for each row. What does not
//! depend on the parameters is taken out of the loop. The program's kernels are measured against it.

#![allow(
    clippy::disallowed_methods,
    reason = "the system's functions are what the program's own are compared with"
)]

use ratewright::design::Design;
use statrs::function::factorial::ln_factorial;
use statrs::function::gamma::ln_gamma;

/// The rows one after the other, each with its columns side by side.
pub struct Rows {
    terms: usize,
    columns: Vec<f64>,
    log_exposure: Vec<f64>,
    counts: Vec<f64>,
    /// Sum of log y!.
    ln_factorials: f64,
}

/// A value with its gradient and Hessian (row-major) by the intercept and the coefficients.
pub struct Derivatives {
    /// Log likelihood.
    pub value: f64,
    /// First derivatives.
    pub gradient: Vec<f64>,
    /// Second derivatives; only the lower triangle is filled.
    pub hessian: Vec<f64>,
}

impl Rows {
    /// Lays out the rows of a design in which every row stands for itself.
    pub fn new(design: &Design) -> Rows {
        let rows = design.counts.len();
        let columns = (0..rows)
            .flat_map(|row| design.columns.iter().map(move |column| column[row]))
            .collect();
        Rows {
            terms: design.columns.len(),
            columns,
            log_exposure: design.log_exposure.clone(),
            counts: design.counts.clone(),
            ln_factorials: design.counts.iter().map(|y| ln_factorial(*y as u64)).sum(),
        }
    }

    fn row(&self, row: usize) -> &[f64] {
        &self.columns[row * self.terms..(row + 1) * self.terms]
    }

    fn predictor(&self, row: usize, coefficients: &[f64]) -> f64 {
        let mut predictor = self.log_exposure[row] + coefficients[0];
        for (x, coefficient) in self.row(row).iter().zip(&coefficients[1..]) {
            predictor += x * coefficient;
        }
        predictor
    }

    /// Poisson log likelihood of all rows.
    pub fn poisson(&self, coefficients: &[f64]) -> f64 {
        let mut sum = -self.ln_factorials;
        for (row, y) in self.counts.iter().enumerate() {
            let predictor = self.predictor(row, coefficients);
            sum += y * predictor - predictor.exp();
        }
        sum
    }

    /// Negative-binomial log likelihood of all rows, Var(y) = mu + c^2 mu^2, at c = `scatter`.
    pub fn negative_binomial(&self, coefficients: &[f64], scatter: f64) -> f64 {
        let a = scatter * scatter;
        let size = 1.0 / a;
        let ln_gamma_of_size = ln_gamma(size);
        let ln_a = a.ln();
        let mut sum = -self.ln_factorials;
        for (row, y) in self.counts.iter().enumerate() {
            let predictor = self.predictor(row, coefficients);
            sum += ln_gamma(y + size) - ln_gamma_of_size + y * (ln_a + predictor)
                - (y + size) * (a * predictor.exp()).ln_1p();
        }
        sum
    }

    /// Value, gradient and Hessian of the Poisson log likelihood.
    pub fn poisson_derivatives(&self, coefficients: &[f64]) -> Derivatives {
        self.derivatives(coefficients, -self.ln_factorials, |y, predictor| {
            let mean = predictor.exp();
            (y * predictor - mean, y - mean, -mean)
        })
    }

    /// Value, gradient and Hessian of the negative-binomial log likelihood, by the coefficients alone.
    pub fn negative_binomial_derivatives(&self, coefficients: &[f64], scatter: f64) -> Derivatives {
        let a = scatter * scatter;
        let size = 1.0 / a;
        let ln_gamma_of_size = ln_gamma(size);
        let ln_a = a.ln();
        self.derivatives(coefficients, -self.ln_factorials, |y, predictor| {
            let mean = predictor.exp();
            let value =
                ln_gamma(y + size) - ln_gamma_of_size + y * (ln_a + predictor) - (y + size) * (a * mean).ln_1p();
            let d = 1.0 / (1.0 + a * mean);
            (value, (y - mean) * d, -mean * (1.0 + a * y) * d * d)
        })
    }

    /// Sums a row's value and its two derivatives by the predictor, which `of_row` gives.
    fn derivatives(
        &self,
        coefficients: &[f64],
        start: f64,
        of_row: impl Fn(f64, f64) -> (f64, f64, f64),
    ) -> Derivatives {
        let size = self.terms + 1;
        let mut sums = Derivatives {
            value: start,
            gradient: vec![0.0; size],
            hessian: vec![0.0; size * size],
        };
        let mut x = vec![1.0; size];
        for (row, y) in self.counts.iter().enumerate() {
            let (value, first, second) = of_row(*y, self.predictor(row, coefficients));
            sums.value += value;
            x[1..].copy_from_slice(self.row(row));
            for i in 0..size {
                sums.gradient[i] += first * x[i];
                for j in 0..=i {
                    sums.hessian[i * size + j] += second * x[i] * x[j];
                }
            }
        }
        sums
    }
}
