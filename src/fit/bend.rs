//! How a whitened coordinate departs from a standard normal that is independent of the others.
//!
//! Two departures matter in small studies: the wider the scatter, the wider the coefficients, so the
//! log of a coordinate's scale is taken as linear in the leading coordinate; and where incidents are
//! few, a coordinate is skewed.

use crate::numeric::{exp, ln};

/// A coordinate v as a function of a standard z and the leading coordinate l:
/// `v = exp(level + slope l) (z cosh e + (sqrt(1 + z^2) - kappa) sinh e)`.
///
/// The bracket is the sinh-arcsinh transformation sinh(e + asinh z) of Jones & Pewsey (2009,
/// Biometrika 96, 761-780) with their tail parameter 1, less its mean, kappa sinh e. Far out it is
/// linear with slope exp(e) to the right and exp(-e) to the left, so that tails stay normal, and it
/// needs neither sinh nor asinh of z.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Bend {
    level: f64,
    slope: f64,
    cosh: f64,
    sinh: f64,
}

/// kappa = E sqrt(1 + Z^2) for a standard normal Z (by quadrature with 200,001 points).
const KAPPA: f64 = 1.354_530_806_481_260_2;
/// E of the square of the skewness's score at 0 (likewise).
const SKEW_INFORMATION: f64 = 0.509_566_751_874_261_4;
/// Slopes hold to this many standard deviations of the leading coordinate; beyond, draws say nothing.
const FURTHEST_LEAD: f64 = 4.0;
/// Largest skewness parameter.
const MOST_SKEW: f64 = 1.0;
/// Squared residuals above this do not count more in a fit: chains may come from far out.
const LARGEST_SQUARE: f64 = 9.0;
/// Scoring steps of each fit, from 0.
const STEPS: usize = 4;

impl Bend {
    /// A bend by its parameters.
    pub fn new(level: f64, slope: f64, skew: f64) -> Bend {
        let up = exp(skew);
        Bend {
            level,
            slope,
            cosh: 0.5 * (up + 1.0 / up),
            sinh: 0.5 * (up - 1.0 / up),
        }
    }

    fn log_scale(&self, lead: f64) -> f64 {
        self.level + self.slope * lead.clamp(-FURTHEST_LEAD, FURTHEST_LEAD)
    }

    /// v of z.
    pub fn apply(&self, z: f64, lead: f64) -> f64 {
        exp(self.log_scale(lead)) * (z * self.cosh + ((1.0 + z * z).sqrt() - KAPPA) * self.sinh)
    }

    /// z of v, and log dz/dv.
    pub fn undo(&self, v: f64, lead: f64) -> (f64, f64) {
        let log_scale = self.log_scale(lead);
        let w = v * exp(-log_scale) + KAPPA * self.sinh;
        let root = (1.0 + w * w).sqrt();
        let z = w * self.cosh - root * self.sinh;
        (z, ln(self.cosh - self.sinh * (w / root)) - log_scale)
    }

    /// Variance of the bracket for a standard normal z: E(1 + Z^2) = 2, and z is uncorrelated with an
    /// even function of it.
    fn variance(&self) -> f64 {
        self.cosh * self.cosh + (2.0 - KAPPA * KAPPA) * self.sinh * self.sinh
    }

    /// The bend of a coordinate from draws of it and of the leading one, by scoring: first scale and
    /// slope as if residuals were normal, then the skewness of the residuals. `lead` is absent for the
    /// leading coordinate itself.
    pub fn fitted(own: &[f64], lead: Option<&[f64]>) -> Bend {
        let (level, slope) = lead.map_or((0.0, 0.0), |lead| scales(own, lead));
        let straight = Bend::new(level, slope, 0.0);
        let residuals: Vec<f64> = match lead {
            Some(lead) => own.iter().zip(lead).map(|(v, l)| straight.undo(*v, *l).0).collect(),
            None => own.to_vec(),
        };
        let skew = skewness(&residuals);
        let level = level - 0.5 * ln(Bend::new(0.0, 0.0, skew).variance());
        Bend::new(level, slope, skew)
    }
}

/// Level and slope of the log scale. Their information is twice the moments of (1, lead).
fn scales(own: &[f64], lead: &[f64]) -> (f64, f64) {
    let lead: Vec<f64> = lead.iter().map(|l| l.clamp(-FURTHEST_LEAD, FURTHEST_LEAD)).collect();
    let n = own.len() as f64;
    let sum: f64 = lead.iter().sum();
    let squares: f64 = lead.iter().map(|l| l * l).sum();
    let determinant = n * squares - sum * sum;
    let (mut level, mut slope) = (0.0, 0.0);
    if determinant <= 0.0 {
        return (level, slope);
    }
    for _ in 0..STEPS {
        let (mut by_level, mut by_slope) = (0.0, 0.0);
        for (v, l) in own.iter().zip(&lead) {
            let z = v * exp(-(level + slope * l));
            let excess = 0.5 * ((z * z).min(LARGEST_SQUARE) - 1.0);
            by_level += excess;
            by_slope += excess * l;
        }
        level += (squares * by_level - sum * by_slope) / determinant;
        slope += (n * by_slope - sum * by_level) / determinant;
    }
    (level, slope)
}

/// Skewness parameter of residuals with mean 0 and variance 1. Transformations compose by adding
/// their parameters (but for the means), so that each step scores the residual skewness at 0.
fn skewness(residuals: &[f64]) -> f64 {
    let mut skew = 0.0;
    for _ in 0..STEPS {
        let bend = Bend::new(0.0, 0.0, skew);
        let sd = bend.variance().sqrt();
        let score: f64 = residuals
            .iter()
            .map(|residual| {
                let (z, _) = bend.undo(residual * sd, 0.0);
                let z = z.clamp(-4.0, 4.0);
                let root = (1.0 + z * z).sqrt();
                z * (root - KAPPA) - z / root
            })
            .sum();
        skew += score / (residuals.len() as f64 * SKEW_INFORMATION);
        skew = f64::clamp(skew, -MOST_SKEW, MOST_SKEW);
    }
    skew
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::numeric::{Purpose, Stream};

    #[test]
    fn undoing_a_bend_gives_back_z_and_its_slope() {
        for (level, slope, skew) in [(0.0, 0.0, 0.0), (0.3, -0.2, 0.4), (-1.0, 0.5, -1.0)] {
            let bend = Bend::new(level, slope, skew);
            for lead in [-7.0, -0.5, 2.0] {
                for z in [-6.0, -1.0, 0.0, 0.3, 4.0] {
                    let v = bend.apply(z, lead);
                    let (back, log_slope) = bend.undo(v, lead);
                    approx::assert_abs_diff_eq!(back, z, epsilon = 1e-12);
                    // The central difference is off by h^2 times the third derivative.
                    let h = 1e-5 * exp(level);
                    let slope = (bend.undo(v + h, lead).0 - bend.undo(v - h, lead).0) / (2.0 * h);
                    approx::assert_relative_eq!(ln(slope), log_slope, epsilon = 1e-7);
                }
            }
        }
    }

    /// Mean 0 and the stated variance, by the average over draws.
    #[test]
    fn the_bracket_has_mean_0_and_the_stated_variance() {
        let mut stream = Stream::new(5, Purpose::Simulation, 0);
        let bend = Bend::new(0.0, 0.0, 0.6);
        let n = 200_000;
        let draws: Vec<f64> = (0..n).map(|_| bend.apply(stream.normal(), 0.0)).collect();
        let n = f64::from(n);
        let mean = draws.iter().sum::<f64>() / n;
        let square = draws.iter().map(|v| v * v).sum::<f64>() / n;
        assert!(mean.abs() < 4.5 * (square / n).sqrt(), "{mean}");
        let fourth = draws.iter().map(|v| v * v * v * v).sum::<f64>() / n;
        let error = ((fourth - square * square) / n).sqrt();
        assert!(
            (square - bend.variance()).abs() < 4.5 * error,
            "{square} for {}",
            bend.variance()
        );
    }

    /// The fit finds the bend that draws were made with. Scale and slope are known to 0.7/sqrt(n) = 0.0022,
    /// skewness to 1.4/sqrt(n) = 0.0044; taking residuals as normal and holding them to 3 moves
    /// scale and slope by less than 0.02 beyond that.
    #[test]
    fn a_fit_recovers_the_bend() {
        let mut stream = Stream::new(6, Purpose::Simulation, 0);
        let skew = 0.2;
        let level = -0.5 * ln(Bend::new(0.0, 0.0, skew).variance()) - 0.1;
        let made = Bend::new(level, 0.25, skew);
        let lead: Vec<f64> = (0..100_000).map(|_| stream.normal()).collect();
        let own: Vec<f64> = lead.iter().map(|l| made.apply(stream.normal(), *l)).collect();
        let found = Bend::fitted(&own, Some(&lead));
        approx::assert_abs_diff_eq!(found.level, made.level, epsilon = 0.03);
        approx::assert_abs_diff_eq!(found.slope, made.slope, epsilon = 0.03);
        approx::assert_abs_diff_eq!(found.sinh, made.sinh, epsilon = 0.03);
    }
}
