//! Takes a design and priors; gives the log posterior: value, gradient, Hessian.

mod blocks;
mod count_table;
mod kernel;
mod patterns;
mod posterior;
mod prior;

pub use kernel::{Instructions, LOCKSTEP};
pub use posterior::{Derivatives, Model, PREDICTOR_LIMIT};
pub use prior::{BaselinePrior, Curve, NormalPrior, ScatterPrior};
