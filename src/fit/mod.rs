//! Takes a model; gives the mode, its Laplace approximation, draws and their convergence.

mod draws;

pub use draws::Draws;
