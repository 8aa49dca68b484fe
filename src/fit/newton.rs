//! Damped Newton steps up a log density in its coefficients, the scatter held fixed.
//!
//! Both families are log-concave in the coefficients and so are the priors (the negative
//! binomial's second derivative by the predictor is -mu (1 + a y)/(1 + a mu)^2 < 0), so there is
//! one mode and the exact Hessian leads to it; damping keeps a far start from overshooting
//! (Nocedal & Wright 2006, sections 3.1 and 3.4). The loop, its limit and its stop reasons are
//! argmin's.

use crate::model::{Derivatives, Model};
use crate::numeric::cholesky::Cholesky;
use argmin::core::{
    Error, Executor, IterState, KV, Operator, Problem, Solver, State, TerminationReason, TerminationStatus,
};

/// Far more steps than a concave problem needs; a limit all the same, since every loop has one.
const MOST_STEPS: u64 = 200;

/// A log density to climb, and how many threads evaluate it.
#[derive(Clone, Copy)]
pub struct Surface<'a> {
    /// The model.
    pub model: &'a Model,
    /// Threads; they change no bit.
    pub threads: usize,
}

/// When a search may end: the squared length of the Newton step, in the metric of the Hessian (so in
/// posterior standard deviations), at which that step is taken unseen and is the last. Convergence is
/// quadratic: a last step of 1e-6 standard deviations leaves an error of 1e-12 or so.
pub const EXACT: f64 = 1e-12;
/// For the nodes of a quadrature: their heights are then off by less than 1e-14.
pub const NODE: f64 = 1e-10;
/// For a look at where the density rises and falls.
pub const ROUGH: f64 = 1e-3;

/// Where the search ended.
#[derive(Debug, Clone)]
pub struct Climb {
    /// Baseline and coefficients, without the scatter, after the last step.
    pub coefficients: Vec<f64>,
    /// Derivatives before the last step, in all parameters.
    pub derivatives: Derivatives,
    /// Factor of the negative Hessian in the coefficients, before the last step.
    pub factor: Cholesky,
    /// The last step.
    pub last_step: Vec<f64>,
    /// Its gradient times itself: half of it is how much the last step rises.
    pub rise: f64,
    /// Steps taken.
    pub steps: u64,
}

/// Why there is no mode to report.
#[derive(Debug, Clone, PartialEq)]
pub enum ClimbFailed {
    /// The density is 0 at the start.
    BadStart,
    /// The negative Hessian is not positive definite: this coefficient's pivot failed.
    NotPositiveDefinite {
        /// Place of the coefficient, 0 the baseline.
        coefficient: usize,
    },
    /// The limit of steps was reached, or no step rises.
    StepLimit,
    /// The watcher asked to stop.
    Stopped,
}

/// Climbs to the mode of the coefficients with the scatter held at `scatter` (absent under the
/// Poisson), from `start`, until a step is as short as `settled` says ([`EXACT`] or another).
///
/// # Errors
/// [`ClimbFailed`] says why no mode was found.
pub fn climb(surface: Surface, scatter: Option<f64>, start: &[f64], settled: f64) -> Result<Climb, ClimbFailed> {
    let outcome = Executor::new(Slice { surface, scatter }, Newton::until(settled))
        .configure(|state: Steps| state.param(start.to_vec()).max_iters(MOST_STEPS))
        .timer(false)
        .run();
    // The operator never fails and the solver reports through its own fields.
    let Ok(outcome) = outcome else {
        return Err(ClimbFailed::BadStart);
    };
    let steps = outcome.state().get_iter();
    let newton = outcome.solver;
    match (newton.failure, newton.arrived) {
        (Some(failure), _) => Err(failure),
        (None, Some(climb)) => Ok(Climb { steps, ..climb }),
        (None, None) => Err(ClimbFailed::StepLimit),
    }
}

/// Factor of the negative Hessian in the first `size` parameters.
fn negative_hessian(derivatives: &Derivatives, size: usize) -> Result<Cholesky, ClimbFailed> {
    let d = derivatives.gradient.len();
    let mut matrix = vec![0.0; size * size];
    for i in 0..size {
        for j in 0..=i {
            matrix[i * size + j] = -derivatives.hessian[i * d + j];
        }
    }
    Cholesky::factor(&matrix, size).map_err(|fault| ClimbFailed::NotPositiveDefinite { coefficient: fault.row })
}

/// The log density on the slice of one scatter.
struct Slice<'a> {
    surface: Surface<'a>,
    scatter: Option<f64>,
}

impl Operator for Slice<'_> {
    type Param = Vec<f64>;
    type Output = Option<Derivatives>;

    fn apply(&self, coefficients: &Vec<f64>) -> Result<Option<Derivatives>, Error> {
        let mut point = coefficients.clone();
        point.extend(self.scatter);
        Ok(self.surface.model.derivatives(&point, self.surface.threads))
    }
}

type Steps = IterState<Vec<f64>, (), (), (), (), f64>;

/// The solver: argmin calls it, step by step.
struct Newton {
    settled: f64,
    here: Option<(Vec<f64>, Derivatives)>,
    arrived: Option<Climb>,
    failure: Option<ClimbFailed>,
}

impl Newton {
    fn until(settled: f64) -> Self {
        Newton {
            settled,
            here: None,
            arrived: None,
            failure: None,
        }
    }
}

impl<'a> Solver<Slice<'a>, Steps> for Newton {
    fn name(&self) -> &str {
        "damped Newton"
    }

    fn init(&mut self, problem: &mut Problem<Slice<'a>>, mut state: Steps) -> Result<(Steps, Option<KV>), Error> {
        let start = state.take_param().unwrap_or_default();
        match problem.apply(&start)? {
            Some(derivatives) => {
                state = state.param(start.clone()).cost(-derivatives.value);
                self.here = Some((start, derivatives));
            }
            None => {
                state = state.param(start);
                self.failure = Some(ClimbFailed::BadStart);
            }
        }
        Ok((state, None))
    }

    fn next_iter(&mut self, problem: &mut Problem<Slice<'a>>, state: Steps) -> Result<(Steps, Option<KV>), Error> {
        let Some((place, here)) = self.here.take() else {
            return Ok((state, None));
        };
        let size = place.len();
        let factor = match negative_hessian(&here, size) {
            Ok(factor) => factor,
            Err(failure) => {
                self.failure = Some(failure);
                return Ok((state, None));
            }
        };
        let mut step = here.gradient[..size].to_vec();
        factor.solve(&mut step);
        let rise: f64 = step.iter().zip(&here.gradient).map(|(s, g)| s * g).sum();
        let ahead = |share: f64| -> Vec<f64> { place.iter().zip(&step).map(|(x, s)| x + share * s).collect() };
        if rise <= self.settled {
            let coefficients = ahead(1.0);
            let state = state.param(coefficients.clone()).cost(-here.value - 0.5 * rise);
            self.arrived = Some(Climb {
                coefficients,
                derivatives: here,
                factor,
                last_step: step,
                rise,
                steps: 0,
            });
            return Ok((state, None));
        }
        let mut share = 1.0;
        let (place, there) = loop {
            let trial = ahead(share);
            match problem.apply(&trial)? {
                // Near the mode the rise is below what rounding lets the value show: judged by the
                // bare value, one simulated study halved its steps 200 times over and never arrived.
                Some(there) if there.value + here.rounding >= here.value + 1e-4 * share * rise => {
                    break (trial, there);
                }
                _ if share < 1e-9 => {
                    // No rise along a rising direction: the derivatives are no longer those of the value.
                    self.failure = Some(ClimbFailed::StepLimit);
                    return Ok((state, None));
                }
                _ => share *= 0.5,
            }
        };
        let state = state.param(place.clone()).cost(-there.value);
        self.here = Some((place, there));
        Ok((state, None))
    }

    fn terminate(&mut self, _state: &Steps) -> TerminationStatus {
        if self.arrived.is_some() {
            TerminationStatus::Terminated(TerminationReason::SolverConverged)
        } else if self.failure.is_some() {
            TerminationStatus::Terminated(TerminationReason::SolverExit("no mode".to_owned()))
        } else {
            TerminationStatus::NotTerminated
        }
    }
}
