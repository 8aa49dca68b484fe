//! The regularised incomplete beta function and the quantile of a beta distribution.

use super::gamma::{deviance_part, stirling_remainder};
use super::poisson::exp_to_zero;

/// More steps than any argument within the stated ranges takes (about 3 sqrt of the larger parameter).
const MOST_STEPS: usize = 2_000_000;

/// I_x(a, b): the probability that a beta variable with these parameters is at most `x`.
///
/// `a` and `b` above 0, up to 1e12. 0 for x at or below 0, 1 for x at or above 1.
pub fn incomplete_beta(a: f64, b: f64, x: f64) -> f64 {
    if x <= 0.0 {
        return 0.0;
    }
    if x >= 1.0 {
        return 1.0;
    }
    let y = 1.0 - x;
    if converges_fast(a, b, x) {
        front(a, b, x, y) / a * beta_fraction(a, b, x)
    } else {
        1.0 - front(a, b, x, y) / b * beta_fraction(b, a, y)
    }
}

/// The quantile of a beta distribution: the x at which I_x(a, b) reaches `p`.
///
/// By bisection to the last bit or so: it is called a handful of times per parameter.
pub fn beta_quantile(p: f64, a: f64, b: f64) -> f64 {
    let (mut low, mut high) = (0.0, 1.0);
    loop {
        let middle = 0.5 * (low + high);
        if middle <= low || middle >= high || high - low < 1e-15 * high {
            return middle;
        }
        if incomplete_beta(a, b, middle) < p {
            low = middle;
        } else {
            high = middle;
        }
    }
}

/// Whether [`beta_fraction`] is on its fast side, which is also the side of the smaller tail.
pub(super) fn converges_fast(a: f64, b: f64, x: f64) -> bool {
    x * (a + b + 2.0) < a + 1.0
}

/// x^a y^b / B(a, b) with y = 1 - x, by Stirling remainders and deviances as in Loader (2000).
fn front(a: f64, b: f64, x: f64, y: f64) -> f64 {
    let n = a + b;
    // a - n x = a y - b x, and b - n y is its negative.
    let d = a * y - b * x;
    let log = stirling_remainder(n)
        - stirling_remainder(a)
        - stirling_remainder(b)
        - deviance_part(a, n * x, d)
        - deviance_part(b, n * y, -d);
    exp_to_zero(log) * (a * (b / n) / (2.0 * std::f64::consts::PI)).sqrt()
}

/// The continued fraction K of I_x(a, b) = x^a (1 - x)^b / (a B(a, b)) K, by the modified Lentz method.
///
/// DLMF 8.17.22 and 8.17.23; Lentz (1976) with Thompson & Barnett's (1986) guard against zeros.
pub(super) fn beta_fraction(a: f64, b: f64, x: f64) -> f64 {
    const GUARD: f64 = 1e-300;
    let hold = |v: f64| if v.abs() < GUARD { GUARD } else { v };
    let mut c = 1.0;
    let mut d = 1.0 / hold(1.0 - (a + b) / (a + 1.0) * x);
    let mut value = d;
    for step in 1..MOST_STEPS {
        let m = step as f64;
        let even = m * (b - m) / ((a + 2.0 * m - 1.0) * (a + 2.0 * m)) * x;
        d = 1.0 / hold(1.0 + even * d);
        c = hold(1.0 + even / c);
        value *= d * c;
        let odd = -(a + m) * (a + b + m) / ((a + 2.0 * m) * (a + 2.0 * m + 1.0)) * x;
        d = 1.0 / hold(1.0 + odd * d);
        c = hold(1.0 + odd / c);
        let change = d * c;
        value *= change;
        if (change - 1.0).abs() < 2e-16 {
            break;
        }
    }
    value
}
