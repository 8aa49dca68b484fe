//! The posterior as a function of the scatter alone, the coefficients at their best for each.
//!
//! The likelihood knows only c^2 while the prior of c falls from 0 on, so c = 0 is always a local
//! maximum of the posterior and a second one may lie inside: one climb in all parameters would end
//! at either by the luck of its start. So the scatter is followed on a grid from 0 up, every local
//! maximum is refined, and the mass at each scatter (its height times the volume of the
//! coefficients' Gaussian there) is what the moments are later taken of.
//!
//! The grid doubles from a quarter of the finest scatter that the counts could tell from 0. A grid
//! that began at 0.01 missed the whole posterior of counts in the ten thousands, which tell a
//! scatter of 0.001 from 0.

use super::newton::{ClimbFailed, EXACT, ROUGH, Surface, climb};
use super::watch::Watch;

/// The grid goes at least up to here, and on while the density still rises or has mass.
const FAR: f64 = 32.0;
/// It ends here at the latest.
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

/// The profile on its grid.
#[derive(Debug, Clone)]
pub struct Profile {
    /// Sections from a scatter of 0 up.
    pub grid: Vec<Section>,
    /// The local maxima of the height, the highest first.
    pub peaks: Vec<Section>,
}

/// The section at one scatter, its coefficients searched from `start` until `settled`.
///
/// The last Newton step is not evaluated: the height after it and the slope follow to second order,
/// and the step is so short that the third is below rounding (a rough section needs no more digits).
pub fn section(surface: Surface, scatter: f64, start: &[f64], settled: f64) -> Result<Section, ClimbFailed> {
    let reached = climb(surface, Some(scatter), start, settled)?;
    let size = reached.coefficients.len();
    let d = size + 1;
    let hessian = &reached.derivatives.hessian;
    let mixed: Vec<f64> = (0..size).map(|i| hessian[i * d + size]).collect();
    let mut drift = mixed.clone();
    reached.factor.solve(&mut drift);
    let along = |direction: &[f64]| -> f64 { mixed.iter().zip(direction).map(|(m, s)| m * s).sum() };
    let height = reached.derivatives.value + 0.5 * reached.rise;
    Ok(Section {
        scatter,
        height,
        log_mass: height - 0.5 * reached.factor.log_determinant(),
        slope: reached.derivatives.gradient[size] + along(&reached.last_step),
        curvature: hessian[size * d + size] + along(&drift),
        covariance: reached.factor.inverse(),
        coefficients: reached.coefficients,
        drift,
        steps: reached.steps,
    })
}

/// The section at a scatter near a known one: the search starts where the drift points.
pub fn section_near(surface: Surface, known: &Section, scatter: f64, settled: f64) -> Result<Section, ClimbFailed> {
    let start = known.ahead(scatter, None);
    // Far ahead the line may leave the region where the density is above 0.
    section(surface, scatter, &start, settled).or_else(|_| section(surface, scatter, &known.coefficients, settled))
}

impl Section {
    /// Where the best coefficients should lie at another scatter: along the drift, bent by the change
    /// of the drift since the section before.
    pub fn ahead(&self, scatter: f64, before: Option<&Section>) -> Vec<f64> {
        let step = scatter - self.scatter;
        let bend = |i: usize| {
            before.map_or(0.0, |before| {
                0.5 * (self.drift[i] - before.drift[i]) / (self.scatter - before.scatter)
            })
        };
        let ahead = |i: usize| self.coefficients[i] + step * (self.drift[i] + step * bend(i));
        (0..self.coefficients.len()).map(ahead).collect()
    }
}

/// Mass further than this below the largest, on the log scale, is left out: e^-30 is below 1e-13.
pub const NEGLIGIBLE: f64 = 30.0;

/// The profile of a model's scatter.
///
/// # Errors
/// [`ClimbFailed`] where the coefficients have no mode at some scatter, or the watcher asks to stop.
pub fn profile(surface: Surface, watch: &dyn Watch) -> Result<Profile, ClimbFailed> {
    let mut grid = vec![section(surface, 0.0, &surface.model.start(), EXACT)?];
    let mut scatter = 0.25 * surface.model.finest_scatter();
    let mut most_mass = grid[0].log_mass;
    loop {
        if watch.stop_asked() {
            return Err(ClimbFailed::Stopped);
        }
        let next = section_near(surface, &grid[grid.len() - 1], scatter, ROUGH)?;
        most_mass = most_mass.max(next.log_mass);
        let over = next.slope <= 0.0 && next.log_mass < most_mass - NEGLIGIBLE;
        grid.push(next);
        if (scatter >= FAR && over) || scatter >= FURTHEST {
            break;
        }
        scatter *= 2.0;
    }
    // At 0 the slope is minus the prior's rate: always a maximum.
    let mut peaks = vec![grid[0].clone()];
    for pair in grid.windows(2) {
        if pair[0].slope > 0.0 && pair[1].slope <= 0.0 {
            peaks.push(refine(surface, &pair[0], &pair[1])?);
        }
    }
    peaks.sort_by(|a, b| b.height.total_cmp(&a.height));
    Ok(Profile { grid, peaks })
}

/// The maximum between two sections whose slopes point at each other: Newton's steps on the slope,
/// halving the bracket where a step would leave it.
fn refine(surface: Surface, low: &Section, high: &Section) -> Result<Section, ClimbFailed> {
    let (mut low, mut high) = (low.clone(), high.clone());
    let mut best = low.clone();
    for _ in 0..MOST_REFINEMENTS {
        let newton = best.scatter - best.slope / best.curvature;
        let middle = 0.5 * (low.scatter + high.scatter);
        let inside = best.curvature < 0.0 && newton > low.scatter && newton < high.scatter;
        let next = section_near(surface, &best, if inside { newton } else { middle }, EXACT)?;
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
    Ok(best)
}
