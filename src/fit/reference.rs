//! The reference: the fixed density q that independence Metropolis steps propose from.
//!
//! A draw z comes from 0.9 (normal or t) + 0.1 t with 5 degrees of freedom at 1.3 times the scale,
//! spherical. Each coordinate of it is bent ([`Bend`]) and all are carried to the posterior's means
//! and covariance ([`Frame`]). q is the density of the whole: of z, times the Jacobians. The heavy
//! part is not optional: where the posterior's tail is heavier than q's, a chain that gets there
//! waits for thousands of steps, and one that starts far out may never come back.
//!
//! The scatter is walked as a signed number on the even extension of the posterior. It is the leading
//! coordinate, a folded normal ([`Fold`]) with either sign: two values of z lead to each scatter, and
//! q is summed over both. Everything else follows the scatter's absolute value. (A reference that is
//! drawn from with both images but judged by one has the wrong acceptance ratio near 0.)

use super::bend::Bend;
use super::frame::{Fold, Frame, Moments};
use crate::numeric::cholesky::NotPositiveDefinite;
use crate::numeric::{Stream, exp, ln, ln_1p, ln_gamma};

/// Share of the heavy part.
const HEAVY_SHARE: f64 = 0.1;
/// Its degrees of freedom.
const HEAVY_DEGREES: f64 = 5.0;
/// Its scale, as a multiple of the main part's.
const HEAVY_SCALE: f64 = 1.3;
const LN_TWO: f64 = std::f64::consts::LN_2;
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

/// Where a reference lies: all of it but the law of z.
#[derive(Debug, Clone)]
pub struct Place {
    frame: Frame,
    fold: Option<Fold>,
    /// One for each whitened coordinate; none where all are straight. That of a scatter is not used.
    bends: Vec<Bend>,
    /// log det dz/dx, but for the bends' part of it and the inflation.
    log_jacobian: f64,
}

impl Place {
    /// A place without bends.
    ///
    /// # Errors
    /// [`NotPositiveDefinite`] when the covariance is not.
    pub fn straight(moments: &Moments) -> Result<Self, NotPositiveDefinite> {
        let frame = Frame::new(moments)?;
        let fold = moments.fold();
        let lead = fold.map_or(0.0, |fold| ln(frame.lead_sd() / fold.scale) - LN_TWO);
        Ok(Place {
            bends: Vec::new(),
            log_jacobian: lead - frame.half_log_determinant(),
            frame,
            fold,
        })
    }

    /// The same with these bends, one for each whitened coordinate.
    pub fn bent(self, bends: Vec<Bend>) -> Self {
        Place { bends, ..self }
    }

    /// The same with bends fitted to draws, given as points one after another.
    pub fn bent_to(self, draws: &[f64]) -> Self {
        let d = self.frame.dimension();
        let mut whitened = vec![0.0; draws.len()];
        for (point, whitened) in draws.chunks_exact(d).zip(whitened.chunks_exact_mut(d)) {
            self.frame.enter(point, whitened);
        }
        let coordinate = |k: usize| -> Vec<f64> { whitened.iter().skip(k).step_by(d).copied().collect() };
        let lead = coordinate(0);
        let first = match self.fold {
            Some(_) => Bend::new(0.0, 0.0, 0.0),
            None => Bend::fitted(&lead, None),
        };
        let others = (1..d).map(|k| Bend::fitted(&coordinate(k), Some(&lead)));
        let bends = std::iter::once(first).chain(others).collect();
        self.bent(bends)
    }

    /// Number of parameters.
    pub fn dimension(&self) -> usize {
        self.frame.dimension()
    }

    /// Where a point lies in z.
    pub fn locate(&self, point: &[f64]) -> Located {
        let d = self.frame.dimension();
        let mut whitened = [0.0; STACK];
        let mut heap;
        let whitened: &mut [f64] = if d <= STACK {
            &mut whitened[..d]
        } else {
            heap = vec![0.0; d];
            &mut heap
        };
        self.frame.enter(point, whitened);
        let lead = whitened[0];
        let mut log_jacobian = self.log_jacobian;
        for (bend, v) in self.bends.iter().zip(whitened.iter_mut()).skip(1) {
            let (z, log_slope) = bend.undo(*v, lead);
            *v = z;
            log_jacobian += log_slope;
        }
        let rest: f64 = whitened[1..].iter().map(|z| z * z).sum();
        let distances = match (self.fold, self.frame.scatter(point)) {
            (Some(fold), Some(scatter)) => {
                let image = |scatter: f64| (scatter - fold.centre) / fold.scale;
                let (here, there) = (image(scatter), image(-scatter));
                [Some(rest + here * here), Some(rest + there * there)]
            }
            _ => {
                let (z, log_slope) = self.bends.first().map_or((lead, 0.0), |bend| bend.undo(lead, 0.0));
                log_jacobian += log_slope;
                [Some(rest + z * z), None]
            }
        };
        Located {
            distances,
            log_jacobian,
        }
    }

    /// Carries z to a point, in place.
    fn carry(&self, z: &mut [f64], positive: bool, point: &mut [f64]) {
        let scatter = self.fold.map(|fold| (fold.centre + fold.scale * z[0]).abs());
        z[0] = match (scatter, self.bends.first()) {
            (Some(scatter), _) => self.frame.lead_of(scatter),
            (None, Some(bend)) => bend.apply(z[0], 0.0),
            (None, None) => z[0],
        };
        let lead = z[0];
        for (bend, z) in self.bends.iter().zip(z.iter_mut()).skip(1) {
            *z = bend.apply(*z, lead);
        }
        self.frame.leave(z, point);
        if let Some(scatter) = scatter {
            self.frame.set_scatter(point, if positive { scatter } else { -scatter });
        }
    }
}

/// A point's place in z.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Located {
    /// Squared distance from 0: of the one z, or of both where a scatter is folded.
    pub distances: [Option<f64>; 2],
    /// log det dz/dx.
    pub log_jacobian: f64,
}

/// The reference density.
#[derive(Debug, Clone)]
pub struct Reference {
    place: Place,
    kernel: Kernel,
}

impl Reference {
    /// The reference at a place.
    pub fn new(place: Place, tails: Tails, inflation: f64) -> Self {
        Reference {
            kernel: Kernel::new(place.frame.dimension(), tails, inflation),
            place,
        }
    }

    /// log q, with its constant.
    pub fn log_density(&self, point: &[f64]) -> f64 {
        self.kernel.log_density(&self.place.locate(point))
    }

    /// A draw from q.
    pub fn draw(&self, stream: &mut Stream, out: &mut [f64]) {
        let scale = self.kernel.draw_scale(stream);
        let mut z: Vec<f64> = (0..out.len()).map(|_| scale * stream.normal()).collect();
        let positive = self.place.fold.is_none() || stream.uniform() < 0.5;
        self.place.carry(&mut z, positive, out);
    }
}

/// Dimensions up to here need no allocation for a density.
const STACK: usize = 64;

/// A normal divided by this root is a t: sqrt(nu / chi-square), with chi-square/2 a gamma of shape nu/2.
pub fn t_scale(degrees: f64, stream: &mut Stream) -> f64 {
    (0.5 * degrees / stream.gamma(0.5 * degrees)).sqrt()
}

/// The law of z: spherical, so a function of squared distances alone.
#[derive(Debug, Clone, Copy)]
pub struct Kernel {
    dimension: f64,
    tails: Tails,
    inflation: f64,
    /// Log constants, the shares of the parts among them.
    main: f64,
    heavy: f64,
}

impl Kernel {
    /// The kernel in `dimension` dimensions, its scale multiplied by `inflation`.
    pub fn new(dimension: usize, tails: Tails, inflation: f64) -> Self {
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
            inflation,
            main: main - d * ln(inflation) + ln(1.0 - HEAVY_SHARE),
            heavy: t_constant(HEAVY_DEGREES) - d * ln(inflation * HEAVY_SCALE) + ln(HEAVY_SHARE),
        }
    }

    /// The factor on a standard normal vector that makes it a draw of z.
    fn draw_scale(&self, stream: &mut Stream) -> f64 {
        let heavy = stream.uniform() < HEAVY_SHARE;
        let scale = match (heavy, self.tails) {
            (true, _) => HEAVY_SCALE * t_scale(HEAVY_DEGREES, stream),
            (false, Tails::T(degrees)) => t_scale(degrees, stream),
            (false, Tails::Normal) => 1.0,
        };
        self.inflation * scale
    }

    /// log q of a point that lies there.
    pub fn log_density(&self, located: &Located) -> f64 {
        let shrink = 1.0 / (self.inflation * self.inflation);
        let mut parts = [f64::NEG_INFINITY; 4];
        for (image, distance) in located.distances.iter().enumerate() {
            if let Some(distance) = distance {
                let q = distance * shrink;
                parts[2 * image] = self.main
                    + match self.tails {
                        Tails::Normal => -0.5 * q,
                        Tails::T(degrees) => -0.5 * (degrees + self.dimension) * ln_1p(q / degrees),
                    };
                parts[2 * image + 1] = self.heavy
                    - 0.5 * (HEAVY_DEGREES + self.dimension) * ln_1p(q / (HEAVY_SCALE * HEAVY_SCALE * HEAVY_DEGREES));
            }
        }
        let top = parts.iter().copied().fold(f64::NEG_INFINITY, f64::max);
        let sum: f64 = parts
            .iter()
            .map(|part| if *part > top - 60.0 { exp(part - top) } else { 0.0 })
            .sum();
        located.log_jacobian + top + ln(sum)
    }
}
