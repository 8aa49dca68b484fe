//! Negative-binomial probabilities of a count with mean mu and variance mu + c^2 mu^2; c is the scatter.

use super::beta::beta_fraction;
use super::elementary::exp_to_zero;
use super::gamma::{deviance_part, stirling_remainder};
use super::{ln, ln_1p, poisson_cdf, poisson_ln_pmf, poisson_sf};

/// c^2 below this is Poisson to every digit, and 1 / c^2 may be no number.
const POISSON_BELOW: f64 = 1e-300;

/// ln P(Y = y) for a whole `y` from 0, a `mean` from 0 and a `scatter` from 0 (0 is Poisson).
///
/// With a = c^2, r = 1/a and N = y + r, by Loader's saddle point (2000):
///
/// s(N) - s(y) - s(r) - D(y, N q) - D(r, N p) - ln(2 pi y (1 + a y)) / 2,   p = 1 / (1 + a mean), q = 1 - p,
///
/// where both deviances are about the same difference, y - N q = (y - mean) p, which is taken from
/// `y - mean`: from N q it would be noise as a goes to 0.
pub fn nb2_ln_pmf(y: f64, mean: f64, scatter: f64) -> f64 {
    let a = scatter * scatter;
    if a < POISSON_BELOW {
        return poisson_ln_pmf(y, mean);
    }
    if y == 0.0 {
        return -ln_1p(a * mean) / a;
    }
    if mean == 0.0 {
        return f64::NEG_INFINITY;
    }
    let r = 1.0 / a;
    let shrink = 1.0 / (1.0 + a * mean);
    let grown = 1.0 + a * y;
    let difference = (y - mean) * shrink;
    stirling_remainder(y + r)
        - stirling_remainder(y)
        - stirling_remainder(r)
        - deviance_part(y, mean * grown * shrink, difference)
        - deviance_part(r, r * grown * shrink, -difference)
        - 0.5 * ln(2.0 * std::f64::consts::PI * y * grown)
}

/// P(Y = y).
pub fn nb2_pmf(y: f64, mean: f64, scatter: f64) -> f64 {
    exp_to_zero(nb2_ln_pmf(y, mean, scatter))
}

/// P(Y <= y) for a whole `y` (0 for a negative one).
pub fn nb2_cdf(y: f64, mean: f64, scatter: f64) -> f64 {
    if scatter * scatter < POISSON_BELOW {
        poisson_cdf(y, mean)
    } else {
        tails(y, mean, scatter).0
    }
}

/// P(Y > y) for a whole `y` (1 for a negative one).
pub fn nb2_sf(y: f64, mean: f64, scatter: f64) -> f64 {
    if scatter * scatter < POISSON_BELOW {
        poisson_sf(y, mean)
    } else {
        tails(y, mean, scatter).1
    }
}

/// P(Y <= y) and P(Y > y): P(Y > y) = I_q(y + 1, r), P(Y <= y) = I_p(r, y + 1).
///
/// The tail whose fraction ends soon is computed, and the other is what it leaves of 1. Up to a
/// scatter of about 3 the one computed is the smaller one, or nearly. Above, an upper tail between
/// 1e-4 and 0.1 is what is left over, so known to 4e-15 of 1 and not to 1e-12 of itself.
/// The factor before both fractions is (y + 1) P(Y = y + 1).
fn tails(y: f64, mean: f64, scatter: f64) -> (f64, f64) {
    if y < 0.0 {
        return (0.0, 1.0);
    }
    if mean == 0.0 {
        return (1.0, 0.0);
    }
    let a = scatter * scatter;
    let r = 1.0 / a;
    let p = 1.0 / (1.0 + a * mean);
    let q = a * mean * p;
    let next = y + 1.0;
    let front = next * nb2_pmf(next, mean, scatter);
    // (y + 1) p - r q, because r q = mean p.
    let lambda = (next - mean) * p;
    if lambda > 2.0 * q - 1.0 {
        let above = front / beta_fraction(next, r, q, lambda);
        (1.0 - above, above)
    } else {
        let at_most = front / beta_fraction(r, next, p, -lambda);
        (at_most, 1.0 - at_most)
    }
}
