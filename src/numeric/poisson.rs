//! Poisson probabilities, accurate relative to themselves in both tails.
//!
//! The distribution function is an incomplete gamma function of a whole first argument:
//! P(Y <= y) = Q(y + 1, mean). So far from the mean the tail is a short sum of positive terms, and
//! near a large mean the uniform expansion takes over; neither needs a continued fraction.

use super::elementary::{exp_to_zero, ln_of_normal};
use super::gamma::{deviance_part, ln_factorial, stirling_remainder};
use super::uniform_expansion::{Tails, poisson_tails as tails_near_large_mean};
use super::{EXP_LIMIT, exp, ln};

/// A count whose probabilities are asked for under many means: what depends on the count alone is
/// computed once.
#[derive(Debug, Clone, Copy)]
pub struct PoissonCount {
    y: f64,
    /// What ln P(Y = y) and ln P(Y = y + 1) hold of the count alone.
    this: CountPart,
    next: CountPart,
}

/// What ln P(Y = y) holds of the count y alone.
#[derive(Debug, Clone, Copy)]
enum CountPart {
    /// ln y!
    Small { ln_factorial: f64 },
    /// Stirling's remainder, and ln(2 pi y) / 2.
    Large { stirling: f64, half_ln: f64 },
}

impl CountPart {
    fn of(y: f64) -> CountPart {
        if y < 16.0 {
            CountPart::Small {
                ln_factorial: ln_factorial(y),
            }
        } else {
            CountPart::Large {
                stirling: stirling_remainder(y),
                half_ln: 0.5 * ln(2.0 * std::f64::consts::PI * y),
            }
        }
    }

    /// ln P(Y = y), for the y that this part is of.
    ///
    /// From 16 on by Loader's saddle point (2000): -s(y) - D - ln(2 pi y) / 2 with Stirling's remainder
    /// s and D = y ln(y / mean) + mean - y; y ln(mean) - mean - ln y! would lose nine digits at 1e9.
    #[inline]
    fn ln_pmf(&self, y: f64, mean: f64) -> f64 {
        if y == 0.0 {
            return -mean;
        }
        if mean == 0.0 {
            return f64::NEG_INFINITY;
        }
        match *self {
            CountPart::Small { ln_factorial } => y * ln(mean) - mean - ln_factorial,
            CountPart::Large { stirling, half_ln } => -stirling - deviance_part(y, mean, y - mean) - half_ln,
        }
    }
}

impl PoissonCount {
    /// The whole number `y`; a negative one has no probability.
    pub fn new(y: f64) -> PoissonCount {
        PoissonCount {
            y,
            this: CountPart::of(y),
            next: CountPart::of(y + 1.0),
        }
    }

    /// P(Y = y).
    pub fn pmf(&self, mean: f64) -> f64 {
        exp_to_zero(self.this.ln_pmf(self.y, mean))
    }

    /// P(Y = y) under each of the means: the same bits as one by one, by loops that become vector code.
    pub fn pmf_each(&self, means: &[f64]) -> Vec<f64> {
        let mut values: Vec<f64> = match self.this {
            CountPart::Small { ln_factorial }
                if self.y > 0.0 && means.iter().all(|mean| *mean >= f64::MIN_POSITIVE) =>
            {
                let ln_pmf = |mean: &f64| self.y * ln_of_normal(*mean, 0.0) - mean - ln_factorial;
                means.iter().map(ln_pmf).collect()
            }
            _ => means.iter().map(|mean| self.this.ln_pmf(self.y, *mean)).collect(),
        };
        if values.iter().all(|value| *value > -EXP_LIMIT) {
            values.iter_mut().for_each(|value| *value = exp(*value));
        } else {
            values.iter_mut().for_each(|value| *value = exp_to_zero(*value));
        }
        values
    }

    /// P(Y <= y) (0 for a negative y).
    pub fn cdf(&self, mean: f64) -> f64 {
        self.tails(mean, |a| exp_to_zero(self.next.ln_pmf(a, mean))).at_most
    }

    /// P(Y <= y), where P(Y = y + 1) is known already.
    pub fn cdf_before(&self, mean: f64, next_pmf: f64) -> f64 {
        self.tails(mean, |_| next_pmf).at_most
    }

    /// `sum` + P(Y <= y), for a sum from 0: the bits of that sum, with less work where nothing else shows in it.
    ///
    /// Far from the mean the tail that is computed vanishes, and a bound of its series tells so: a number
    /// below `UNSEEN` of the other is less than half of its last bit, and changes nothing.
    pub fn add_cdf(&self, sum: f64, mean: f64) -> f64 {
        match self.side_of(mean) {
            Side::Upper => {
                let next = exp_to_zero(self.next.ln_pmf(self.y + 1.0, mean));
                if next < UNSEEN * (1.0 - mean / (self.y + 2.0)) {
                    sum + 1.0
                } else {
                    sum + (1.0 - next * upper_series(self.y + 1.0, mean))
                }
            }
            Side::Lower => {
                let this = self.pmf(mean);
                if this < UNSEEN * sum * (1.0 - self.y / mean) {
                    sum
                } else {
                    sum + this * lower_series(self.y, mean)
                }
            }
            Side::Outside | Side::NoMean | Side::Near => sum + self.cdf(mean),
        }
    }

    /// Both tails: the smaller one is computed, the other is what it leaves of 1. The upper one starts from
    /// the probability of y + 1, which is asked for where it is needed.
    #[inline]
    fn tails(&self, mean: f64, next_pmf: impl FnOnce(f64) -> f64) -> Tails {
        match self.side_of(mean) {
            Side::Outside => Tails {
                at_most: 0.0,
                above: 1.0,
            },
            Side::NoMean => Tails {
                at_most: 1.0,
                above: 0.0,
            },
            Side::Near => tails_near_large_mean(self.y, mean),
            Side::Upper => {
                let above = next_pmf(self.y + 1.0) * upper_series(self.y + 1.0, mean);
                Tails {
                    at_most: 1.0 - above,
                    above,
                }
            }
            Side::Lower => {
                let at_most = self.pmf(mean) * lower_series(self.y, mean);
                Tails {
                    at_most,
                    above: 1.0 - at_most,
                }
            }
        }
    }

    fn side_of(&self, mean: f64) -> Side {
        let a = self.y + 1.0;
        if self.y < 0.0 {
            Side::Outside
        } else if mean == 0.0 {
            Side::NoMean
        } else if a >= 40.0 && (mean - a).abs() <= 0.3 * a {
            Side::Near
        } else if mean < a {
            Side::Upper
        } else {
            Side::Lower
        }
    }
}

/// Less than 2^-54: this much of a number, added or taken off, is rounded away.
const UNSEEN: f64 = 5e-17;

/// Where a count lies, which tells how its tails are computed.
enum Side {
    /// Below 0, where there is no count.
    Outside,
    /// The mean is 0.
    NoMean,
    /// Near a large mean: by the uniform expansion.
    Near,
    /// Above the mean: the upper tail by its series.
    Upper,
    /// Below the mean: the lower tail by its series.
    Lower,
}

/// P(Y >= a) / P(Y = a) = 1 + mean / (a + 1) + mean^2 / ((a + 1) (a + 2)) + ..., less than 1 / (1 - mean / (a + 1)).
fn upper_series(a: f64, mean: f64) -> f64 {
    let (mut term, mut sum, mut k) = (1.0, 1.0, a);
    while term > 1e-17 * sum {
        k += 1.0;
        term *= mean / k;
        sum += term;
    }
    sum
}

/// P(Y <= y) / P(Y = y) = 1 + y / mean + y (y - 1) / mean^2 + ..., less than 1 / (1 - y / mean).
fn lower_series(y: f64, mean: f64) -> f64 {
    let (mut term, mut sum, mut k) = (1.0, 1.0, y);
    while k > 0.0 && term > 1e-17 * sum {
        term *= k / mean;
        sum += term;
        k -= 1.0;
    }
    sum
}

/// ln P(Y = y) for a whole `y` from 0 and a `mean` from 0 (at mean 0: 0 for y = 0, else minus infinity).
pub fn poisson_ln_pmf(y: f64, mean: f64) -> f64 {
    CountPart::of(y).ln_pmf(y, mean)
}

/// P(Y = y).
pub fn poisson_pmf(y: f64, mean: f64) -> f64 {
    exp_to_zero(poisson_ln_pmf(y, mean))
}

/// P(Y <= y) for a whole `y` (0 for a negative one).
pub fn poisson_cdf(y: f64, mean: f64) -> f64 {
    PoissonCount::new(y).cdf(mean)
}

/// P(Y > y) for a whole `y` (1 for a negative one).
pub fn poisson_sf(y: f64, mean: f64) -> f64 {
    let count = PoissonCount::new(y);
    count.tails(mean, |a| exp_to_zero(count.next.ln_pmf(a, mean))).above
}

#[cfg(test)]
mod tests {
    use super::*;

    /// What is computed once for many means, and by vector code, has the bits of one at a time.
    #[test]
    fn many_means_at_once_are_the_same_bits() {
        let means: Vec<f64> = (0..400).map(|k| 0.003 * f64::from(k * k) + 1e-9).collect();
        let with_wild_ones: Vec<f64> = means.iter().copied().chain([0.0, 1e-310, 2e4, 1e100]).collect();
        for means in [&means, &with_wild_ones] {
            for y in [-1.0, 0.0, 1.0, 7.0, 15.0, 16.0, 60.0, 450.0] {
                let count = PoissonCount::new(y);
                let next = PoissonCount::new(y + 1.0).pmf_each(means);
                let same = |a: f64, b: f64| assert_eq!(a.to_bits(), b.to_bits(), "{y}: {a} and {b}");
                for (k, mean) in means.iter().enumerate() {
                    same(next[k], poisson_pmf(y + 1.0, *mean));
                    same(count.cdf(*mean), poisson_cdf(y, *mean));
                    same(count.cdf_before(*mean, next[k]), poisson_cdf(y, *mean));
                    for sum in [0.0, 1e-30, 1e-9, 0.7, 1.0, 3.0, 4e3] {
                        same(count.add_cdf(sum, *mean), sum + poisson_cdf(y, *mean));
                    }
                }
            }
        }
    }
}
