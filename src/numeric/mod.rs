//! Takes floats; gives special functions, random streams, fixed-order sums and kernels.

mod elementary;
mod gamma;
mod normal;
mod poisson;
mod random;
mod uniform_expansion;

pub use elementary::{exp, ln, ln_1p};
pub use gamma::{ln_factorial, ln_gamma};
pub use normal::{normal_cdf, normal_quantile};
pub use poisson::{poisson_cdf, poisson_ln_pmf, poisson_pmf, poisson_sf};
pub use random::{Purpose, Stream};
