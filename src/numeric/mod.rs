//! Takes floats; gives special functions, random streams, fixed-order sums and kernels.

mod beta;
pub mod cholesky;
mod elementary;
mod fourier;
mod gamma;
mod legendre;
mod negative_binomial;
mod normal;
mod poisson;
mod random;
mod rising;
mod sum;
mod uniform_expansion;

pub use beta::{beta_quantile, incomplete_beta};
pub(crate) use elementary::exp_within;
pub use elementary::{EXP_LIMIT, exp, ln, ln_1p};
pub use fourier::Fourier;
pub use gamma::{ln_factorial, ln_gamma};
pub use legendre::legendre;
pub use negative_binomial::{nb2_cdf, nb2_ln_pmf, nb2_pmf, nb2_sf};
pub use normal::{normal_cdf, normal_quantile};
pub use poisson::{PoissonCount, poisson_cdf, poisson_ln_pmf, poisson_pmf, poisson_sf};
pub use random::{Purpose, Stream};
pub use rising::{RisingSum, ln_rising};
pub(crate) use sum::{LANES, add_up};
pub use sum::{dot, mean, sum, sum_of, sum_with};
