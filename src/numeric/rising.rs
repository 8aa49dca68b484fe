//! sum of ln(1 + a j) over whole j: what the negative binomial has in place of log-gamma differences.

use super::gamma::{atanh_tail, stirling_remainder};
use super::{ln, ln_1p};

/// A rising sum and its first two derivatives in `a`.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct RisingSum {
    /// sum of ln(1 + a j)
    pub value: f64,
    /// sum of j / (1 + a j)
    pub slope: f64,
    /// minus the sum of (j / (1 + a j))^2
    pub curvature: f64,
}

/// The sum of ln(1 + a j) for j from `m` to `y` - 1, with its derivatives in `a`.
///
/// `m` <= `y` are whole numbers from 0, up to 1e9; `a` is c^2 >= 0, up to 2,500. It equals
/// ln Gamma(y + 1/a) - ln Gamma(m + 1/a) + (y - m) ln a, which loses every digit as a goes to 0.
///
/// Here 1 + a (m + i) = (1 + a m) (1 + b i) with b = a / (1 + a m), so that
/// value = n ln(1 + a m) + G(n, b) with n = y - m and G the same sum from 0: two terms of one sign,
/// in the value and in both derivatives. G comes from Stirling's formula (see `from_zero`).
pub fn ln_rising(m: f64, y: f64, a: f64) -> RisingSum {
    let mut total = RisingSum {
        value: 0.0,
        slope: 0.0,
        curvature: 0.0,
    };
    // Stirling's series needs 1/b = m + 1/a to be large; and a sum of few terms is best summed.
    let mut m = m;
    while m < y && (m < 16.0 || y - m < 4.0) {
        let ratio = m / (1.0 + a * m);
        total.value += ln_1p(a * m);
        total.slope += ratio;
        total.curvature -= ratio * ratio;
        m += 1.0;
    }
    if m < y {
        let n = y - m;
        let g = from_zero(n, a / (1.0 + a * m));
        let ratio = m / (1.0 + a * m);
        // db/da = (1 + a m)^-2, d2b/da2 = -2 m (1 + a m)^-3
        let shrink = 1.0 / (1.0 + a * m);
        let bend = shrink * shrink;
        total.value += n * ln_1p(a * m) + g.value;
        total.slope += n * ratio + g.slope * bend;
        total.curvature += -n * ratio * ratio + g.curvature * bend * bend - 2.0 * g.slope * ratio * bend;
    }
    total
}

/// G(n, b) = sum of ln(1 + b i) for i from 0 to n - 1, and its derivatives in b; 1/b is at least 16.
///
/// With r = 1/b, t = b n, L = ln(1 + t), s Stirling's remainder, p(x) = x^2 s'(x), q(x) = x^3 s''(x):
///
/// - G   = n t H - L/2 + s(n + r) - s(r),                        H = ((1 + t) L - t) / t^2
/// - G'  = n^2 K - n / (2 (1 + t)) + p(r) - p(n + r) / (1 + t)^2,  K = (t - L) / t^2
/// - G'' = n^3 K' + n^2 / (2 (1 + t)^2) - n / (6 (1 + t)^3) - r (2 (p - p / (1 + t)^2) + q - q / (1 + t)^3)
///
/// where in G'' the leading terms -1/12 of p and 1/6 of q have been taken together by hand: they are
/// multiplied by r, so their difference would carry the rounding of a number as large as 1/b.
fn from_zero(n: f64, b: f64) -> RisingSum {
    let t = b * n;
    let [h, k, k_slope] = shapes(t);
    let u = 1.0 / (1.0 + t);
    let r = 1.0 / b;
    let end = n + r;
    let slope_rest = beyond_twelfth(r) - beyond_twelfth(end) * u * u;
    let curve_rest = beyond_sixth(r) - beyond_sixth(end) * u * u * u;
    // At b = 0 both rests are 0, and 1/b times them is no number.
    let bent = if b > 0.0 && r < f64::INFINITY {
        r * (2.0 * slope_rest + curve_rest)
    } else {
        0.0
    };
    RisingSum {
        value: n * t * h - 0.5 * ln_1p(t) + (stirling_remainder(end) - stirling_remainder(r)),
        slope: n * n * k - 0.5 * n * u - (1.0 - u * u) / 12.0 + slope_rest,
        curvature: n * n * n * k_slope + 0.5 * n * n * u * u - n * u * u * u / 6.0 - bent,
    }
}

/// H, K and dK/dt of [`from_zero`] at t >= 0.
///
/// Up to t = 1 from s = t / (2 + t), where ln(1 + t) = 2 (s + s^3 B(s^2)) and the leading terms
/// cancel on paper; above, from their definitions, which lose less than a digit there.
fn shapes(t: f64) -> [f64; 3] {
    if t <= 1.0 {
        let s = t / (2.0 + t);
        let tail = atanh_tail(s * s);
        let rest = 1.0 - s;
        [
            0.5 * rest * (1.0 + s * (1.0 + s) * tail),
            0.5 * rest * (1.0 - s * rest * tail),
            -0.5 * rest * rest * rest * (1.0 / (1.0 - s * s) - tail),
        ]
    } else {
        let log = ln(1.0 + t);
        [
            ((1.0 + t) * log - t) / (t * t),
            (t - log) / (t * t),
            (t / (1.0 + t) - 2.0 * (t - log) / t) / (t * t),
        ]
    }
}

/// x^2 s'(x) + 1/12 for x >= 16: the series of [`stirling_remainder`], differentiated.
fn beyond_twelfth(x: f64) -> f64 {
    let z = 1.0 / (x * x);
    z * (1.0 / 120.0
        - z * (1.0 / 252.0 - z * (1.0 / 240.0 - z * (1.0 / 132.0 - z * (691.0 / 32_760.0 - z * (1.0 / 12.0))))))
}

/// x^3 s''(x) - 1/6 for x >= 16.
fn beyond_sixth(x: f64) -> f64 {
    let z = 1.0 / (x * x);
    -z * (1.0 / 30.0 - z * (1.0 / 42.0 - z * (1.0 / 30.0 - z * (5.0 / 66.0 - z * (691.0 / 2730.0 - z * (7.0 / 6.0))))))
}
