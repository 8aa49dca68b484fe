//! The log posterior of a study: one function serves the mode, the Laplace approximation and the
//! draws.
//!
//! A point holds the baseline (log rate per unit of raw exposure), one coefficient for each term,
//! and under the negative binomial the scatter c as a signed number: the density is that at |c|,
//! the even extension of the density on c >= 0. All normalising constants are kept, so that values
//! of different models on the same rows can be compared.

use super::blocks::{Blocks, Order};
use super::count_table::CountTable;
use super::kernel::{self, Instructions, Points};
use super::prior::{BaselinePrior, NormalPrior, ScatterPrior};
use crate::design::{Alike, Design, LikelihoodRows, condense};
use crate::numeric::{ln, ln_factorial};
use crate::spec::{Baseline, Family, Spec};

/// Below this c^2 the negative binomial is computed as its limit, the Poisson. Their log densities
/// differ by less than `c^2 mu^2 / 2`, which is below 1e-16 for every mean that a count can have;
/// above it 1/c^2 and everything multiplied by it stay finite.
const SMALLEST_DISPERSION: f64 = 1e-40;

/// The linear predictor of a row may lie this far from 0 at most. Beyond it the rate is beyond
/// anything that a count can have and exp is held constant, so such a point has density 0.
pub const PREDICTOR_LIMIT: f64 = 690.0;

/// The log posterior density of one study.
#[derive(Debug, Clone)]
pub struct Model {
    parameters: Vec<String>,
    /// Rows of the design, before any were taken together.
    rows: usize,
    blocks: Blocks,
    instructions: Instructions,
    /// Sum over rows of weight * y, then of weight * y * column for each term.
    count_sums: Vec<f64>,
    /// Sum over rows of weight * (y * log exposure - log y!).
    constant: f64,
    baseline_prior: BaselinePrior,
    term_priors: Vec<NormalPrior>,
    scatter: Option<Scatter>,
    start: f64,
    /// The smallest scatter that the counts could tell from 0, roughly.
    finest_scatter: f64,
}

/// What only the negative binomial has.
#[derive(Debug, Clone)]
struct Scatter {
    counts: CountTable,
    prior: ScatterPrior,
}

/// Value, gradient and Hessian at a point.
#[derive(Debug, Clone, PartialEq)]
pub struct Derivatives {
    /// Log density.
    pub value: f64,
    /// How far rounding may have moved the value: it is a difference of sums that grow with the
    /// counts and may be a million times as large as itself.
    pub rounding: f64,
    /// First derivatives, one for each parameter.
    pub gradient: Vec<f64>,
    /// Second derivatives, row-major, symmetric.
    pub hessian: Vec<f64>,
}

impl Model {
    /// The model of a spec on its design.
    pub fn new(spec: &Spec, design: &Design) -> Self {
        let baseline_prior = match &spec.baseline {
            // The range is per `per` units of exposure, the coefficient per one unit.
            Baseline::PlausibleRate(range) => BaselinePrior::Range(NormalPrior {
                mean: range.log_mean() - ln(design.coding.per),
                sd: range.log_sd(),
            }),
            Baseline::Earlier {
                incidents, exposure, ..
            } => BaselinePrior::Earlier {
                incidents: *incidents,
                exposure: *exposure,
            },
        };
        let scatter_prior = match spec.family {
            Family::Poisson => None,
            Family::NegativeBinomial { .. } => spec.family.scatter_rate().map(|rate| ScatterPrior { rate }),
        };
        let term_priors = design
            .terms
            .iter()
            .map(|term| NormalPrior {
                mean: term.prior_mean,
                sd: term.prior_sd,
            })
            .collect();
        Model::with_priors(design, baseline_prior, term_priors, scatter_prior)
    }

    /// A model with priors given directly: Poisson without a scatter prior, negative binomial with one.
    pub fn with_priors(
        design: &Design,
        baseline_prior: BaselinePrior,
        term_priors: Vec<NormalPrior>,
        scatter_prior: Option<ScatterPrior>,
    ) -> Self {
        let alike = match scatter_prior {
            None => Alike::Pattern,
            Some(_) => Alike::PatternAndExposure,
        };
        let rows = condense(design, alike);
        Model::on_rows(design, &rows, baseline_prior, term_priors, scatter_prior)
    }

    /// The same on rows of the likelihood that the caller made of the design: a second route to the
    /// same posterior is that on [`LikelihoodRows::of`] the design, none taken together.
    pub fn on_rows(
        design: &Design,
        rows: &LikelihoodRows,
        baseline_prior: BaselinePrior,
        term_priors: Vec<NormalPrior>,
        scatter_prior: Option<ScatterPrior>,
    ) -> Self {
        let weighted: Vec<f64> = design
            .counts
            .iter()
            .zip(&design.stands_for)
            .map(|(y, w)| y * w)
            .collect();
        let mut count_sums = vec![weighted.iter().sum()];
        for column in &design.columns {
            count_sums.push(column.iter().zip(&weighted).map(|(x, y)| x * y).sum());
        }
        let constant = (0..design.counts.len())
            .map(|row| {
                weighted[row] * design.log_exposure[row] - design.stands_for[row] * ln_factorial(design.counts[row])
            })
            .sum();
        let exposure: f64 = design.exposure.iter().zip(&design.stands_for).map(|(e, w)| e * w).sum();
        let mut parameters = vec!["baseline".to_owned()];
        parameters.extend(design.terms.iter().map(|term| term.name.clone()));
        if scatter_prior.is_some() {
            parameters.push("scatter".to_owned());
        }
        // Under the Poisson the information about c^2 is the sum of mu^2/2 (Dean & Lawless 1989), so
        // its standard deviation is sqrt(2 / sum of mu^2), and c is told from 0 at the root of that.
        let squares: f64 = design.counts.iter().zip(&weighted).map(|(y, wy)| y * wy).sum();
        let order = match scatter_prior {
            None => Order::AsGiven,
            Some(_) => Order::ByCount,
        };
        Model {
            parameters,
            rows: design.counts.len(),
            blocks: Blocks::new(rows, order),
            instructions: Instructions::widest(),
            // Half an incident is added, so that a table of zeros has a finite crude rate.
            start: ln((count_sums[0] + 0.5) / exposure),
            finest_scatter: (2.0 / squares.max(2.0)).sqrt().sqrt(),
            count_sums,
            constant,
            baseline_prior,
            term_priors,
            scatter: scatter_prior.map(|prior| Scatter {
                counts: CountTable::new(&design.counts, &design.stands_for),
                prior,
            }),
        }
    }

    /// The same model, evaluated with other vector instructions: the same bits at another speed.
    pub fn with_instructions(self, instructions: Instructions) -> Self {
        Model { instructions, ..self }
    }

    /// Names of the parameters: `baseline`, the terms, then `scatter` under the negative binomial.
    pub fn parameters(&self) -> &[String] {
        &self.parameters
    }

    /// Number of parameters.
    pub fn dimension(&self) -> usize {
        self.parameters.len()
    }

    /// Place of the scatter among the parameters, under the negative binomial.
    pub fn scatter_place(&self) -> Option<usize> {
        self.scatter.as_ref().map(|_| self.parameters.len() - 1)
    }

    /// The smallest scatter that the counts could tell from 0, roughly: the scale on which the
    /// posterior of the scatter can change near 0.
    pub fn finest_scatter(&self) -> f64 {
        self.finest_scatter
    }

    /// Number of rows of the design, whether or not the likelihood takes some together.
    pub fn rows(&self) -> usize {
        self.rows
    }

    /// Where a search for the mode may start: the crude rate, every rate ratio 1.
    pub fn start(&self) -> Vec<f64> {
        let mut start = vec![0.0; self.blocks.split.terms() + 1];
        start[0] = self.start;
        start
    }

    /// Log prior density at a point.
    pub fn log_prior(&self, point: &[f64]) -> f64 {
        let mut sum = self.baseline_prior.at(point[0]).value;
        for (prior, coefficient) in self.term_priors.iter().zip(&point[1..]) {
            sum += prior.at(*coefficient).value;
        }
        if let Some(scatter) = &self.scatter {
            sum += scatter.prior.value(point[self.dimension() - 1].abs());
        }
        sum
    }

    /// Log posterior density, not normalised by the evidence, at several points at once: `points`
    /// holds `out.len()` points of [`dimension`](Self::dimension) values each. Minus infinity where
    /// the model is not defined; never NaN. The result at a point does not depend on its company.
    pub fn log_densities(&self, points: &[f64], out: &mut [f64]) {
        let d = self.dimension();
        let prepared = Points::new(&self.blocks, points, d);
        // Nearly always all points are within the limit and of one kind, and are evaluated as they are.
        let (mut with_scatter, mut without) = (Vec::new(), Vec::new());
        for (place, point) in points.chunks_exact(d).enumerate() {
            out[place] = f64::NEG_INFINITY;
            if self.within_limit(point, &prepared, place) {
                match self.dispersion(point) {
                    Some(a) => with_scatter.push((place, a)),
                    // The Poisson, or a chain at a scatter of exactly 0 among others.
                    None => without.push((place, 0.0)),
                }
            }
        }
        for kind in [with_scatter, without] {
            if kind.is_empty() {
                continue;
            }
            let dispersions: Vec<f64> = kind.iter().map(|(_, a)| *a).collect();
            let some: Points;
            let chosen = if kind.len() == out.len() {
                &prepared
            } else {
                let picked = kind.iter().flat_map(|(place, _)| &points[place * d..(place + 1) * d]);
                some = Points::new(&self.blocks, &picked.copied().collect::<Vec<f64>>(), d);
                &some
            };
            let mut row_sums = vec![0.0; kind.len()];
            if dispersions[0] > 0.0 {
                kernel::sums_of_logs(self.instructions, &self.blocks, chosen, &dispersions, &mut row_sums);
            } else {
                kernel::sums_of_means(self.instructions, &self.blocks, chosen, &mut row_sums);
            }
            for ((place, a), row_sum) in kind.iter().zip(row_sums) {
                let value = self.around_rows(&points[place * d..(place + 1) * d], *a) - row_sum;
                if value.is_finite() {
                    out[*place] = value;
                }
            }
        }
    }

    /// All of the log density but the kernels' sums over rows, at a = c^2 = `dispersion`.
    fn around_rows(&self, point: &[f64], dispersion: f64) -> f64 {
        let mut value = self.constant + self.log_prior(point);
        for (sum, coefficient) in self.count_sums.iter().zip(point) {
            value += sum * coefficient;
        }
        if let (Some(scatter), true) = (&self.scatter, dispersion > 0.0) {
            value += scatter.counts.value(dispersion, self.instructions);
        }
        value
    }

    /// Log posterior density at one point.
    pub fn log_density(&self, point: &[f64]) -> f64 {
        let mut out = [0.0];
        self.log_densities(point, &mut out);
        out[0]
    }

    /// c^2 at a point, where it is large enough to matter.
    fn dispersion(&self, point: &[f64]) -> Option<f64> {
        let scatter = point[self.scatter_place()?];
        let a = scatter * scatter;
        (a >= SMALLEST_DISPERSION).then_some(a)
    }

    /// Whether a point is finite and every row's linear predictor within [`PREDICTOR_LIMIT`] there; it is the
    /// one at `place` in `points`. A bound over all rows answers almost always; only where it does not are
    /// the rows looked at.
    fn within_limit(&self, point: &[f64], points: &Points, place: usize) -> bool {
        let bound = points.bound(place);
        point.iter().all(|value| value.is_finite())
            && (bound <= PREDICTOR_LIMIT
                || kernel::furthest(self.instructions, &self.blocks, points, place) <= PREDICTOR_LIMIT)
    }

    /// Value, gradient and Hessian at a point; `None` where the density is 0. The scatter's
    /// derivatives are those on c > 0; at c = 0 they are the limits from above. Computed on at most
    /// `threads` threads; their number changes no bit.
    pub fn derivatives(&self, point: &[f64], threads: usize) -> Option<Derivatives> {
        let d = self.dimension();
        let size = self.blocks.split.terms() + 1;
        let prepared = Points::new(&self.blocks, point, d);
        if !self.within_limit(point, &prepared, 0) {
            return None;
        }
        let dispersion = self.dispersion(point);
        let rows = kernel::derivatives(
            self.instructions,
            &self.blocks,
            &prepared,
            self.scatter.as_ref().map(|_| dispersion.unwrap_or(0.0)),
            threads,
        );
        let mut value = self.constant + self.log_prior(point) + rows.value;
        let mut summed = self.constant.abs() + rows.value.abs();
        let mut gradient = vec![0.0; d];
        let mut hessian = vec![0.0; d * d];
        for i in 0..size {
            value += self.count_sums[i] * point[i];
            summed += (self.count_sums[i] * point[i]).abs();
            let prior = if i == 0 {
                self.baseline_prior.at(point[0])
            } else {
                self.term_priors[i - 1].at(point[i])
            };
            gradient[i] = rows.gradient[i] + prior.first;
            for j in 0..=i {
                hessian[i * d + j] = rows.hessian[i * size + j];
                hessian[j * d + i] = rows.hessian[i * size + j];
            }
            hessian[i * d + i] += prior.second;
        }
        if let Some(scatter) = &self.scatter {
            let last = d - 1;
            let c = point[last].abs();
            let sign = if point[last] < 0.0 { -1.0 } else { 1.0 };
            let counts = scatter.counts.derivatives(dispersion.unwrap_or(0.0), self.instructions);
            if dispersion.is_some() {
                value += counts.value;
                summed += counts.value;
            }
            // a = c^2: d/dc = 2c d/da; d2/dc2 = 2 d/da + 4c^2 d2/da2.
            let by_a = rows.by_dispersion + counts.first;
            gradient[last] = sign * (2.0 * c * by_a - scatter.prior.rate);
            hessian[last * d + last] = 2.0 * by_a + 4.0 * c * c * (rows.by_dispersion_twice + counts.second);
            for i in 0..size {
                let mixed = sign * 2.0 * c * rows.mixed[i];
                hessian[i * d + last] = mixed;
                hessian[last * d + i] = mixed;
            }
        }
        value.is_finite().then_some(Derivatives {
            value,
            rounding: 8.0 * f64::EPSILON * summed,
            gradient,
            hessian,
        })
    }
}
