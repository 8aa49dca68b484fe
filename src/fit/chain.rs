//! One Markov chain, and several that are moved together.
//!
//! What a chain draws from its stream does not depend on where it is: neither the kind of a step, nor
//! a point drawn from the reference, nor the displacement of a random-walk step. So steps are drawn
//! ahead, and those whose points are known (all up to the next random-walk step) are evaluated
//! together, for all chains of a thread at once: the model reads its rows once for many points. The
//! steps are then decided in their order. A chain's bits depend on its own stream and on the fixed
//! proposal only, never on its company, on how far ahead it is evaluated, or on threads.

use super::laplace::Laplace;
use super::reference::{Reference, t_scale};
use crate::model::Model;
use crate::numeric::cholesky::Cholesky;
use crate::numeric::{Purpose, Stream, ln};
use std::collections::VecDeque;
use std::time::{Duration, Instant};

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
    /// Share of random-walk steps where there is a reference.
    walk_share: f64,
}

impl Proposal {
    /// A random walk with this factor of the posterior's covariance.
    pub fn walk(walk: Cholesky) -> Self {
        Proposal {
            walk,
            reference: None,
            walk_share: 1.0,
        }
    }

    /// Independence steps from a reference, and among them this share of random-walk steps.
    pub fn mixed(reference: Reference, walk: Cholesky, walk_share: f64) -> Self {
        Proposal {
            walk,
            reference: Some(reference),
            walk_share,
        }
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
    /// Steps drawn and not yet decided.
    drawn: VecDeque<Step>,
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
            drawn: VecDeque::new(),
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

    /// Draws the next step.
    fn draw(&mut self, proposal: &Proposal) {
        let d = self.point.len();
        let mut values = vec![0.0; d];
        let kind = match &proposal.reference {
            Some(reference) if self.stream.uniform() >= proposal.walk_share => {
                reference.draw(&mut self.stream, &mut values);
                StepKind::Independence
            }
            _ => {
                let scale = WALK_SCALE / (d as f64).sqrt();
                let z: Vec<f64> = (0..d).map(|_| scale * self.stream.normal()).collect();
                proposal.walk.times(&z, &mut values);
                StepKind::Walk
            }
        };
        // Drawn whether it is needed or not: the stream then advances equally on every path.
        let threshold = ln(self.stream.uniform());
        self.drawn.push_back(Step {
            kind,
            values,
            threshold,
        });
    }

    /// Draws steps and hands out the points of those that can be evaluated now, at most `most` and at
    /// most `left`; returns how many. Only the first may be a random-walk step: where a later one
    /// starts from is not known yet.
    fn look_ahead(&mut self, proposal: &Proposal, most: usize, left: usize, points: &mut Vec<f64>) -> usize {
        let most = most.min(left);
        let mut known = 0;
        while known < most {
            if self.drawn.len() == known {
                self.draw(proposal);
            }
            let step = &self.drawn[known];
            match step.kind {
                StepKind::Independence => points.extend_from_slice(&step.values),
                StepKind::Walk if known == 0 => {
                    points.extend(self.point.iter().zip(&step.values).map(|(here, off)| here + off));
                    return 1;
                }
                StepKind::Walk => return known,
            }
            known += 1;
        }
        known
    }

    /// Takes the oldest step that was drawn and accepts its point or stays (Metropolis et al. 1953;
    /// Hastings 1970; Tierney 1994), and records where the chain is. An independence step is judged by
    /// the ratio of posterior/q, a random-walk step by that of the posterior alone.
    fn decide(&mut self, proposed: &[f64], log_density: f64, log_reference: f64) {
        let Some(step) = self.drawn.pop_front() else {
            return;
        };
        let mut log_ratio = log_density - self.log_density;
        if step.kind == StepKind::Independence {
            log_ratio += self.log_reference - log_reference;
        }
        // A start of density 0 makes the ratio infinite and the first possible point is taken; a
        // proposal of density 0 is never taken, also where both are 0 and the ratio is NaN.
        if log_density > f64::NEG_INFINITY && log_ratio >= step.threshold {
            self.point.copy_from_slice(proposed);
            self.log_density = log_density;
            self.log_reference = log_reference;
            self.accepted += 1;
        }
        self.points.extend_from_slice(&self.point);
        self.log_densities.push(self.log_density);
    }
}

/// A step as drawn.
#[derive(Debug, Clone)]
struct Step {
    kind: StepKind,
    /// The point of an independence step, the displacement of a random-walk step.
    values: Vec<f64>,
    /// Log of a uniform: the step is taken where the log ratio is at least this.
    threshold: f64,
}

/// Which step was drawn.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
enum StepKind {
    Independence,
    Walk,
}

/// Moves all chains by `iterations`, at most `width` points evaluated together on each of `threads`
/// threads. Neither number changes a bit of any chain.
pub fn advance(
    chains: &mut [Chain],
    target: &impl Target,
    proposal: &Proposal,
    iterations: usize,
    width: usize,
    threads: usize,
) {
    let threads = threads.max(1);
    let share = chains.len().div_ceil(threads).max(1);
    let groups = chains.len().div_ceil(share).max(1);
    let evaluation = Evaluation {
        width: width.max(1),
        // Threads beyond the number of chains help with the points of one.
        threads: (threads / groups).max(1),
    };
    let advance_part = |part: &mut [Chain]| {
        for group in part.chunks_mut(evaluation.width) {
            advance_group(group, target, proposal, iterations, evaluation);
        }
    };
    std::thread::scope(|scope| {
        let mut parts = chains.chunks_mut(share);
        let own = parts.next();
        for part in parts {
            scope.spawn(move || advance_part(part));
        }
        if let Some(own) = own {
            advance_part(own);
        }
    });
}

/// How one group of chains has its points evaluated.
#[derive(Debug, Clone, Copy)]
struct Evaluation {
    /// Points together on one thread.
    width: usize,
    /// Threads that share the points.
    threads: usize,
}

/// Points are shared among threads where their evaluation takes at least this long; to start a thread
/// takes a tenth of it.
const WORTH_A_THREAD: Duration = Duration::from_micros(300);

fn advance_group(
    group: &mut [Chain],
    target: &impl Target,
    proposal: &Proposal,
    iterations: usize,
    evaluation: Evaluation,
) {
    let d = target.dimension();
    // The reference may have changed since the chains were last moved.
    if let Some(reference) = &proposal.reference {
        for chain in group.iter_mut() {
            chain.log_reference = reference.log_density(&chain.point);
        }
    }
    let mut left = vec![iterations; group.len()];
    let mut known = vec![0; group.len()];
    let (mut points, mut log_densities) = (Vec::new(), Vec::new());
    let mut threads = 1;
    loop {
        let active = left.iter().filter(|left| **left > 0).count();
        if active == 0 {
            return;
        }
        points.clear();
        // What a chain before a random-walk step leaves of its share goes to the chains after it.
        let (mut room, mut chains) = (evaluation.width * threads, active);
        for (chain, (known, left)) in group.iter_mut().zip(known.iter_mut().zip(&left)) {
            *known = 0;
            if *left > 0 {
                *known = chain.look_ahead(proposal, room.div_ceil(chains), *left, &mut points);
                room -= *known;
                chains -= 1;
            }
        }
        log_densities.clear();
        log_densities.resize(points.len() / d, 0.0);
        let start = Instant::now();
        evaluate(target, &points, &mut log_densities, threads);
        threads = if start.elapsed() * threads as u32 >= WORTH_A_THREAD {
            evaluation.threads
        } else {
            1
        };
        let mut evaluated = points.chunks_exact(d).zip(&log_densities);
        for (chain, (known, left)) in group.iter_mut().zip(known.iter().zip(&mut left)) {
            *left -= known;
            for (point, log_density) in evaluated.by_ref().take(*known) {
                let reference = proposal.reference.as_ref();
                let log_reference = reference.map_or(0.0, |reference| reference.log_density(point));
                chain.decide(point, *log_density, log_reference);
            }
        }
    }
}

/// The log densities of all points, the points shared among threads.
fn evaluate(target: &impl Target, points: &[f64], out: &mut [f64], threads: usize) {
    let share = out.len().div_ceil(threads);
    if share == out.len() {
        target.log_densities(points, out);
        return;
    }
    let d = target.dimension();
    std::thread::scope(|scope| {
        for (points, out) in points.chunks(share * d).zip(out.chunks_mut(share)) {
            scope.spawn(move || target.log_densities(points, out));
        }
    });
}
