//! The posterior as a function of the scatter alone, the coefficients at their best for each.
//!
//! The likelihood knows only c^2 while the prior of c falls from 0 on, so c = 0 is always a local
//! maximum of the posterior and a second one may lie inside: one climb in all parameters would end
//! at either by the luck of its start. So the scatter is followed on a fixed grid from 0 up, every
//! local maximum is refined, and the mass at each scatter (its height times the volume of the
//! coefficients' Gaussian there) is what the moments are later taken of.

use super::newton::{ClimbFailed, climb};
use crate::model::Model;

/// The grid of scatters: dense where scatters usually are, and far beyond any that was seen.
const GRID: [f64; 24] = [
    0.0, 0.01, 0.02, 0.035, 0.05, 0.075, 0.1, 0.14, 0.2, 0.28, 0.4, 0.56, 0.8, 1.1, 1.6, 2.2, 3.2, 4.5, 6.4, 9.0, 13.0,
    18.0, 25.0, 36.0,
];
/// Where the density still rises at the end of the grid, the end is doubled up to here.
const FURTHEST: f64 = 1e7;
/// Steps of a refinement; each at least halves the bracket, so that 200 reach the last bit.
const MOST_REFINEMENTS: usize = 200;

/// The posterior at one scatter.
#[derive(Debug, Clone)]
pub struct Section {
    /// The scatter.
    pub scatter: f64,
    /// The best coefficients, baseline first.
    pub coefficients: Vec<f64>,
    /// How the best coefficients move with the scatter.
    pub drift: Vec<f64>,
    /// Covariance of the coefficients at this scatter, row-major.
    pub covariance: Vec<f64>,
    /// Log density at the best coefficients.
    pub height: f64,
    /// Log of the mass: height - log det(negative Hessian)/2, the constant (2 pi)^(p/2) left out.
    pub log_mass: f64,
    /// First derivative of the height by the scatter.
    pub slope: f64,
    /// Second derivative of the height by the scatter.
    pub curvature: f64,
    /// Newton steps that it took.
    pub steps: u64,
}

/// A local maximum of the profile.
#[derive(Debug, Clone)]
pub struct Peak {
    /// The posterior there.
    pub section: Section,
    /// Its width: about one standard deviation of the scatter around it.
    pub width: f64,
}

/// The section at one scatter, its coefficients searched from `start`.
pub fn section(model: &Model, scatter: f64, start: &[f64]) -> Result<Section, ClimbFailed> {
    let reached = climb(model, Some(scatter), start)?;
    let size = reached.coefficients.len();
    let d = size + 1;
    let hessian = &reached.derivatives.hessian;
    let mixed: Vec<f64> = (0..size).map(|i| hessian[i * d + size]).collect();
    let mut drift = mixed.clone();
    reached.factor.solve(&mut drift);
    let through_coefficients: f64 = mixed.iter().zip(&drift).map(|(m, s)| m * s).sum();
    Ok(Section {
        scatter,
        height: reached.derivatives.value,
        log_mass: reached.derivatives.value - 0.5 * reached.factor.log_determinant(),
        slope: reached.derivatives.gradient[size],
        curvature: hessian[size * d + size] + through_coefficients,
        covariance: reached.factor.inverse(),
        coefficients: reached.coefficients,
        drift,
        steps: reached.steps,
    })
}

/// The section at a scatter near a known one: the search starts where the drift points.
pub fn section_near(model: &Model, known: &Section, scatter: f64) -> Result<Section, ClimbFailed> {
    let ahead = scatter - known.scatter;
    let start: Vec<f64> = known
        .coefficients
        .iter()
        .zip(&known.drift)
        .map(|(b, s)| b + ahead * s)
        .collect();
    // Far ahead the straight line may leave the region where the density is above 0.
    section(model, scatter, &start).or_else(|_| section(model, scatter, &known.coefficients))
}

/// All local maxima of the profile, the highest first.
pub fn peaks(model: &Model) -> Result<Vec<Peak>, ClimbFailed> {
    let mut sections = vec![section(model, 0.0, &model.start())?];
    for scatter in &GRID[1..] {
        let next = section_near(model, &sections[sections.len() - 1], *scatter)?;
        sections.push(next);
    }
    while sections[sections.len() - 1].slope > 0.0 && sections[sections.len() - 1].scatter < FURTHEST {
        let last = &sections[sections.len() - 1];
        let next = section_near(model, last, 2.0 * last.scatter)?;
        sections.push(next);
    }
    let mut peaks = vec![peak_at_zero(model, sections[0].clone())];
    for pair in sections.windows(2) {
        if pair[0].slope > 0.0 && pair[1].slope <= 0.0 {
            peaks.push(refine(model, &pair[0], &pair[1])?);
        }
    }
    peaks.sort_by(|a, b| b.section.height.total_cmp(&a.section.height));
    Ok(peaks)
}

/// The maximum at 0. Near it the height is `slope * c + curvature/2 * c^2` with a slope of minus
/// the prior's rate; it is as wide as the shorter of the two scales.
fn peak_at_zero(model: &Model, section: Section) -> Peak {
    let by_prior = 1.0 / model.scatter_prior_rate().unwrap_or(1.0);
    let width = if section.curvature < 0.0 {
        by_prior.min(1.0 / (-section.curvature).sqrt())
    } else {
        by_prior
    };
    Peak { section, width }
}

/// The maximum between two sections whose slopes point at each other: Newton's steps on the slope,
/// halving the bracket where a step would leave it.
fn refine(model: &Model, low: &Section, high: &Section) -> Result<Peak, ClimbFailed> {
    let (mut low, mut high) = (low.clone(), high.clone());
    let mut best = low.clone();
    for _ in 0..MOST_REFINEMENTS {
        let newton = best.scatter - best.slope / best.curvature;
        let middle = 0.5 * (low.scatter + high.scatter);
        let inside = best.curvature < 0.0 && newton > low.scatter && newton < high.scatter;
        let next = section_near(model, &best, if inside { newton } else { middle })?;
        let moved = (next.scatter - best.scatter).abs();
        best = next;
        if best.slope > 0.0 {
            low = best.clone();
        } else {
            high = best.clone();
        }
        if moved <= 1e-9 * best.scatter || high.scatter - low.scatter <= 1e-12 * high.scatter {
            break;
        }
    }
    let width = if best.curvature < 0.0 {
        1.0 / (-best.curvature).sqrt()
    } else {
        0.5 * best.scatter
    };
    Ok(Peak { section: best, width })
}
