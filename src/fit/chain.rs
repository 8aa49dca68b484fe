//! One Markov chain, and several that are moved together.
//!
//! Chains move in lockstep: each proposes from its own stream, the model is evaluated for all at
//! once, each accepts or not. A chain's bits depend on its own stream and on the fixed proposal
//! only, never on its company or on threads.

use super::laplace::Laplace;
use super::reference::{Reference, t_scale};
use crate::model::Model;
use crate::numeric::cholesky::Cholesky;
use crate::numeric::{Purpose, Stream, ln};

/// A log density to draw from: the model, or a known law in a test.
pub trait Target: Sync {
    /// Number of parameters.
    fn dimension(&self) -> usize;

    /// Place of the scatter, which is walked with its sign on an even density.
    fn scatter_place(&self) -> Option<usize>;

    /// Log density at each of `out.len()` points; minus infinity where it is 0, never NaN. The
    /// result at a point must not depend on its company.
    fn log_densities(&self, points: &[f64], out: &mut [f64]);
}

impl Target for Model {
    fn dimension(&self) -> usize {
        Model::dimension(self)
    }

    fn scatter_place(&self) -> Option<usize> {
        Model::scatter_place(self)
    }

    fn log_densities(&self, points: &[f64], out: &mut [f64]) {
        Model::log_densities(self, points, out);
    }
}

/// Share of random-walk steps among the mixed steps.
const WALK_SHARE: f64 = 0.05;
/// Scale of the random walk: 2.38/sqrt(d) times the posterior's (Roberts, Gelman & Gilks 1997).
const WALK_SCALE: f64 = 2.38;
/// Chains start from a t with these degrees of freedom at this multiple of Laplace's scale.
const START_DEGREES: f64 = 4.0;
const START_SCALE: f64 = 3.0;

/// How the next point is proposed. Fixed while draws are kept.
#[derive(Debug, Clone)]
pub struct Proposal {
    /// Factor of the random walk's covariance.
    walk: Cholesky,
    /// Where independence steps are drawn from; absent when all steps are random-walk steps.
    reference: Option<Reference>,
}

impl Proposal {
    /// A random walk with this factor of the posterior's covariance, mixed with independence steps
    /// where a reference is given.
    pub fn new(walk: Cholesky, reference: Option<Reference>) -> Self {
        Proposal { walk, reference }
    }
}

/// One chain.
#[derive(Debug, Clone)]
pub struct Chain {
    stream: Stream,
    /// Where it is, in signed coordinates.
    point: Vec<f64>,
    log_density: f64,
    /// log q here; only meaningful where the proposal has a reference.
    log_reference: f64,
    /// Proposals accepted since the last [`Chain::forget`].
    pub accepted: usize,
    /// Points since then, row-major, in signed coordinates.
    pub points: Vec<f64>,
    /// Log density of each.
    pub log_densities: Vec<f64>,
}

impl Chain {
    /// A chain far out: its start is drawn from a heavy-tailed law three times as wide as Laplace's,
    /// so that chains that agree later do so in spite of their starts.
    pub fn start(target: &impl Target, laplace: &Laplace, factor: &Cholesky, seed: u64, index: u64) -> Self {
        let d = target.dimension();
        let mut stream = Stream::new(seed, Purpose::Chain, index);
        let scale = START_SCALE * t_scale(START_DEGREES, &mut stream);
        let z: Vec<f64> = (0..d).map(|_| scale * stream.normal()).collect();
        let mut point = vec![0.0; d];
        factor.times(&z, &mut point);
        for (value, mean) in point.iter_mut().zip(&laplace.mean) {
            *value += mean;
        }
        let mut log_density = [0.0];
        target.log_densities(&point, &mut log_density);
        Chain {
            stream,
            point,
            log_density: log_density[0],
            log_reference: 0.0,
            accepted: 0,
            points: Vec::new(),
            log_densities: Vec::new(),
        }
    }

    /// Drops the recorded points.
    pub fn forget(&mut self) {
        self.accepted = 0;
        self.points.clear();
        self.log_densities.clear();
    }

    /// Proposes the next point; returns which kind of step it was.
    fn propose(&mut self, proposal: &Proposal, out: &mut [f64]) -> StepKind {
        if let Some(reference) = &proposal.reference
            && self.stream.uniform() >= WALK_SHARE
        {
            reference.draw(&mut self.stream, out);
            return StepKind::Independence;
        }
        let d = out.len();
        let scale = WALK_SCALE / (d as f64).sqrt();
        let z: Vec<f64> = (0..d).map(|_| scale * self.stream.normal()).collect();
        proposal.walk.times(&z, out);
        for (value, here) in out.iter_mut().zip(&self.point) {
            *value += here;
        }
        StepKind::Walk
    }

    /// Accepts the proposal or stays (Metropolis et al. 1953; Hastings 1970; Tierney 1994), and
    /// records where the chain is. An independence step is judged by the ratio of posterior/q, a
    /// random-walk step by that of the posterior alone.
    fn decide(&mut self, kind: StepKind, proposed: &[f64], log_density: f64, log_reference: f64) {
        // Drawn whether it is needed or not: the stream then advances equally on every path.
        let threshold = ln(self.stream.uniform());
        let mut log_ratio = log_density - self.log_density;
        if kind == StepKind::Independence {
            log_ratio += self.log_reference - log_reference;
        }
        // A start of density 0 makes the ratio infinite and the first possible point is taken; a
        // proposal of density 0 is never taken, also where both are 0 and the ratio is NaN.
        if log_density > f64::NEG_INFINITY && log_ratio >= threshold {
            self.point.copy_from_slice(proposed);
            self.log_density = log_density;
            self.log_reference = log_reference;
            self.accepted += 1;
        }
        self.points.extend_from_slice(&self.point);
        self.log_densities.push(self.log_density);
    }
}

/// Which step was proposed.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
enum StepKind {
    Independence,
    Walk,
}

/// Moves all chains by `iterations`, at most `width` of them in lockstep on one thread, on `threads`
/// threads. Neither number changes a bit of any chain.
pub fn advance(
    chains: &mut [Chain],
    target: &impl Target,
    proposal: &Proposal,
    iterations: usize,
    width: usize,
    threads: usize,
) {
    let share = chains.len().div_ceil(threads.max(1)).max(1);
    if share >= chains.len() {
        for group in chains.chunks_mut(width.max(1)) {
            advance_group(group, target, proposal, iterations);
        }
        return;
    }
    std::thread::scope(|scope| {
        for part in chains.chunks_mut(share) {
            scope.spawn(move || {
                for group in part.chunks_mut(width.max(1)) {
                    advance_group(group, target, proposal, iterations);
                }
            });
        }
    });
}

fn advance_group(group: &mut [Chain], target: &impl Target, proposal: &Proposal, iterations: usize) {
    let d = target.dimension();
    let mut proposed = vec![0.0; group.len() * d];
    let mut log_densities = vec![0.0; group.len()];
    let mut kinds = vec![StepKind::Walk; group.len()];
    // The reference may have changed since the chains were last moved.
    if let Some(reference) = &proposal.reference {
        for chain in group.iter_mut() {
            chain.log_reference = reference.log_density(&chain.point);
        }
    }
    for _ in 0..iterations {
        for ((chain, out), kind) in group.iter_mut().zip(proposed.chunks_exact_mut(d)).zip(&mut kinds) {
            *kind = chain.propose(proposal, out);
        }
        target.log_densities(&proposed, &mut log_densities);
        for (k, chain) in group.iter_mut().enumerate() {
            let point = &proposed[k * d..(k + 1) * d];
            let log_reference = proposal
                .reference
                .as_ref()
                .map_or(0.0, |reference| reference.log_density(point));
            chain.decide(kinds[k], point, log_densities[k], log_reference);
        }
    }
}
