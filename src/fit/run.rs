//! A whole fit: mode, Laplace approximation, draws and their convergence.

use super::convergence::Assessment;
use super::draws::Draws;
use super::laplace::{Laplace, Mode, laplace};
use super::newton::ClimbFailed;
use super::sampler::{Plan, SamplingFailed, sample, warm_up_iterations};
use super::stopping::{Goal, Verdict};
use super::watch::{Stage, Watch};
use crate::model::Model;
use crate::spec::Spec;

/// All that a fit found.
#[derive(Debug, Clone)]
pub struct Fit {
    /// The mode of the posterior.
    pub mode: Mode,
    /// Its Laplace approximation.
    pub laplace: Laplace,
    /// The kept draws.
    pub draws: Draws,
    /// One assessment for each parameter.
    pub assessments: Vec<Assessment>,
    /// Warm-up iterations of each chain.
    pub warm_up: usize,
    /// Share of proposals accepted among the kept draws.
    pub accepted: f64,
    /// Whether the draws are as precise as the spec asks.
    pub verdict: Verdict,
    /// The reference of the independence steps, in words.
    pub reference: String,
}

/// How the machine is used; changes no bit of any result.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct Machine {
    /// Threads.
    pub threads: usize,
    /// Points evaluated together on one thread, at most.
    pub lockstep: usize,
}

impl Default for Machine {
    fn default() -> Self {
        let threads = std::thread::available_parallelism().map_or(1, usize::from);
        Machine { threads, lockstep: 8 }
    }
}

/// Why a fit failed.
#[derive(Debug, Clone, PartialEq)]
pub enum FitError {
    /// There is no mode: this parameter is not determined by data and prior together.
    NotDetermined {
        /// The parameter.
        parameter: String,
    },
    /// The log density is not finite where the search starts.
    NoStart,
    /// The mode was not reached within the limit of steps.
    StepLimit,
    /// The curvature at the mode could not be inverted.
    NoCovariance,
    /// No chain ever moved in this parameter: its draws are no result.
    NeverMoved {
        /// The parameter.
        parameter: String,
    },
    /// The watcher asked to stop.
    Stopped,
}

impl FitError {
    /// What to do next, in one sentence.
    pub fn help(&self) -> &'static str {
        match self {
            FitError::NotDetermined { .. } => "Give it a narrower plausible range, or leave it out.",
            FitError::NoStart => {
                "Look for values far from their centre (a step that is too small), or for an exposure in the wrong unit."
            }
            FitError::StepLimit => "Look for values far from their centre, or for extremely wide or narrow ranges.",
            FitError::NoCovariance => "Two covariates may say the same: `ratewright vet SPEC` names such terms.",
            FitError::NeverMoved { .. } => {
                "Give the sampler more room (`most_draws`), or look for extremely narrow ranges; nothing was written."
            }
            FitError::Stopped => "Start it again when there is time.",
        }
    }
}

impl std::fmt::Display for FitError {
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        match self {
            FitError::NotDetermined { parameter } => {
                write!(f, "data and priors together do not determine `{parameter}`")
            }
            FitError::NoStart => write!(f, "the model's density is zero at the crude rate"),
            FitError::StepLimit => write!(f, "the search for the most plausible values did not end"),
            FitError::NoCovariance => write!(
                f,
                "the model's curvature could not be inverted at the most plausible values"
            ),
            FitError::NeverMoved { parameter } => write!(f, "no chain ever moved in `{parameter}`"),
            FitError::Stopped => write!(f, "stopped before the end"),
        }
    }
}

impl std::error::Error for FitError {}

/// Fits a model.
///
/// # Errors
/// [`FitError`] says what stood in the way.
pub fn run(model: &Model, spec: &Spec, machine: Machine, watch: &dyn Watch) -> Result<Fit, FitError> {
    watch.told(Stage::Mode);
    let (mode, laplace) = laplace(model, machine.threads, watch).map_err(|failed| match failed {
        ClimbFailed::Stopped => FitError::Stopped,
        ClimbFailed::BadStart => FitError::NoStart,
        ClimbFailed::StepLimit => FitError::StepLimit,
        ClimbFailed::NotPositiveDefinite { coefficient } => FitError::NotDetermined {
            parameter: model.parameters()[coefficient].clone(),
        },
    })?;
    let warm_up = warm_up_iterations(spec.sampling.steps, model.rows(), model.dimension());
    let plan = Plan {
        chains: spec.sampling.chains,
        steps: spec.sampling.steps,
        seed: spec.study.seed,
        warm_up,
        width: machine.lockstep,
        threads: machine.threads,
        goal: Goal {
            precision: spec.sampling.precision,
            interval: spec.report.interval,
            most_draws: spec.sampling.most_draws,
        },
    };
    let sampled = sample(model, &laplace, &plan, watch).map_err(|failed| match failed {
        SamplingFailed::NoCovariance => FitError::NoCovariance,
        SamplingFailed::Stopped => FitError::Stopped,
    })?;
    if let Some(place) = sampled.assessments.iter().position(|a| a.sd <= 0.0) {
        return Err(FitError::NeverMoved {
            parameter: model.parameters()[place].clone(),
        });
    }
    Ok(Fit {
        mode,
        laplace,
        draws: Draws {
            parameters: model.parameters().to_vec(),
            chains: plan.chains,
            per_chain: sampled.per_chain,
            values: sampled.values,
        },
        assessments: sampled.assessments,
        warm_up,
        accepted: sampled.accepted,
        verdict: sampled.verdict,
        reference: sampled.reference,
    })
}
