//! Takes a model; gives the mode, its Laplace approximation, draws and their convergence.

mod bend;
mod chain;
mod choice;
mod convergence;
mod draws;
mod effective;
mod frame;
mod laplace;
mod newton;
mod nodes;
mod profile;
mod reference;
mod run;
mod sampler;
mod stopping;
mod watch;

pub use chain::Target;
pub use convergence::{Assessment, assess, quantile_of_sorted};
pub use draws::Draws;
pub use laplace::{Laplace, Mode, ScatterMode, laplace};
pub use newton::ClimbFailed;
pub use run::{Fit, FitError, Machine, run};
pub use sampler::{Plan, Sampled, SamplingFailed, sample, warm_up_iterations};
pub use stopping::{FEWEST_EFFECTIVE, Goal, INTERVAL_END, LARGEST_R_HAT, Verdict};
pub use watch::{Stage, Unwatched, Watch};

#[cfg(test)]
mod law_tests;
