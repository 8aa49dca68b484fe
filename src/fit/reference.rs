//! The reference: the fixed density q that independence Metropolis steps propose from.
//!
//! q = 0.85 (normal or t) + 0.15 t with 5 degrees of freedom at 1.3 times the scale, both with the
//! same centre and shape. The heavy part is not optional: where the posterior's tail is heavier than
//! q's, a chain that gets there waits for thousands of steps, and one that starts far out may never
//! come back.
//!
//! The scatter is walked as a signed number on the even extension of the posterior. Where the
//! reference's centre of it is not 0, q is the even mixture of itself and its mirror image: a
//! proposal that is mirrored with the full covariance but judged by one image's density alone has
//! the wrong acceptance ratio wherever the scatter correlates with a coefficient.

use crate::numeric::cholesky::{Cholesky, NotPositiveDefinite};
use crate::numeric::{Stream, exp, ln, ln_1p, ln_gamma};

/// Share of the heavy part.
const HEAVY_SHARE: f64 = 0.15;
/// Its degrees of freedom.
const HEAVY_DEGREES: f64 = 5.0;
/// Its scale, as a multiple of the main part's.
const HEAVY_SCALE: f64 = 1.3;
const LN_TWO_PI: f64 = 1.837_877_066_409_345_5;
const LN_PI: f64 = 1.144_729_885_849_400_2;

/// The main part's tails.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum Tails {
    /// Normal.
    Normal,
    /// Student's t with these degrees of freedom.
    T(f64),
}

/// Centre and shape in signed coordinates.
#[derive(Debug, Clone, PartialEq)]
pub struct Shape {
    /// Centre.
    pub centre: Vec<f64>,
    /// Covariance, row-major.
    pub covariance: Vec<f64>,
    /// Place of the scatter, where there is one.
    pub scatter: Option<usize>,
}

impl Shape {
    /// The shape with these moments, the scatter's taken of its absolute value. Where the scatter's
    /// mean is below 2.5 of its standard deviations the two mirror images run into each other and
    /// one hump at 0 with the raw second moment serves better; by symmetry nothing correlates with
    /// a signed scatter then.
    pub fn of_moments(mean: &[f64], covariance: &[f64], scatter: Option<usize>) -> Self {
        let d = mean.len();
        let mut shape = Shape {
            centre: mean.to_vec(),
            covariance: covariance.to_vec(),
            scatter,
        };
        if let Some(s) = scatter {
            let variance = covariance[s * d + s];
            if mean[s] < 2.5 * variance.sqrt() {
                for i in 0..d {
                    shape.covariance[s * d + i] = 0.0;
                    shape.covariance[i * d + s] = 0.0;
                }
                shape.covariance[s * d + s] = variance + mean[s] * mean[s];
                shape.centre[s] = 0.0;
            }
        }
        shape
    }
}

/// The reference density.
#[derive(Debug, Clone)]
pub struct Reference {
    centre: Vec<f64>,
    factor: Cholesky,
    /// Inverse of the factor, row-major: a quadratic form is then a sum of squares.
    whitener: Vec<f64>,
    /// Place of a scatter whose centre is not 0: q is summed over its two signs.
    mirrored: Option<usize>,
    kernel: Kernel,
}

impl Reference {
    /// The reference of a shape, its scale multiplied by `inflation`.
    ///
    /// # Errors
    /// [`NotPositiveDefinite`] when the shape's covariance is not.
    pub fn new(shape: &Shape, tails: Tails, inflation: f64) -> Result<Self, NotPositiveDefinite> {
        let d = shape.centre.len();
        let scaled: Vec<f64> = shape.covariance.iter().map(|v| v * inflation * inflation).collect();
        let factor = Cholesky::factor(&scaled, d)?;
        Ok(Reference {
            centre: shape.centre.clone(),
            whitener: factor.inverse_lower(),
            mirrored: shape.scatter.filter(|s| shape.centre[*s] != 0.0),
            kernel: Kernel::new(d, tails, 0.5 * factor.log_determinant()),
            factor,
        })
    }

    /// The squared distance of a point from the centre in the metric of the shape, for the point
    /// itself and, where the reference is mirrored, for its mirror image.
    pub fn distances(&self, point: &[f64]) -> [Option<f64>; 2] {
        let itself = self.distance(point, None);
        [Some(itself), self.mirrored.map(|s| self.distance(point, Some(s)))]
    }

    fn distance(&self, point: &[f64], mirrored: Option<usize>) -> f64 {
        let d = self.centre.len();
        let mut off = [0.0; STACK];
        let mut heap;
        let off: &mut [f64] = if d <= STACK {
            &mut off[..d]
        } else {
            heap = vec![0.0; d];
            &mut heap
        };
        for i in 0..d {
            off[i] = point[i] - self.centre[i];
        }
        if let Some(s) = mirrored {
            off[s] = -point[s] - self.centre[s];
        }
        let mut sum = 0.0;
        for i in 0..d {
            let row = &self.whitener[i * d..i * d + i + 1];
            let z: f64 = row.iter().zip(&off[..=i]).map(|(l, o)| l * o).sum();
            sum += z * z;
        }
        sum
    }

    /// log q, with its constant.
    pub fn log_density(&self, point: &[f64]) -> f64 {
        self.kernel.log_density(self.distances(point))
    }

    /// A draw from q.
    pub fn draw(&self, stream: &mut Stream, out: &mut [f64]) {
        let heavy = stream.uniform() < HEAVY_SHARE;
        let scale = match (heavy, self.kernel.tails) {
            (true, _) => HEAVY_SCALE * t_scale(HEAVY_DEGREES, stream),
            (false, Tails::T(degrees)) => t_scale(degrees, stream),
            (false, Tails::Normal) => 1.0,
        };
        let z: Vec<f64> = (0..out.len()).map(|_| scale * stream.normal()).collect();
        self.factor.times(&z, out);
        for (value, centre) in out.iter_mut().zip(&self.centre) {
            *value += centre;
        }
        if let Some(s) = self.mirrored
            && stream.uniform() < 0.5
        {
            out[s] = -out[s];
        }
    }
}

/// Dimensions up to here need no allocation for a distance.
const STACK: usize = 64;

/// A normal divided by this root is a t: sqrt(nu / chi-square), with chi-square/2 a gamma of shape nu/2.
pub fn t_scale(degrees: f64, stream: &mut Stream) -> f64 {
    (0.5 * degrees / stream.gamma(0.5 * degrees)).sqrt()
}

/// log q as a function of the squared distances alone.
#[derive(Debug, Clone, Copy)]
pub struct Kernel {
    dimension: f64,
    tails: Tails,
    /// Log constants, the shares of the parts among them.
    main: f64,
    heavy: f64,
}

impl Kernel {
    /// The kernel in `dimension` dimensions for a shape with this half log determinant.
    pub fn new(dimension: usize, tails: Tails, half_log_determinant: f64) -> Self {
        let d = dimension as f64;
        let t_constant =
            |degrees: f64| ln_gamma(0.5 * (degrees + d)) - ln_gamma(0.5 * degrees) - 0.5 * d * (ln(degrees) + LN_PI);
        let main = match tails {
            Tails::Normal => -0.5 * d * LN_TWO_PI,
            Tails::T(degrees) => t_constant(degrees),
        };
        Kernel {
            dimension: d,
            tails,
            main: main + ln(1.0 - HEAVY_SHARE) - half_log_determinant,
            heavy: t_constant(HEAVY_DEGREES) - d * ln(HEAVY_SCALE) + ln(HEAVY_SHARE) - half_log_determinant,
        }
    }

    /// log q at these squared distances; with two images each carries half.
    pub fn log_density(&self, distances: [Option<f64>; 2]) -> f64 {
        let mut parts = [f64::NEG_INFINITY; 4];
        for (image, distance) in distances.iter().enumerate() {
            if let Some(q) = distance {
                parts[2 * image] = self.main
                    + match self.tails {
                        Tails::Normal => -0.5 * q,
                        Tails::T(degrees) => -0.5 * (degrees + self.dimension) * ln_1p(q / degrees),
                    };
                parts[2 * image + 1] = self.heavy
                    - 0.5 * (HEAVY_DEGREES + self.dimension) * ln_1p(q / (HEAVY_SCALE * HEAVY_SCALE * HEAVY_DEGREES));
            }
        }
        let images = if distances[1].is_some() { 2.0 } else { 1.0 };
        let top = parts.iter().copied().fold(f64::NEG_INFINITY, f64::max);
        let sum: f64 = parts
            .iter()
            .map(|part| if *part > top - 60.0 { exp(part - top) } else { 0.0 })
            .sum();
        top + ln(sum / images)
    }
}
