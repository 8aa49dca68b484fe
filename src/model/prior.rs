//! Priors: what is believed before the data, each with its normalising constant.

use crate::numeric::{exp, ln, ln_gamma};

/// log(sqrt(2 pi)).
const LN_ROOT_TWO_PI: f64 = 0.918_938_533_204_672_8;

/// A log density with its first two derivatives.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Curve {
    /// Log density.
    pub value: f64,
    /// First derivative.
    pub first: f64,
    /// Second derivative.
    pub second: f64,
}

/// A normal prior on the log scale: a plausible range of a rate or a rate ratio.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct NormalPrior {
    /// Mean.
    pub mean: f64,
    /// Standard deviation, above 0.
    pub sd: f64,
}

impl NormalPrior {
    /// Log density of a coefficient, and its derivatives.
    pub fn at(&self, coefficient: f64) -> Curve {
        let z = (coefficient - self.mean) / self.sd;
        Curve {
            value: -0.5 * z * z - ln(self.sd) - LN_ROOT_TWO_PI,
            first: -z / self.sd,
            second: -1.0 / (self.sd * self.sd),
        }
    }
}

/// Prior of the baseline: the log rate per unit of raw exposure at the reference.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum BaselinePrior {
    /// Log-normal rate.
    Range(NormalPrior),
    /// Earlier data: a gamma on the raw rate with this shape (incidents) and rate (exposure), the
    /// conjugate of the Poisson.
    Earlier {
        /// Incidents, above 0.
        incidents: f64,
        /// Exposure in raw units, above 0.
        exposure: f64,
    },
}

impl BaselinePrior {
    /// Log density of the log rate, and its derivatives. For the gamma the Jacobian of the log is
    /// included: `incidents * b - exposure * exp(b) + incidents * log(exposure) - log Gamma(incidents)`.
    pub fn at(&self, baseline: f64) -> Curve {
        match *self {
            BaselinePrior::Range(normal) => normal.at(baseline),
            BaselinePrior::Earlier { incidents, exposure } => {
                let expected = exposure * exp(baseline);
                Curve {
                    value: incidents * (baseline + ln(exposure)) - expected - ln_gamma(incidents),
                    first: incidents - expected,
                    second: -expected,
                }
            }
        }
    }
}

/// Exponential prior of the scatter, by its rate.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct ScatterPrior {
    /// Rate, above 0.
    pub rate: f64,
}

impl ScatterPrior {
    /// Log density of a scatter of 0 or more.
    pub fn value(&self, scatter: f64) -> f64 {
        ln(self.rate) - self.rate * scatter
    }
}
