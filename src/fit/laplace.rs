//! The mode, and the Gaussian that stands for the posterior there.
//!
//! Poisson: the mode and the inverse negative Hessian (Tierney & Kadane 1986). Negative binomial:
//! the Gaussian of the coefficients at each scatter, weighed by its mass over the scatter with
//! one-dimensional quadrature; the moments of that mixture are the Laplace figures. They are right
//! where the scatter's mode is at 0 and no single Gaussian could be.

use super::newton::{ClimbFailed, EXACT, Surface, climb};
use super::nodes::nodes;
use super::profile::{Section, profile};
use super::watch::Watch;
use crate::model::Model;
use crate::numeric::exp;

/// The mode of the posterior.
#[derive(Debug, Clone)]
pub struct Mode {
    /// All parameters, the scatter at 0 or above.
    pub point: Vec<f64>,
    /// Log density there, all constants kept.
    pub log_density: f64,
    /// Inverse negative Hessian in all parameters, row-major; where the scatter's mode is at zero,
    /// in the coefficients alone, the scatter's row and column 0.
    pub covariance: Vec<f64>,
    /// Where the scatter's mode lies; `None` under the Poisson.
    pub scatter: Option<ScatterMode>,
    /// Newton steps taken in all.
    pub steps: u64,
}

/// Where the mode of the scatter lies.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum ScatterMode {
    /// Above 0, where the density is flat.
    Inside,
    /// At 0, the edge.
    AtZero,
}

/// Mean and covariance of the Laplace approximation.
#[derive(Debug, Clone, PartialEq)]
pub struct Laplace {
    /// Means of all parameters, the scatter as itself.
    pub mean: Vec<f64>,
    /// Covariance, row-major.
    pub covariance: Vec<f64>,
}

impl Laplace {
    /// Standard deviation of a parameter.
    pub fn sd(&self, place: usize) -> f64 {
        self.covariance[place * self.mean.len() + place].sqrt()
    }
}

/// Mode and Laplace approximation of a model, on at most `threads` threads.
///
/// # Errors
/// [`ClimbFailed`] says why there is no mode, or that the watcher asked to stop.
pub fn laplace(model: &Model, threads: usize, watch: &dyn Watch) -> Result<(Mode, Laplace), ClimbFailed> {
    let surface = Surface { model, threads };
    if model.scatter_place().is_some() {
        return by_profile(surface, watch);
    }
    let reached = climb(surface, None, &model.start(), EXACT)?;
    let covariance = reached.factor.inverse();
    let mode = Mode {
        point: reached.coefficients.clone(),
        log_density: reached.derivatives.value + 0.5 * reached.rise,
        covariance: covariance.clone(),
        scatter: None,
        steps: reached.steps,
    };
    Ok((
        mode,
        Laplace {
            mean: reached.coefficients,
            covariance,
        },
    ))
}

fn by_profile(surface: Surface, watch: &dyn Watch) -> Result<(Mode, Laplace), ClimbFailed> {
    let profile = profile(surface, watch)?;
    let nodes = nodes(surface, &profile, watch)?;
    let steps = |sections: &mut dyn Iterator<Item = &Section>| sections.map(|section| section.steps).sum::<u64>();
    let taken = steps(&mut profile.grid.iter().chain(&profile.peaks)) + steps(&mut nodes.iter().map(|(node, _)| node));
    Ok((mode_at(&profile.peaks[0], taken), moments(&nodes)))
}

/// The mode at the highest peak. Its covariance follows from the section's: with V the coefficients'
/// covariance at fixed scatter, s the drift and k the negative curvature of the profile, the inverse
/// of the joint negative Hessian is [V + s s'/k, s/k; s'/k, 1/k].
fn mode_at(section: &Section, steps: u64) -> Mode {
    let size = section.coefficients.len();
    let d = size + 1;
    let inside = section.scatter > 0.0 && section.curvature < 0.0;
    let scatter_variance = if inside { -1.0 / section.curvature } else { 0.0 };
    let mut covariance = vec![0.0; d * d];
    for i in 0..size {
        for j in 0..size {
            covariance[i * d + j] =
                section.covariance[i * size + j] + section.drift[i] * section.drift[j] * scatter_variance;
        }
        covariance[i * d + size] = section.drift[i] * scatter_variance;
        covariance[size * d + i] = covariance[i * d + size];
    }
    covariance[size * d + size] = scatter_variance;
    let mut point = section.coefficients.clone();
    point.push(section.scatter);
    Mode {
        point,
        log_density: section.height,
        covariance,
        scatter: Some(if inside {
            ScatterMode::Inside
        } else {
            ScatterMode::AtZero
        }),
        steps,
    }
}

/// Mean and covariance of the mixture of Gaussians over the nodes.
fn moments(nodes: &[(Section, f64)]) -> Laplace {
    let size = nodes[0].0.coefficients.len();
    let d = size + 1;
    let top = nodes.iter().map(|(s, _)| s.log_mass).fold(f64::NEG_INFINITY, f64::max);
    let weights: Vec<f64> = nodes.iter().map(|(s, w)| w * exp(s.log_mass - top)).collect();
    let total: f64 = weights.iter().sum();
    let mut mean = vec![0.0; d];
    for ((section, _), weight) in nodes.iter().zip(&weights) {
        let share = weight / total;
        for i in 0..size {
            mean[i] += share * section.coefficients[i];
        }
        mean[size] += share * section.scatter;
    }
    let mut covariance = vec![0.0; d * d];
    for ((section, _), weight) in nodes.iter().zip(&weights) {
        let share = weight / total;
        let off: Vec<f64> = section
            .coefficients
            .iter()
            .chain(std::iter::once(&section.scatter))
            .zip(&mean)
            .map(|(value, mean)| value - mean)
            .collect();
        for i in 0..d {
            for j in 0..d {
                let within = if i < size && j < size {
                    section.covariance[i * size + j]
                } else {
                    0.0
                };
                covariance[i * d + j] += share * (within + off[i] * off[j]);
            }
        }
    }
    Laplace { mean, covariance }
}
