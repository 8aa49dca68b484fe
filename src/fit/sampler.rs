//! From Laplace's approximation to draws: warm-up, then rounds of kept draws until they are precise
//! enough or the limit is reached.

use super::chain::{Chain, Proposal, Target, advance};
use super::choice::{Candidate, Chosen, Coordinates, Correction, History, Way, choose, corrected, from_laplace};
use super::convergence::Assessment;
use super::laplace::Laplace;
use super::reference::Tails;
use super::stopping::{Goal, Verdict};
use super::watch::{Stage, Watch};
use crate::numeric::cholesky::Cholesky;
use crate::spec::Steps;
use std::time::{Duration, Instant};

/// How to sample.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Plan {
    /// Number of chains.
    pub chains: usize,
    /// Kind of steps.
    pub steps: Steps,
    /// Seed of the chains' streams.
    pub seed: u64,
    /// Warm-up iterations of each chain.
    pub warm_up: usize,
    /// Points evaluated together on one thread, at most.
    pub width: usize,
    /// Threads.
    pub threads: usize,
    /// When to stop.
    pub goal: Goal,
}

/// What sampling gave.
#[derive(Debug, Clone)]
pub struct Sampled {
    /// One vector for each parameter, chain after chain; the scatter as its absolute value.
    pub values: Vec<Vec<f64>>,
    /// Kept draws of each chain.
    pub per_chain: usize,
    /// One assessment for each parameter.
    pub assessments: Vec<Assessment>,
    /// Whether the goal was met.
    pub verdict: Verdict,
    /// Share of proposals accepted among the kept draws.
    pub accepted: f64,
    /// The reference, in words.
    pub reference: String,
}

/// Why there are no draws.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum SamplingFailed {
    /// The Laplace covariance is not positive definite.
    NoCovariance,
    /// The watcher asked to stop.
    Stopped,
}

/// Draws from a target whose Laplace approximation is known.
///
/// # Errors
/// [`SamplingFailed`] says why there are no draws.
pub fn sample(
    target: &impl Target,
    laplace: &Laplace,
    plan: &Plan,
    watch: &dyn Watch,
) -> Result<Sampled, SamplingFailed> {
    let start = Cholesky::factor(&laplace.covariance, target.dimension()).map_err(|_| SamplingFailed::NoCovariance)?;
    let mut chains: Vec<Chain> = (0..plan.chains)
        .map(|index| Chain::start(target, laplace, &start, plan.seed, index as u64))
        .collect();
    let chosen = warm_up(&mut chains, target, laplace, plan, watch)?;
    let proposal = chosen.proposal(plan).ok_or(SamplingFailed::NoCovariance)?;
    draw(&mut chains, target, &proposal, plan, watch, chosen.in_words(plan.steps))
}

/// Share of random-walk steps among mixed ones.
const WALK_SHARE: f64 = 0.05;
/// The same where rows are few to a parameter and warm-up is longer than the least. There the reference
/// may miss a tail of the posterior, and a chain that gets into it leaves by a random-walk step or waits
/// for hundreds. On 60 rows of 12 terms the worst of 20 seeds had 0.15 tail-effective draws a draw, and
/// with a share of 0.05 0.07.
const WALK_SHARE_OF_FEW_ROWS: f64 = 0.12;

/// Fewest and most iterations of warm-up with mixed steps.
const LEAST_WARM_UP: usize = 300;
const MOST_WARM_UP: usize = 6_000;
/// Iterations times squared parameters that each chain may take beyond the fewest iterations: some tens of
/// milliseconds with ten parameters, a second with hundreds. (Where it was less, a category of a hundred
/// levels with few rows each was warmed up for 300 iterations and drawn from 200,000 times in vain.)
const WARM_UP_SQUARES: usize = 200_000_000;

/// Iterations of warm-up. With few rows to a parameter the posterior is skewed, and it takes many draws
/// to know how, but they cost next to nothing. The walk needs many more, since it forgets its start
/// slowly.
pub fn warm_up_iterations(steps: Steps, rows: usize, dimension: usize) -> usize {
    match steps {
        Steps::Mixed => {
            let rows = rows.max(1);
            let asked = 150_000 * dimension * dimension / (rows * rows);
            let affordable = WARM_UP_SQUARES / (dimension * dimension).max(1);
            asked.min(affordable).clamp(LEAST_WARM_UP, MOST_WARM_UP)
        }
        Steps::Walk => 400 * (dimension + 4),
    }
}

/// Adapts the proposal at a quarter, a half and the end; each time from the draws since the last.
fn warm_up(
    chains: &mut [Chain],
    target: &impl Target,
    laplace: &Laplace,
    plan: &Plan,
    watch: &dyn Watch,
) -> Result<Chosen, SamplingFailed> {
    let scatter = target.scatter_place();
    let mut chosen = from_laplace(laplace, scatter).ok_or(SamplingFailed::NoCovariance)?;
    let mut done = 0;
    for until in [plan.warm_up / 4, plan.warm_up / 2, plan.warm_up] {
        let proposal = chosen.proposal(plan).ok_or(SamplingFailed::NoCovariance)?;
        move_watched(chains, target, &proposal, until - done, plan, watch, &|moved| {
            Stage::WarmUp {
                done: done + moved,
                of: plan.warm_up,
            }
        })?;
        done = until;
        let history = history(chains, target.dimension());
        let next = match plan.steps {
            Steps::Mixed => choose(laplace, &history, scatter),
            // Haario et al. 2001, frozen after warm-up.
            Steps::Walk => {
                let draws = history.possible(target.dimension());
                corrected(laplace, &draws, scatter, Correction::Moments(Way::Half)).map(|moments| Chosen {
                    covariance: moments.of_signed_steps(),
                    ..chosen.clone()
                })
            }
        };
        // A stage in which no chain moved gives no covariance: keep what there was.
        if let Some(next) = next.filter(|next| next.proposal(plan).is_some()) {
            chosen = next;
        }
        chains.iter_mut().for_each(Chain::forget);
    }
    Ok(chosen)
}

/// Most draws that a reference is chosen from: neighbours in a chain resemble each other, and with all
/// of them the choice would cost more than the draws did.
const MOST_IN_HISTORY: usize = 4_000;

/// The chains' points since they were last forgotten, iteration by iteration; evenly spaced
/// iterations where there are many.
fn history(chains: &[Chain], d: usize) -> History {
    let iterations = chains.first().map_or(0, |chain| chain.log_densities.len());
    let mut history = History {
        chains: chains.len(),
        ..History::default()
    };
    let step = (iterations * chains.len()).div_ceil(MOST_IN_HISTORY).max(1);
    for iteration in (0..iterations).step_by(step) {
        for chain in chains {
            history
                .points
                .extend_from_slice(&chain.points[iteration * d..(iteration + 1) * d]);
            history.log_densities.push(chain.log_densities[iteration]);
        }
    }
    history
}

/// Draws in rounds until the goal is met.
fn draw(
    chains: &mut [Chain],
    target: &impl Target,
    proposal: &Proposal,
    plan: &Plan,
    watch: &dyn Watch,
    reference: String,
) -> Result<Sampled, SamplingFailed> {
    let d = target.dimension();
    let most = plan.goal.most_per_chain(plan.chains);
    let mut per_chain = 0;
    let mut next = plan.goal.first_per_chain(plan.chains);
    loop {
        move_watched(chains, target, proposal, next - per_chain, plan, watch, &|moved| {
            Stage::Drawing {
                done: (per_chain + moved) * plan.chains,
                next: next * plan.chains,
                most: most * plan.chains,
            }
        })?;
        per_chain = next;
        let values = by_parameter(chains, d, target.scatter_place());
        let (assessments, verdict) = plan.goal.judge(&values, plan.chains, plan.threads);
        match verdict {
            Verdict::More { worth } if per_chain < most => {
                next = plan.goal.next_per_chain(per_chain, worth, plan.chains)
            }
            _ => {
                let accepted: usize = chains.iter().map(|chain| chain.accepted).sum();
                return Ok(Sampled {
                    values,
                    per_chain,
                    assessments,
                    verdict,
                    accepted: accepted as f64 / (per_chain * plan.chains) as f64,
                    reference,
                });
            }
        }
    }
}

/// The chains' points, parameter by parameter, the scatter without its sign.
fn by_parameter(chains: &[Chain], d: usize, scatter: Option<usize>) -> Vec<Vec<f64>> {
    (0..d)
        .map(|place| {
            let values = chains
                .iter()
                .flat_map(|chain| chain.points.chunks_exact(d).map(move |point| point[place]));
            if scatter == Some(place) {
                values.map(f64::abs).collect()
            } else {
                values.collect()
            }
        })
        .collect()
}

/// Iterations before the first look at the watcher. Later stretches are longer, until one takes
/// [`STRETCH`]: to start threads for each 50 iterations of a small study cost as much as to move its
/// chains. Where the looks are changes no draw.
const WATCHED: usize = 50;
/// How long the watcher may have to wait, about.
const STRETCH: Duration = Duration::from_millis(40);

fn move_watched(
    chains: &mut [Chain],
    target: &impl Target,
    proposal: &Proposal,
    iterations: usize,
    plan: &Plan,
    watch: &dyn Watch,
    stage: &dyn Fn(usize) -> Stage,
) -> Result<(), SamplingFailed> {
    let (mut moved, mut stretch) = (0, WATCHED);
    while moved < iterations {
        if watch.stop_asked() {
            return Err(SamplingFailed::Stopped);
        }
        watch.told(stage(moved));
        let now = stretch.min(iterations - moved);
        let start = Instant::now();
        advance(chains, target, proposal, now, plan.width, plan.threads);
        if start.elapsed() < STRETCH / 2 {
            stretch *= 2;
        }
        moved += now;
    }
    Ok(())
}

impl Chosen {
    /// The proposal of a kind of steps; `None` where the covariance cannot be factored.
    fn proposal(&self, plan: &Plan) -> Option<Proposal> {
        let d = self.covariance.len().isqrt();
        let walk = Cholesky::factor(&self.covariance, d).ok()?;
        let share = if plan.warm_up > LEAST_WARM_UP {
            WALK_SHARE_OF_FEW_ROWS
        } else {
            WALK_SHARE
        };
        Some(match plan.steps {
            Steps::Mixed => Proposal::mixed(self.reference.clone(), walk, share),
            Steps::Walk => Proposal::walk(walk),
        })
    }

    /// The reference in words, for the findings.
    fn in_words(&self, steps: Steps) -> String {
        if steps == Steps::Walk {
            return "none: plain random walk".to_owned();
        }
        let Candidate {
            correction,
            coordinates,
            tails,
            inflation,
        } = self.candidate;
        let correction = match correction {
            Correction::None => "Laplace's moments",
            Correction::Diagonal(Way::Half) => "Laplace's moments, scales moved half-way to the draws'",
            Correction::Diagonal(Way::Whole) => "Laplace's correlations with the draws' means and scales",
            Correction::Moments(Way::Half) => "moments half-way between Laplace's and the draws'",
            Correction::Moments(Way::Whole) => "the draws' moments",
        };
        let coordinates = match coordinates {
            Coordinates::Straight => "",
            Coordinates::Bent => ", bent to the draws",
        };
        let tails = match tails {
            Tails::Normal => "normal".to_owned(),
            Tails::T(degrees) => format!("t with {degrees} degrees of freedom"),
        };
        format!("{correction}{coordinates}; {tails}; scale times {inflation}")
    }
}
