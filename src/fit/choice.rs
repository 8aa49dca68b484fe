//! The choice of the reference from warm-up draws.
//!
//! Taking the moments of a few draws blindly ruins twenty dimensions; keeping Laplace's always ruins
//! skewed small studies. So candidates between the two are fitted on one half of the draws and
//! judged on the other by the mean absolute change of log(posterior/q) between two draws, which is
//! what makes independence steps fail.

use super::frame::Moments;
use super::laplace::Laplace;
use super::reference::{Kernel, Located, Place, Reference, Tails};

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

/// Whether coordinates follow the draws beyond moments.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Coordinates {
    /// No: all are as a standard normal, and independent.
    Straight,
    /// Their scales follow the leading coordinate's, and they are skewed, as the draws are.
    Bent,
}

const CORRECTIONS: [Correction; 5] = [
    Correction::None,
    Correction::Diagonal(Way::Half),
    Correction::Diagonal(Way::Whole),
    Correction::Moments(Way::Half),
    Correction::Moments(Way::Whole),
];
const TAILS: [Tails; 3] = [Tails::Normal, Tails::T(30.0), Tails::T(8.0)];
/// The tails with which moments and bends are judged: between the others.
const TAILS_MEANWHILE: Tails = Tails::T(30.0);
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
    /// The draws to fit with, and those to judge by: pairs of iterations take turns, so that the
    /// halves are far enough apart to judge one another and both span the whole stage.
    fn halves(&self, d: usize) -> (History, History) {
        let fits = |row: usize| (row / self.chains / 2).is_multiple_of(2);
        (self.taken(d, &fits), self.taken(d, &|row| !fits(row)))
    }

    /// The draws where the posterior is not 0.
    pub fn possible(&self, d: usize) -> History {
        self.taken(d, &|_| true)
    }

    /// Log density and place of each draw.
    fn located(&self, place: &Place) -> Vec<(f64, Located)> {
        self.log_densities
            .iter()
            .zip(self.points.chunks_exact(place.dimension()))
            .map(|(log_density, point)| (*log_density, place.locate(point)))
            .collect()
    }

    fn taken(&self, d: usize, taken: &dyn Fn(usize) -> bool) -> History {
        let mut part = History {
            chains: self.chains,
            ..History::default()
        };
        for (row, point) in self.points.chunks_exact(d).enumerate() {
            if taken(row) && self.log_densities[row].is_finite() {
                part.points.extend_from_slice(point);
                part.log_densities.push(self.log_densities[row]);
            }
        }
        part
    }
}

/// One candidate.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Candidate {
    /// Where its moments come from.
    pub correction: Correction,
    /// Whether it is bent.
    pub coordinates: Coordinates,
    /// Its tails.
    pub tails: Tails,
    /// The factor on its scale.
    pub inflation: f64,
}

/// What was chosen.
#[derive(Debug, Clone)]
pub struct Chosen {
    /// The reference.
    pub reference: Reference,
    /// Covariance for the random-walk steps.
    pub covariance: Vec<f64>,
    /// The candidate.
    pub candidate: Candidate,
}

/// The reference before any draw: Laplace's moments, a normal main part.
pub fn from_laplace(laplace: &Laplace, scatter: Option<usize>) -> Option<Chosen> {
    let moments = uncorrected(laplace, scatter);
    let candidate = Candidate {
        correction: Correction::None,
        coordinates: Coordinates::Straight,
        tails: Tails::Normal,
        inflation: 1.0,
    };
    Some(Chosen {
        reference: Reference::new(Place::straight(&moments).ok()?, candidate.tails, candidate.inflation),
        covariance: moments.of_signed_steps(),
        candidate,
    })
}

/// The best candidate for the draws of one stage; `None` where no candidate could be formed.
///
/// One thing at a time, each judged by the same figure: the moments, whether to bend, the tails.
pub fn choose(laplace: &Laplace, history: &History, scatter: Option<usize>) -> Option<Chosen> {
    let d = laplace.mean.len();
    let (fitting, judging) = history.halves(d);
    let judged = |correction, coordinates| {
        let moments = corrected(laplace, &fitting, scatter, correction)?;
        let judged = judging.located(&placed(&moments, &fitting, coordinates)?);
        Some((
            mean_absolute_change(&judged, Kernel::new(d, TAILS_MEANWHILE, 1.0)),
            judged,
        ))
    };
    let (mut least, mut best, correction) = CORRECTIONS
        .into_iter()
        .filter_map(|correction| {
            let (change, judged) = judged(correction, Coordinates::Straight)?;
            Some((change, judged, correction))
        })
        .min_by(|a, b| a.0.total_cmp(&b.0))?;
    let mut coordinates = Coordinates::Straight;
    if let Some((change, judged)) = judged(correction, Coordinates::Bent)
        && change < least
    {
        (least, best, coordinates) = (change, judged, Coordinates::Bent);
    }
    let mut candidate = Candidate {
        correction,
        coordinates,
        tails: TAILS_MEANWHILE,
        inflation: 1.0,
    };
    for tails in TAILS {
        for inflation in INFLATIONS {
            let change = mean_absolute_change(&best, Kernel::new(d, tails, inflation));
            if change < least {
                least = change;
                candidate = Candidate {
                    tails,
                    inflation,
                    ..candidate
                };
            }
        }
    }
    let all = history.possible(d);
    let moments = corrected(laplace, &all, scatter, correction)?;
    let place = placed(&moments, &all, coordinates)?;
    Some(Chosen {
        reference: Reference::new(place, candidate.tails, candidate.inflation),
        covariance: moments.of_signed_steps(),
        candidate,
    })
}

fn placed(moments: &Moments, draws: &History, coordinates: Coordinates) -> Option<Place> {
    let place = Place::straight(moments).ok()?;
    Some(match coordinates {
        Coordinates::Straight => place,
        Coordinates::Bent => place.bent_to(&draws.points),
    })
}

/// The mean absolute difference of log(posterior/q) between two draws (Gini's).
fn mean_absolute_change(judged: &[(f64, Located)], kernel: Kernel) -> f64 {
    let mut ratios: Vec<f64> = judged
        .iter()
        .map(|(log_density, located)| log_density - kernel.log_density(located))
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

fn uncorrected(laplace: &Laplace, scatter: Option<usize>) -> Moments {
    Moments {
        mean: laplace.mean.clone(),
        covariance: laplace.covariance.clone(),
        scatter,
    }
}

/// Laplace's moments, corrected by draws.
pub fn corrected(
    laplace: &Laplace,
    draws: &History,
    scatter: Option<usize>,
    correction: Correction,
) -> Option<Moments> {
    let d = laplace.mean.len();
    let way = match correction {
        Correction::None => return Some(uncorrected(laplace, scatter)),
        Correction::Diagonal(way) | Correction::Moments(way) => way,
    };
    let share = way.share();
    let found = of_draws(laplace, draws, scatter)?;
    let mean: Vec<f64> = laplace
        .mean
        .iter()
        .zip(&found.mean)
        .map(|(from, to)| from + share * (to - from))
        .collect();
    let mut covariance = vec![0.0; d * d];
    match correction {
        Correction::Moments(_) => {
            for k in 0..d * d {
                covariance[k] = share * found.covariance[k] + (1.0 - share) * laplace.covariance[k];
            }
        }
        _ => {
            let stretch: Vec<f64> = (0..d)
                .map(|i| {
                    let ratio = (found.covariance[i * d + i] / laplace.covariance[i * d + i]).sqrt();
                    // Half the way on the log scale is the root.
                    if way == Way::Half { ratio.sqrt() } else { ratio }
                })
                .collect();
            for i in 0..d {
                for j in 0..d {
                    covariance[i * d + j] = laplace.covariance[i * d + j] * stretch[i] * stretch[j];
                }
            }
        }
    }
    Some(Moments {
        mean,
        covariance,
        scatter,
    })
}

/// Moments of draws.
fn of_draws(laplace: &Laplace, draws: &History, scatter: Option<usize>) -> Option<Moments> {
    let d = laplace.mean.len();
    let count = draws.log_densities.len() as f64;
    if count < 2.0 {
        return None;
    }
    let mut sums = vec![0.0; d];
    let mut squares = vec![0.0; d * d];
    let mut off = vec![0.0; d];
    for point in draws.points.chunks_exact(d) {
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
    let mean: Vec<f64> = (0..d).map(|i| laplace.mean[i] + sums[i] / count).collect();
    let mut covariance = vec![0.0; d * d];
    for i in 0..d {
        for j in 0..=i {
            let value = (squares[i * d + j] - sums[i] * sums[j] / count) / (count - 1.0);
            covariance[i * d + j] = value;
            covariance[j * d + i] = value;
        }
    }
    Some(Moments {
        mean,
        covariance,
        scatter,
    })
}
