//! The rows of a design, laid out for the likelihood, and the loops over them.
//!
//! Rows stand in blocks of [`BLOCK`]; inside a block each coded column is contiguous. A block of
//! 20 columns is 10 KB: it stays in the first-level cache while several points of the parameter
//! space are evaluated on it. Every sum runs in [`LANES`] lanes that are added up in one fixed
//! order, so the result does not depend on the width of the processor's vectors, on the number of
//! points evaluated together, or on threads.

use crate::design::LikelihoodRows;
use crate::numeric::{exp, ln_1p};

/// Rows in a block.
pub const BLOCK: usize = 64;
/// Partial sums that run side by side.
const LANES: usize = 8;

/// The linear predictor of a row may lie this far from 0 at most. Beyond it the rate is beyond
/// anything that a count can have and exp is held constant, so such a point has density 0.
pub const PREDICTOR_LIMIT: f64 = 690.0;

/// The rows in blocks. Rows that fill up the last block have weight 0.
#[derive(Debug, Clone)]
pub struct Blocks {
    terms: usize,
    blocks: usize,
    rows: usize,
    /// For each block, for each term, its values of the block's rows.
    columns: Vec<Lane>,
    log_exposure: Vec<Lane>,
    /// Sum of the counts of all that each row stands for.
    counts: Vec<Lane>,
    /// How many rows of the study each row stands for.
    weights: Vec<Lane>,
    /// The largest absolute log exposure, and of each term the largest absolute value.
    largest_offset: f64,
    largest: Vec<f64>,
}

/// A value for each row of a block.
type Lane = [f64; BLOCK];

/// First and second derivatives of the rows' log likelihood, summed.
#[derive(Debug, Clone)]
pub struct RowSums {
    /// Sum of the value's terms that depend on the mean.
    pub value: f64,
    /// By the intercept and the coefficients: `terms + 1` values.
    pub gradient: Vec<f64>,
    /// By the same, row-major, lower triangle filled.
    pub hessian: Vec<f64>,
    /// By c^2, by it twice, and by it and each coefficient: only under the negative binomial.
    pub by_dispersion: f64,
    /// Second derivative by c^2.
    pub by_dispersion_twice: f64,
    /// Mixed derivatives, by c^2 and each of the intercept and coefficients.
    pub mixed: Vec<f64>,
}

impl Blocks {
    /// Lays out the rows of a likelihood, in their order.
    pub fn new(likelihood: &LikelihoodRows) -> Self {
        let rows = likelihood.rows();
        let terms = likelihood.columns.len();
        let blocks = rows.div_ceil(BLOCK);
        let padded = |values: &[f64]| {
            let mut out = vec![[0.0; BLOCK]; blocks];
            for (row, value) in values.iter().enumerate() {
                out[row / BLOCK][row % BLOCK] = *value;
            }
            out
        };
        let mut columns = vec![[0.0; BLOCK]; blocks * terms];
        for (term, column) in likelihood.columns.iter().enumerate() {
            for (row, value) in column.iter().enumerate() {
                columns[row / BLOCK * terms + term][row % BLOCK] = *value;
            }
        }
        let largest = |values: &[f64]| values.iter().fold(0.0_f64, |most, value| most.max(value.abs()));
        Blocks {
            terms,
            blocks,
            rows,
            columns,
            log_exposure: padded(&likelihood.log_exposure),
            counts: padded(&likelihood.counts),
            weights: padded(&likelihood.weights),
            largest_offset: largest(&likelihood.log_exposure),
            largest: likelihood.columns.iter().map(|column| largest(column)).collect(),
        }
    }

    /// Number of coded columns.
    pub fn terms(&self) -> usize {
        self.terms
    }

    /// Whether every row's linear predictor is within [`PREDICTOR_LIMIT`] at these coefficients
    /// (intercept first). A bound over all rows answers almost always; only where it does not are
    /// the rows looked at.
    pub fn within_limit(&self, coefficients: &[f64]) -> bool {
        let mut bound = self.largest_offset + coefficients[0].abs();
        for (coefficient, largest) in coefficients[1..].iter().zip(&self.largest) {
            bound += coefficient.abs() * largest;
        }
        if bound <= PREDICTOR_LIMIT {
            return true;
        }
        if !bound.is_finite() {
            return false;
        }
        let mut predictor = [0.0; BLOCK];
        (0..self.blocks).all(|block| {
            self.predictor(block, coefficients, &mut predictor);
            let real = (self.rows - block * BLOCK).min(BLOCK);
            predictor[..real].iter().all(|value| value.abs() <= PREDICTOR_LIMIT)
        })
    }

    /// Linear predictor of a block's rows: log exposure + intercept + columns times coefficients,
    /// four columns to a sum.
    #[inline(always)]
    fn predictor(&self, block: usize, coefficients: &[f64], out: &mut Lane) {
        let columns = &self.columns[block * self.terms..(block + 1) * self.terms];
        let offset = &self.log_exposure[block];
        for row in 0..BLOCK {
            out[row] = offset[row] + coefficients[0];
        }
        let slopes = &coefficients[1..=self.terms];
        let mut term = 0;
        while term + 4 <= self.terms {
            let (x0, x1) = (&columns[term], &columns[term + 1]);
            let (x2, x3) = (&columns[term + 2], &columns[term + 3]);
            let (b0, b1, b2, b3) = (slopes[term], slopes[term + 1], slopes[term + 2], slopes[term + 3]);
            for row in 0..BLOCK {
                out[row] += (x0[row] * b0 + x1[row] * b1) + (x2[row] * b2 + x3[row] * b3);
            }
            term += 4;
        }
        for term in term..self.terms {
            let (x, b) = (&columns[term], slopes[term]);
            for row in 0..BLOCK {
                out[row] += x[row] * b;
            }
        }
    }

    /// For each point, the sum over rows of `weight * mu`. Points are `stride` values apart in
    /// `points`, each starting with intercept and coefficients.
    pub fn sum_of_means(&self, points: &[f64], stride: usize, out: &mut [f64]) {
        let mut sums = vec![[0.0; LANES]; out.len()];
        let mut lane = [0.0; BLOCK];
        for block in 0..self.blocks {
            let weights = &self.weights[block];
            for (point, sum) in sums.iter_mut().enumerate() {
                self.predictor(block, &points[point * stride..], &mut lane);
                for row in 0..BLOCK {
                    lane[row] = weights[row] * exp(lane[row]);
                }
                add_to_lanes(&lane, sum);
            }
        }
        for (out, sum) in out.iter_mut().zip(&sums) {
            *out = add_up(sum);
        }
    }

    /// For each point, the sum over rows of `(count + weight/a) * log(1 + a mu)`, with a = c^2 of
    /// that point in `dispersions`, each above 0.
    pub fn sum_of_log_terms(&self, points: &[f64], stride: usize, dispersions: &[f64], out: &mut [f64]) {
        let mut sums = vec![[0.0; LANES]; out.len()];
        let mut lane = [0.0; BLOCK];
        for block in 0..self.blocks {
            let weights = &self.weights[block];
            let counts = &self.counts[block];
            for (point, sum) in sums.iter_mut().enumerate() {
                let a = dispersions[point];
                let size = 1.0 / a;
                self.predictor(block, &points[point * stride..], &mut lane);
                for row in 0..BLOCK {
                    lane[row] = a * exp(lane[row]);
                }
                for row in 0..BLOCK {
                    lane[row] = (counts[row] + weights[row] * size) * ln_1p(lane[row]);
                }
                add_to_lanes(&lane, sum);
            }
        }
        for (out, sum) in out.iter_mut().zip(&sums) {
            *out = add_up(sum);
        }
    }

    /// Derivatives at one point of `Y * predictor - W mu` for the Poisson (`dispersion` absent), of
    /// `Y * predictor - (Y + W/a) log(1 + a mu)` for the negative binomial with a = c^2 =
    /// `dispersion`; at a = 0 the latter is its limit, the Poisson, but the derivatives by a are
    /// there. Y is a row's count and W its weight. The value leaves out Y times the predictor, which
    /// the model knows in closed form.
    ///
    /// With m = mu, D = 1 + a m and x = a m (Cameron & Trivedi 2013, section 3.3, for the first
    /// derivatives):
    /// by the predictor (Y - W m)/D; twice -m (W + a Y)/D^2; by a: W m^2 h(x) - Y m/D, where
    /// h(x) = (log(1+x) - x/(1+x))/x^2; twice W m^3 h'(x) + Y m^2/D^2; mixed -(Y - W m) m/D^2.
    pub fn derivatives(&self, point: &[f64], dispersion: Option<f64>) -> RowSums {
        let size = self.terms + 1;
        let mut sums = RowSums {
            value: 0.0,
            gradient: vec![0.0; size],
            hessian: vec![0.0; size * size],
            by_dispersion: 0.0,
            by_dispersion_twice: 0.0,
            mixed: vec![0.0; size],
        };
        let a = dispersion.unwrap_or(0.0);
        let mut means = [0.0; BLOCK];
        let (mut score, mut curvature, mut mixed) = ([0.0; BLOCK], [0.0; BLOCK], [0.0; BLOCK]);
        let (mut value, mut by_a, mut by_a_twice) = ([0.0; BLOCK], [0.0; BLOCK], [0.0; BLOCK]);
        let mut scaled = [0.0; BLOCK];
        for block in 0..self.blocks {
            let weights = &self.weights[block];
            let counts = &self.counts[block];
            self.predictor(block, point, &mut means);
            for row in 0..BLOCK {
                means[row] = exp(means[row]);
            }
            for row in 0..BLOCK {
                let (w, y, m) = (weights[row], counts[row], means[row]);
                let d = 1.0 / (1.0 + a * m);
                score[row] = (y - w * m) * d;
                curvature[row] = -m * (w + a * y) * d * d;
            }
            if dispersion.is_some() {
                for row in 0..BLOCK {
                    let (w, y, m) = (weights[row], counts[row], means[row]);
                    let d = 1.0 / (1.0 + a * m);
                    let (h, slope) = log_remainder(a * m);
                    by_a[row] = w * m * m * h - y * m * d;
                    by_a_twice[row] = w * m * m * m * slope + y * m * m * d * d;
                    mixed[row] = -(y - w * m) * m * d * d;
                }
                sums.by_dispersion += sum_of(&by_a);
                sums.by_dispersion_twice += sum_of(&by_a_twice);
                sums.mixed[0] += sum_of(&mixed);
            }
            for row in 0..BLOCK {
                value[row] = if a > 0.0 {
                    -(counts[row] + weights[row] / a) * ln_1p(a * means[row])
                } else {
                    -weights[row] * means[row]
                };
            }
            sums.value += sum_of(&value);
            sums.gradient[0] += sum_of(&score);
            sums.hessian[0] += sum_of(&curvature);
            let columns = &self.columns[block * self.terms..(block + 1) * self.terms];
            for j in 0..self.terms {
                let x = &columns[j];
                sums.gradient[j + 1] += sum_of_products(x, &score);
                if dispersion.is_some() {
                    sums.mixed[j + 1] += sum_of_products(x, &mixed);
                }
                for row in 0..BLOCK {
                    scaled[row] = x[row] * curvature[row];
                }
                let hessian_row = &mut sums.hessian[(j + 1) * size..(j + 2) * size];
                hessian_row[0] += sum_of(&scaled);
                for k in 0..=j {
                    hessian_row[k + 1] += sum_of_products(&columns[k], &scaled);
                }
            }
        }
        sums
    }
}

/// h(x) = (log(1+x) - x/(1+x)) / x^2 and its derivative, for x >= 0.
///
/// Below 0.03 the closed forms lose all digits (h is a difference of two numbers near x, divided by
/// x^2), so the series h = sum (-1)^k (k+1)/(k+2) x^k is summed there; its first term left out is
/// below 1e-17.
#[inline(always)]
fn log_remainder(x: f64) -> (f64, f64) {
    if x < 0.03 {
        let (mut h, mut slope) = (0.0, 0.0);
        for k in (0..12).rev() {
            let k = f64::from(k);
            let coefficient = (k + 1.0) / (k + 2.0);
            // Horner in -x: h(x) = c0 - c1 x + c2 x^2 ..., and its derivative alongside.
            slope = h - x * slope;
            h = coefficient - x * h;
        }
        return (h, -slope);
    }
    let d = 1.0 / (1.0 + x);
    let h = (ln_1p(x) - x * d) / (x * x);
    (h, d * d / x - 2.0 * h / x)
}

#[inline(always)]
fn add_to_lanes(values: &Lane, lanes: &mut [f64; LANES]) {
    for chunk in values.chunks_exact(LANES) {
        for lane in 0..LANES {
            lanes[lane] += chunk[lane];
        }
    }
}

#[inline(always)]
fn add_up(lanes: &[f64; LANES]) -> f64 {
    ((lanes[0] + lanes[4]) + (lanes[2] + lanes[6])) + ((lanes[1] + lanes[5]) + (lanes[3] + lanes[7]))
}

#[inline(always)]
fn sum_of(values: &Lane) -> f64 {
    let mut lanes = [0.0; LANES];
    add_to_lanes(values, &mut lanes);
    add_up(&lanes)
}

#[inline(always)]
fn sum_of_products(x: &Lane, y: &Lane) -> f64 {
    let mut lanes = [0.0; LANES];
    for start in (0..BLOCK).step_by(LANES) {
        for lane in 0..LANES {
            lanes[lane] += x[start + lane] * y[start + lane];
        }
    }
    add_up(&lanes)
}
