//! The choice of the reference from warm-up draws.
//!
//! Taking the moments of a few draws blindly ruins twenty dimensions; keeping Laplace's always ruins
//! skewed small studies. So candidates between the two are fitted on one half of the draws and
//! judged on the other by the mean absolute change of log(posterior/q) between two draws, which is
//! what makes independence steps fail.

use super::laplace::Laplace;
use super::reference::{Kernel, Reference, Shape, Tails};

/// How far the shape follows the draws.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum Correction {
    /// Laplace's moments.
    None,
    /// Laplace's correlations, with means and standard deviations moved this far.
    Diagonal(Way),
    /// All moments moved this far.
    Moments(Way),
}

/// How far from Laplace's moments to the draws'.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Way {
    /// Half the way.
    Half,
    /// All of it.
    Whole,
}

impl Way {
    fn share(self) -> f64 {
        match self {
            Way::Half => 0.5,
            Way::Whole => 1.0,
        }
    }
}

const CORRECTIONS: [Correction; 5] = [
    Correction::None,
    Correction::Diagonal(Way::Half),
    Correction::Diagonal(Way::Whole),
    Correction::Moments(Way::Half),
    Correction::Moments(Way::Whole),
];
const TAILS: [Tails; 3] = [Tails::Normal, Tails::T(30.0), Tails::T(8.0)];
const INFLATIONS: [f64; 3] = [1.0, 1.1, 1.2];

/// Warm-up draws of all chains: `points` in signed coordinates, row-major, in the order of the
/// iterations, `chains` rows to an iteration.
#[derive(Debug, Clone, Default)]
pub struct History {
    /// The draws.
    pub points: Vec<f64>,
    /// Log posterior density of each.
    pub log_densities: Vec<f64>,
    /// Rows to an iteration.
    pub chains: usize,
}

impl History {
    /// Whether a row belongs to the half that fits: pairs of iterations take turns, so that the
    /// halves are far enough apart to judge one another and both span the whole stage.
    fn fits(&self, row: usize) -> bool {
        (row / self.chains / 2).is_multiple_of(2)
    }
}

/// What was chosen.
#[derive(Debug, Clone)]
pub struct Chosen {
    /// The reference.
    pub reference: Reference,
    /// Covariance of the shape, for the random-walk steps.
    pub covariance: Vec<f64>,
    /// The candidate.
    pub correction: Correction,
    /// Its tails.
    pub tails: Tails,
    /// Its inflation.
    pub inflation: f64,
}

/// The reference before any draw: Laplace's moments, a normal main part.
pub fn from_laplace(laplace: &Laplace, scatter: Option<usize>) -> Option<Chosen> {
    let shape = Shape::of_moments(&laplace.mean, &laplace.covariance, scatter);
    let reference = Reference::new(&shape, Tails::Normal, 1.0).ok()?;
    Some(Chosen {
        reference,
        covariance: shape.covariance,
        correction: Correction::None,
        tails: Tails::Normal,
        inflation: 1.0,
    })
}

/// The best candidate for the draws of one stage; `None` where no candidate could be formed.
pub fn choose(laplace: &Laplace, history: &History, scatter: Option<usize>) -> Option<Chosen> {
    let d = laplace.mean.len();
    let mut best: Option<(f64, Correction, Tails, f64)> = None;
    for correction in CORRECTIONS {
        let Some(shape) = corrected(laplace, history, scatter, correction, &|row| history.fits(row)) else {
            continue;
        };
        let Ok(plain) = Reference::new(&shape, Tails::Normal, 1.0) else {
            continue;
        };
        let judged: Vec<(f64, [Option<f64>; 2])> = history
            .log_densities
            .iter()
            .enumerate()
            .filter(|(row, value)| !history.fits(*row) && value.is_finite())
            .map(|(row, value)| (*value, plain.distances(&history.points[row * d..(row + 1) * d])))
            .collect();
        for tails in TAILS {
            let kernel = Kernel::new(d, tails, 0.0);
            for inflation in INFLATIONS {
                let change = mean_absolute_change(&judged, kernel, inflation);
                if best.as_ref().is_none_or(|(least, ..)| change < least - 1e-12) {
                    best = Some((change, correction, tails, inflation));
                }
            }
        }
    }
    let (_, correction, tails, inflation) = best?;
    let shape = corrected(laplace, history, scatter, correction, &|_| true)?;
    Some(Chosen {
        reference: Reference::new(&shape, tails, inflation).ok()?,
        covariance: shape.covariance,
        correction,
        tails,
        inflation,
    })
}

/// The mean absolute difference of log(posterior/q) between two draws (Gini's), for q inflated.
fn mean_absolute_change(judged: &[(f64, [Option<f64>; 2])], kernel: Kernel, inflation: f64) -> f64 {
    let shrink = 1.0 / (inflation * inflation);
    let mut ratios: Vec<f64> = judged
        .iter()
        .map(|(log_density, distances)| log_density - kernel.log_density(distances.map(|q| q.map(|q| q * shrink))))
        .collect();
    ratios.sort_unstable_by(f64::total_cmp);
    let n = ratios.len() as f64;
    let sum: f64 = ratios
        .iter()
        .enumerate()
        .map(|(i, r)| (2.0 * i as f64 - n + 1.0) * r)
        .sum();
    2.0 * sum / (n * n)
}

/// Laplace's shape, corrected by those draws that `taken` names.
pub fn corrected(
    laplace: &Laplace,
    history: &History,
    scatter: Option<usize>,
    correction: Correction,
    taken: &dyn Fn(usize) -> bool,
) -> Option<Shape> {
    let d = laplace.mean.len();
    let way = match correction {
        Correction::None => return Some(Shape::of_moments(&laplace.mean, &laplace.covariance, scatter)),
        Correction::Diagonal(way) | Correction::Moments(way) => way,
    };
    let share = way.share();
    let (mean, covariance) = moments(laplace, history, scatter, taken)?;
    let moved: Vec<f64> = laplace
        .mean
        .iter()
        .zip(&mean)
        .map(|(from, to)| from + share * (to - from))
        .collect();
    let mut shape = vec![0.0; d * d];
    match correction {
        Correction::Moments(_) => {
            for k in 0..d * d {
                shape[k] = share * covariance[k] + (1.0 - share) * laplace.covariance[k];
            }
        }
        _ => {
            let stretch: Vec<f64> = (0..d)
                .map(|i| {
                    let ratio = (covariance[i * d + i] / laplace.covariance[i * d + i]).sqrt();
                    // Half the way on the log scale is the root.
                    if way == Way::Half { ratio.sqrt() } else { ratio }
                })
                .collect();
            for i in 0..d {
                for j in 0..d {
                    shape[i * d + j] = laplace.covariance[i * d + j] * stretch[i] * stretch[j];
                }
            }
        }
    }
    Some(Shape::of_moments(&moved, &shape, scatter))
}

/// Mean and covariance of the draws that `taken` names, the scatter's of its absolute value.
fn moments(
    laplace: &Laplace,
    history: &History,
    scatter: Option<usize>,
    taken: &dyn Fn(usize) -> bool,
) -> Option<(Vec<f64>, Vec<f64>)> {
    let d = laplace.mean.len();
    let mut count = 0.0;
    let mut sums = vec![0.0; d];
    let mut squares = vec![0.0; d * d];
    let mut off = vec![0.0; d];
    for (row, point) in history
        .points
        .chunks_exact(d)
        .enumerate()
        .filter(|(row, _)| taken(*row))
    {
        if !history.log_densities[row].is_finite() {
            continue;
        }
        count += 1.0;
        for i in 0..d {
            let value = if scatter == Some(i) { point[i].abs() } else { point[i] };
            // About Laplace's mean, so that no digits are lost to a large common part.
            off[i] = value - laplace.mean[i];
            sums[i] += off[i];
            for j in 0..=i {
                squares[i * d + j] += off[i] * off[j];
            }
        }
    }
    if count < 2.0 {
        return None;
    }
    let mean: Vec<f64> = (0..d).map(|i| laplace.mean[i] + sums[i] / count).collect();
    let mut covariance = vec![0.0; d * d];
    for i in 0..d {
        for j in 0..=i {
            let value = (squares[i * d + j] - sums[i] * sums[j] / count) / (count - 1.0);
            covariance[i * d + j] = value;
            covariance[j * d + i] = value;
        }
    }
    Some((mean, covariance))
}
