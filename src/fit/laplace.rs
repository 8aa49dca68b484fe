//! The mode, and the Gaussian that stands for the posterior there.
//!
//! Poisson: the mode and the inverse negative Hessian (Tierney & Kadane 1986). Negative binomial:
//! the Gaussian of the coefficients at each scatter, weighed by its mass over the scatter with
//! one-dimensional quadrature; the moments of that mixture are the Laplace figures. They are right
//! where the scatter's mode is at 0 and no single Gaussian could be.

use super::newton::{ClimbFailed, climb};
use super::profile::{Peak, Section, peaks, section_near};
use crate::model::Model;
use crate::numeric::{exp, legendre};

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

/// Mode and Laplace approximation of a model.
///
/// # Errors
/// [`ClimbFailed`] says why there is no mode.
pub fn laplace(model: &Model) -> Result<(Mode, Laplace), ClimbFailed> {
    if model.scatter_place().is_some() {
        return by_profile(model);
    }
    let reached = climb(model, None, &model.start())?;
    let covariance = reached.factor.inverse();
    let mode = Mode {
        point: reached.coefficients.clone(),
        log_density: reached.derivatives.value,
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

fn by_profile(model: &Model) -> Result<(Mode, Laplace), ClimbFailed> {
    let peaks = peaks(model)?;
    let nodes = nodes(model, &peaks)?;
    let highest = &peaks[0].section;
    let steps = nodes.iter().map(|(section, _)| section.steps).sum::<u64>() + highest.steps;
    Ok((mode_at(highest, steps), moments(&nodes)))
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

/// Edges of the quadrature's panels around a peak, in its widths.
const EDGES: [f64; 9] = [-9.0, -5.0, -2.5, -1.0, 0.0, 1.0, 2.5, 5.0, 9.0];
/// Mass further than this below the largest, on the log scale, is left out: e^-30 is below 1e-13.
const NEGLIGIBLE: f64 = 30.0;
/// Each extension doubles the last panel.
const MOST_EXTENSIONS: usize = 60;

/// Sections at the nodes of the quadrature over the scatter, each with its log weight.
fn nodes(model: &Model, peaks: &[Peak]) -> Result<Vec<(Section, f64)>, ClimbFailed> {
    let top = peaks
        .iter()
        .map(|peak| peak.section.log_mass)
        .fold(f64::NEG_INFINITY, f64::max);
    let mut edges: Vec<f64> = Vec::new();
    for peak in peaks.iter().filter(|peak| peak.section.log_mass > top - NEGLIGIBLE) {
        edges.extend(EDGES.iter().map(|t| (peak.section.scatter + t * peak.width).max(0.0)));
    }
    edges.sort_by(f64::total_cmp);
    // Edges of two peaks may fall together: a panel a millionth of its place wide says nothing.
    edges.dedup_by(|b, a| *b - *a <= 1e-6 * *b);
    let mut nodes: Vec<(Section, f64)> = Vec::new();
    let mut known = peaks[0].section.clone();
    for pair in edges.windows(2) {
        add_panel(model, pair[0], pair[1], &mut known, &mut nodes)?;
    }
    let largest = |nodes: &[(Section, f64)]| nodes.iter().map(|(s, _)| s.log_mass).fold(top, f64::max);
    // Heavy tails: go on beyond the last edge on either side until nothing is left.
    let mut width = edges[edges.len() - 1] - edges[edges.len() - 2];
    let mut end = edges[edges.len() - 1];
    for _ in 0..MOST_EXTENSIONS {
        if nodes
            .last()
            .is_none_or(|(s, _)| s.log_mass < largest(&nodes) - NEGLIGIBLE)
        {
            break;
        }
        width *= 2.0;
        known = nodes[nodes.len() - 1].0.clone();
        add_panel(model, end, end + width, &mut known, &mut nodes)?;
        end += width;
    }
    let mut start = edges[0];
    let mut width = edges[1] - edges[0];
    let mut left: Vec<(Section, f64)> = Vec::new();
    while start > 0.0 {
        let outermost = left
            .iter()
            .chain(&nodes)
            .min_by(|a, b| a.0.scatter.total_cmp(&b.0.scatter));
        match outermost {
            Some((section, _)) if section.log_mass >= largest(&nodes) - NEGLIGIBLE => known = section.clone(),
            _ => break,
        }
        width *= 2.0;
        let next = (start - width).max(0.0);
        add_panel(model, next, start, &mut known, &mut left)?;
        start = next;
    }
    nodes.extend(left);
    Ok(nodes)
}

fn add_panel(
    model: &Model,
    from: f64,
    to: f64,
    known: &mut Section,
    nodes: &mut Vec<(Section, f64)>,
) -> Result<(), ClimbFailed> {
    for (scatter, weight) in legendre(from, to) {
        let section = section_near(model, known, scatter)?;
        *known = section.clone();
        nodes.push((section, weight));
    }
    Ok(())
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
