//! Takes a model; gives the mode, its Laplace approximation, draws and their convergence.

mod convergence;
mod draws;
mod effective;

pub use convergence::{Assessment, assess, quantile_of_sorted};
pub use draws::Draws;
