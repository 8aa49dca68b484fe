//! Random streams: one for each purpose and index, the same values on every machine and in every version.

use super::poisson::poisson_ln_pmf;
use super::{exp, ln, normal_quantile};
use rand::{Rng, SeedableRng};
use rand_chacha::ChaCha8Rng;

/// What a stream is for: streams of different purposes share nothing.
///
/// The numbers are part of every run's result: never change or reuse one.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Purpose {
    /// A chain of draws; the index is the chain.
    Chain = 1,
    /// The predictive check of a unit; the index is the unit.
    UnitCheck = 2,
    /// Invented data; the index is the data set.
    Demo = 3,
    /// A simulated study; the index is the repetition.
    Simulation = 4,
    /// What the priors allow; there is one stream of it.
    Prior = 5,
}

/// A stream of random numbers.
///
/// The generator is ChaCha with 8 rounds, whose output is fixed by its publication (Bernstein
/// 2008); everything above it is this module's own arithmetic.
#[derive(Debug, Clone)]
pub struct Stream {
    generator: ChaCha8Rng,
}

impl Stream {
    /// The stream of this seed, purpose and index. Streams that differ in any of the three never overlap.
    pub fn new(seed: u64, purpose: Purpose, index: u64) -> Stream {
        // Written out here, because how a library spreads a 64-bit seed over a key is its own affair.
        let mut key = *b"seed....purpose.ratewright.v0001";
        key[..8].copy_from_slice(&seed.to_le_bytes());
        key[8..16].copy_from_slice(&(purpose as u64).to_le_bytes());
        let mut generator = ChaCha8Rng::from_seed(key);
        generator.set_stream(index);
        Stream { generator }
    }

    /// Uniform on the open interval (0, 1): a multiple of 2^-53, so 1 - u is exact and never 0.
    pub fn uniform(&mut self) -> f64 {
        loop {
            let bits = self.generator.next_u64() >> 11;
            // 0 comes once in 9e15 draws, and its log would be minus infinity.
            if bits != 0 {
                return bits as f64 * (1.0 / 9_007_199_254_740_992.0);
            }
        }
    }

    /// Standard normal: the quantile of one uniform, so that it grows with it.
    pub fn normal(&mut self) -> f64 {
        normal_quantile(self.uniform())
    }

    /// A whole number from 0 to n - 1, each equally likely. `n` is at least 1; 0 counts as 1.
    pub fn below(&mut self, n: u64) -> u64 {
        let n = n.max(1);
        // Of the 2^64 values, the first 2^64 mod n would make some results likelier than others.
        let refused = (u64::MAX - n + 1) % n;
        loop {
            let product = u128::from(self.generator.next_u64()) * u128::from(n);
            if product as u64 >= refused {
                return (product >> 64) as u64;
            }
        }
    }

    /// Gamma with this shape and scale 1. Shapes from 1e-8 to 1e12; one that is no finite number comes back as it is.
    ///
    /// Marsaglia & Tsang (2000). Where the value would be below 1e-304 it is held there, above 0
    /// (a shape of 0.0004 does that to most draws); use [`Stream::ln_gamma`] to see further.
    pub fn gamma(&mut self, shape: f64) -> f64 {
        if shape >= 1.0 {
            self.gamma_from_one(shape)
        } else {
            exp(self.ln_gamma(shape))
        }
    }

    /// The log of a gamma with this shape and scale 1.
    ///
    /// Below shape 1: Gamma(shape) = Gamma(shape + 1) U^(1 / shape) (Marsaglia & Tsang 2000, section 6), in logs.
    pub fn ln_gamma(&mut self, shape: f64) -> f64 {
        if shape >= 1.0 {
            ln(self.gamma_from_one(shape))
        } else {
            ln(self.gamma_from_one(shape + 1.0)) + ln(self.uniform()) / shape
        }
    }

    /// Gamma with a shape of at least 1.
    fn gamma_from_one(&mut self, shape: f64) -> f64 {
        if !shape.is_finite() {
            // No candidate would ever be accepted.
            return shape;
        }
        let d = shape - 1.0 / 3.0;
        let c = 1.0 / (9.0 * d).sqrt();
        loop {
            let x = self.normal();
            let w = c * x;
            if w <= -1.0 {
                continue;
            }
            let u = self.uniform();
            if accepts_gamma(d, w, x, u) {
                let v = 1.0 + w;
                return d * v * v * v;
            }
        }
    }

    /// Poisson with this mean, from 0 to 1e12; a mean that is no finite number comes back as it is.
    ///
    /// Below 10 by inversion of one uniform; from 10 by transformed rejection with squeeze
    /// (Hörmann 1993, "The transformed rejection method for generating Poisson random variables",
    /// algorithm PTRS).
    pub fn poisson(&mut self, mean: f64) -> f64 {
        if !mean.is_finite() {
            // No candidate would ever be accepted.
            return mean;
        }
        if mean < 10.0 {
            return self.poisson_by_inversion(mean);
        }
        let b = 0.931 + 2.53 * mean.sqrt();
        let a = -0.059 + 0.02483 * b;
        let ln_inverse_alpha = ln(1.1239 + 1.1328 / (b - 3.4));
        let v_r = 0.9277 - 3.6224 / (b - 2.0);
        loop {
            let u = self.uniform() - 0.5;
            let v = self.uniform();
            let u_s = 0.5 - u.abs();
            let k = ((2.0 * a / u_s + b) * u + mean + 0.43).floor();
            if u_s >= 0.07 && v <= v_r {
                return k;
            }
            if k < 0.0 || (u_s < 0.013 && v > u_s) {
                continue;
            }
            if ln(v) + ln_inverse_alpha - ln(a / (u_s * u_s) + b) <= poisson_ln_pmf(k, mean) {
                return k;
            }
        }
    }

    /// Poisson with a mean below 10, by sequential search.
    fn poisson_by_inversion(&mut self, mean: f64) -> f64 {
        let u = self.uniform();
        let mut k = 0.0;
        let mut probability = exp(-mean);
        let mut below = probability;
        while u > below {
            k += 1.0;
            probability *= mean / k;
            let next = below + probability;
            if next == below {
                // Rounding holds the sum short of a u next to 1: the search ends here.
                break;
            }
            below = next;
        }
        k
    }
}

/// Marsaglia & Tsang's test with d = shape - 1/3 and w = x / sqrt(9 d): ln u < x^2/2 + d - d v + d ln v, v = (1 + w)^3.
///
/// Because 9 d w^2 = x^2, the right side is 3 d (ln(1 + w) - w + w^2/2 - w^3/3). Taken so, it keeps
/// its digits at shapes of 1e12, where d - d v + d ln v would have lost all of them.
fn accepts_gamma(d: f64, w: f64, x: f64, u: f64) -> bool {
    // The squeeze of the paper, true for 98 of 100 draws.
    let x2 = x * x;
    u < 1.0 - 0.0331 * x2 * x2 || ln(u) < 3.0 * d * ln_beyond_third(w)
}

/// ln(1 + w) - w + w^2/2 - w^3/3 for `w` above -1.
fn ln_beyond_third(w: f64) -> f64 {
    if w.abs() > 0.1 {
        return ln(1.0 + w) - w * (1.0 - w * (0.5 - w / 3.0));
    }
    // -w^4/4 + w^5/5 - ...: the first term left out is below 1e-16 of the first.
    let mut sum = 0.0;
    for k in (4..20).rev() {
        sum = 1.0 / f64::from(k) - w * sum;
    }
    -w * w * w * w * sum
}
