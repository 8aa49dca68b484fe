//! Coordinates in which the posterior is about standard: the scatter without its sign first, then
//! each coefficient less what those before it say.

use crate::numeric::cholesky::{Cholesky, NotPositiveDefinite};
use crate::numeric::{exp, normal_cdf};

/// Mean and covariance of the parameters, the scatter's taken of its absolute value.
#[derive(Debug, Clone, PartialEq)]
pub struct Moments {
    /// Mean.
    pub mean: Vec<f64>,
    /// Covariance, row-major.
    pub covariance: Vec<f64>,
    /// Place of the scatter, where there is one.
    pub scatter: Option<usize>,
}

impl Moments {
    /// Covariance of random-walk steps in signed coordinates. Where the scatter's mean is below 2.5
    /// of its standard deviations, a chain crosses 0: the step of the scatter then has the raw second
    /// moment, and by symmetry nothing correlates with it.
    pub fn of_signed_steps(&self) -> Vec<f64> {
        let d = self.mean.len();
        let mut covariance = self.covariance.clone();
        if let Some(s) = self.scatter {
            let (mean, variance) = (self.mean[s], covariance[s * d + s]);
            if mean < 2.5 * variance.sqrt() {
                for i in 0..d {
                    covariance[s * d + i] = 0.0;
                    covariance[i * d + s] = 0.0;
                }
                covariance[s * d + s] = variance + mean * mean;
            }
        }
        covariance
    }

    /// The folded normal of the scatter's moments, where there is a scatter.
    pub fn fold(&self) -> Option<Fold> {
        let s = self.scatter?;
        Some(Fold::of_moments(
            self.mean[s],
            self.covariance[s * self.mean.len() + s].sqrt(),
        ))
    }
}

/// A folded normal: the law of |N(centre, scale^2)|. It is half-normal at centre 0, flat near 0 at a
/// centre of one scale, and normal far from 0: the shapes that the posterior of a scatter takes
/// (Leone, Nelson & Nottingham 1961, Technometrics 3, 543-550).
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Fold {
    /// Centre of the normal before folding.
    pub centre: f64,
    /// Its standard deviation.
    pub scale: f64,
}

impl Fold {
    /// The folded normal with this mean and standard deviation; where the mean is below that of a
    /// half-normal (1.32 standard deviations), the half-normal with their raw second moment.
    pub fn of_moments(mean: f64, sd: f64) -> Fold {
        let square = mean * mean + sd * sd;
        // With t = centre/scale: mean/root of the raw second moment grows with t.
        let asked = mean / square.sqrt();
        let (mut low, mut high) = (0.0, mean / sd);
        for _ in 0..60 {
            let t = 0.5 * (low + high);
            let folded_mean = ROOT_2_OVER_PI * exp(-0.5 * t * t) + t * (1.0 - 2.0 * normal_cdf(-t));
            if folded_mean < asked * (1.0 + t * t).sqrt() {
                low = t;
            } else {
                high = t;
            }
        }
        let scale = (square / (1.0 + low * low)).sqrt();
        Fold {
            centre: low * scale,
            scale,
        }
    }
}

/// sqrt(2/pi), the mean of a half-normal.
const ROOT_2_OVER_PI: f64 = 0.797_884_560_802_865_4;

/// The change between signed coordinates and whitened ones.
#[derive(Debug, Clone)]
pub struct Frame {
    /// Places of the parameters in the order of the whitened coordinates.
    order: Vec<usize>,
    /// Means and the factor of the covariance, in that order.
    mean: Vec<f64>,
    factor: Cholesky,
    /// Inverse of the factor, row-major.
    whitener: Vec<f64>,
    /// Whether the first coordinate is a scatter, entered by its absolute value.
    scatter_leads: bool,
}

impl Frame {
    /// The frame of these moments.
    ///
    /// # Errors
    /// [`NotPositiveDefinite`] when the covariance is not.
    pub fn new(moments: &Moments) -> Result<Self, NotPositiveDefinite> {
        let d = moments.mean.len();
        let order: Vec<usize> = moments
            .scatter
            .into_iter()
            .chain((0..d).filter(|place| Some(*place) != moments.scatter))
            .collect();
        let ordered: Vec<f64> = order
            .iter()
            .flat_map(|i| order.iter().map(move |j| moments.covariance[i * d + j]))
            .collect();
        let factor = Cholesky::factor(&ordered, d)?;
        Ok(Frame {
            mean: order.iter().map(|place| moments.mean[*place]).collect(),
            whitener: factor.inverse_lower(),
            scatter_leads: moments.scatter.is_some(),
            factor,
            order,
        })
    }

    /// Number of coordinates.
    pub fn dimension(&self) -> usize {
        self.order.len()
    }

    /// Half the log determinant of the covariance.
    pub fn half_log_determinant(&self) -> f64 {
        0.5 * self.factor.log_determinant()
    }

    /// Whitened coordinates of a point.
    pub fn enter(&self, point: &[f64], whitened: &mut [f64]) {
        let d = self.dimension();
        for ((off, place), mean) in whitened.iter_mut().zip(&self.order).zip(&self.mean) {
            *off = point[*place] - mean;
        }
        if let Some(scatter) = self.scatter(point) {
            whitened[0] = scatter - self.mean[0];
        }
        // From the last row up: a row needs the offsets before its own, which it replaces.
        for i in (0..d).rev() {
            let row = &self.whitener[i * d..=i * d + i];
            whitened[i] = row.iter().zip(&whitened[..=i]).map(|(l, off)| l * off).sum();
        }
    }

    /// The point with these whitened coordinates; a scatter comes out as the value of its coordinate.
    pub fn leave(&self, whitened: &[f64], point: &mut [f64]) {
        let mut offs = vec![0.0; self.dimension()];
        self.factor.times(whitened, &mut offs);
        for ((off, place), mean) in offs.iter().zip(&self.order).zip(&self.mean) {
            point[*place] = mean + off;
        }
    }

    /// A point's scatter without its sign, where there is one.
    pub fn scatter(&self, point: &[f64]) -> Option<f64> {
        self.scatter_leads.then(|| point[self.order[0]].abs())
    }

    /// Gives a point this scatter.
    pub fn set_scatter(&self, point: &mut [f64], scatter: f64) {
        point[self.order[0]] = scatter;
    }

    /// The first whitened coordinate of a scatter of 0 or more.
    pub fn lead_of(&self, scatter: f64) -> f64 {
        (scatter - self.mean[0]) * self.whitener[0]
    }

    /// Standard deviation of the first coordinate.
    pub fn lead_sd(&self) -> f64 {
        1.0 / self.whitener[0]
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Mean and raw second moment of |N(centre, scale^2)| (Leone, Nelson & Nottingham 1961; from memory).
    #[test]
    fn the_fold_of_a_folded_normals_moments_is_that_folded_normal() {
        for (centre, scale) in [(0.2, 0.3), (1.0, 1.0), (3.0, 0.5)] {
            let t = centre / scale;
            let mean = scale * ROOT_2_OVER_PI * exp(-0.5 * t * t) + centre * (1.0 - 2.0 * normal_cdf(-t));
            let sd = (centre * centre + scale * scale - mean * mean).sqrt();
            let fold = Fold::of_moments(mean, sd);
            // The ratio of the moments is flat in a small centre, which multiplies their rounding errors.
            approx::assert_abs_diff_eq!(fold.centre, centre, epsilon = 1e-11);
            approx::assert_abs_diff_eq!(fold.scale, scale, epsilon = 1e-11);
        }
        let half = Fold::of_moments(1.0, 1.0);
        assert!(half.centre < 1e-12);
        approx::assert_relative_eq!(half.scale, 2.0_f64.sqrt(), max_relative = 1e-12);
    }

    #[test]
    fn leaving_a_frame_undoes_entering_it() {
        let moments = Moments {
            mean: vec![1.0, -2.0, 0.8],
            covariance: vec![2.0, 0.5, 0.3, 0.5, 1.0, -0.2, 0.3, -0.2, 0.25],
            scatter: Some(2),
        };
        let frame = Frame::new(&moments).unwrap();
        let (mut whitened, mut back) = ([0.0; 3], [0.0; 3]);
        frame.enter(&[0.5, -1.0, -1.3], &mut whitened);
        approx::assert_abs_diff_eq!(whitened[0], (1.3 - 0.8) / 0.5, epsilon = 1e-14);
        approx::assert_abs_diff_eq!(whitened[0], frame.lead_of(1.3), epsilon = 1e-14);
        frame.leave(&whitened, &mut back);
        for (found, expected) in back.iter().zip([0.5, -1.0, 1.3]) {
            approx::assert_abs_diff_eq!(*found, expected, epsilon = 1e-14);
        }
    }
}
