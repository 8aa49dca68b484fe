//! Takes a design and priors; gives the log posterior: value, gradient, Hessian.

mod blocks;
mod count_table;
mod posterior;
mod prior;

pub use blocks::PREDICTOR_LIMIT;
pub use posterior::{Derivatives, Model};
pub use prior::{BaselinePrior, Curve, NormalPrior, ScatterPrior};
