//! Takes floats; gives special functions, random streams, fixed-order sums and kernels.

pub mod cholesky;
mod elementary;

pub use elementary::{exp, ln, ln_1p};
