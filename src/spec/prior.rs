//! Priors in the parameters that the model needs, from what the spec says in the evaluator's units.

use super::study::{Family, NORMAL_975, PlausibleRange, Standing};
use crate::numeric::ln;

impl PlausibleRange {
    /// Mean of the log-normal's log: `(ln lo + ln hi) / 2`.
    pub fn log_mean(&self) -> f64 {
        (ln(self.lo) + ln(self.hi)) / 2.0
    }

    /// Standard deviation of the log-normal's log: `(ln hi - ln lo) / (2 * 1.959964)`, so that the
    /// range is its central 95 %.
    pub fn log_sd(&self) -> f64 {
        (ln(self.hi) - ln(self.lo)) / (2.0 * NORMAL_975)
    }
}

impl Family {
    /// Rate of the exponential prior of the scatter c: `-ln(0.05) / scatter_up_to`, so that
    /// P(c > scatter_up_to) = 0.05; `None` for Poisson, which has no scatter.
    pub fn scatter_rate(&self) -> Option<f64> {
        match self {
            Family::Poisson => None,
            Family::NegativeBinomial { scatter_up_to, .. } => Some(-ln(0.05) / scatter_up_to),
        }
    }

    /// Whether the prior of the scatter is provisional; Poisson has none to think about.
    pub fn standing(&self) -> Standing {
        match self {
            Family::Poisson => Standing::Settled,
            Family::NegativeBinomial { standing, .. } => *standing,
        }
    }
}
