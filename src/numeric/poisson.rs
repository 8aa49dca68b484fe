//! Poisson probabilities, accurate relative to themselves in both tails.
//!
//! The distribution function is an incomplete gamma function of a whole first argument:
//! P(Y <= y) = Q(y + 1, mean). So far from the mean the tail is a short sum of positive terms, and
//! near a large mean the uniform expansion takes over; neither needs a continued fraction.

use super::elementary::exp_to_zero;
use super::gamma::{deviance_part, ln_factorial, stirling_remainder};
use super::ln;
use super::uniform_expansion::{Tails, poisson_tails as tails_near_large_mean};

/// ln P(Y = y) for a whole `y` from 0 and a `mean` from 0 (at mean 0: 0 for y = 0, else minus infinity).
///
/// From 16 on by Loader's saddle point (2000): -s(y) - D - ln(2 pi y) / 2 with Stirling's remainder
/// s and D = y ln(y / mean) + mean - y; y ln(mean) - mean - ln y! would lose nine digits at 1e9.
pub fn poisson_ln_pmf(y: f64, mean: f64) -> f64 {
    if y == 0.0 {
        return -mean;
    }
    if mean == 0.0 {
        return f64::NEG_INFINITY;
    }
    if y < 16.0 {
        return y * ln(mean) - mean - ln_factorial(y);
    }
    -stirling_remainder(y) - deviance_part(y, mean, y - mean) - 0.5 * ln(2.0 * std::f64::consts::PI * y)
}

/// P(Y = y).
pub fn poisson_pmf(y: f64, mean: f64) -> f64 {
    exp_to_zero(poisson_ln_pmf(y, mean))
}

/// P(Y <= y) for a whole `y` (0 for a negative one).
pub fn poisson_cdf(y: f64, mean: f64) -> f64 {
    tails(y, mean).at_most
}

/// P(Y > y) for a whole `y` (1 for a negative one).
pub fn poisson_sf(y: f64, mean: f64) -> f64 {
    tails(y, mean).above
}

/// Both tails: the smaller one is computed, the other is what it leaves of 1.
fn tails(y: f64, mean: f64) -> Tails {
    if y < 0.0 {
        return Tails {
            at_most: 0.0,
            above: 1.0,
        };
    }
    if mean == 0.0 {
        return Tails {
            at_most: 1.0,
            above: 0.0,
        };
    }
    let a = y + 1.0;
    if a >= 40.0 && (mean - a).abs() <= 0.3 * a {
        return tails_near_large_mean(y, mean);
    }
    if mean < a {
        // P(Y > y) = p(y + 1) (1 + mean / (y + 2) + mean^2 / ((y + 2) (y + 3)) + ...)
        let (mut term, mut sum, mut k) = (1.0, 1.0, a);
        while term > 1e-17 * sum {
            k += 1.0;
            term *= mean / k;
            sum += term;
        }
        let above = poisson_pmf(a, mean) * sum;
        Tails {
            at_most: 1.0 - above,
            above,
        }
    } else {
        // P(Y <= y) = p(y) (1 + y / mean + y (y - 1) / mean^2 + ...)
        let (mut term, mut sum, mut k) = (1.0, 1.0, y);
        while k > 0.0 && term > 1e-17 * sum {
            term *= k / mean;
            sum += term;
            k -= 1.0;
        }
        let at_most = poisson_pmf(y, mean) * sum;
        Tails {
            at_most,
            above: 1.0 - at_most,
        }
    }
}
