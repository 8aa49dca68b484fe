//! How well the sampler draws: effective draws per draw, and per second of one core against the plain random walk in
//! the same run.
//!
//! The walk is told twice: moved as the program moves it, several chains over each block of rows, and as it is plainly
//! written, one chain after another. The second ratio holds what lockstep gains.
//!
//! `cargo bench --bench sampler -- [--seeds 3] [--problems SDZML]`
//!
//! Every figure is that of the worst parameter of a fit; told are the worst and the median over the seeds. The time
//! is that of moving the chains: a fit judges its draws now and then, which costs both kinds of steps alike.
//!
//! The walk is slow where there are many rows, so problems of more than [`MANY_ROWS`] walk on the first seed only. On
//! L the walk is only timed, over its first iterations; M's effective draws per draw stand for L's own, since
//! both have as many parameters and posteriors that are as near to normal, which is all that a scaled walk feels.

#[allow(dead_code, reason = "each bench uses its part")]
mod support;

use ratewright::fit::{self, Assessment, FitError, Machine, Stage, Watch};
use std::collections::BTreeMap;
use std::io::Write;
use std::sync::{Mutex, PoisonError};
use support::clock::Clock;
use support::pairs::Spread;
use support::problems::{D, Family, L, M, Problem, S, Sampling, Z, study};
use support::{Failure, arguments, number_after};

/// Above this the walk is measured on one seed only.
const MANY_ROWS: usize = 5_000;
/// Row-iterations over which a walk is timed where only its time is asked for.
const TIMED: usize = 20_000_000;

/// A problem and the kept draws of its fits.
const PLANS: [(Problem, usize); 5] = [(S, 60_000), (D, 60_000), (Z, 40_000), (M, 20_000), (L, 4_000)];

fn main() -> Result<(), Failure> {
    let arguments = arguments();
    let seeds = number_after(&arguments, "--seeds", 3)?.max(1);
    let asked = arguments
        .iter()
        .position(|argument| argument == "--problems")
        .and_then(|at| arguments.get(at + 1));
    let mut out = std::io::stdout().lock();
    writeln!(
        out,
        "Effective draws of the worst parameter, {seeds} seeds: worst / median\n\n\
         | problem | family | bulk per draw | tail per draw | accepted | per second of a core | the walk's | ratio \
         | against one chain after another |\n\
         | --- | --- | --- | --- | --- | --- | --- | --- | --- |"
    )?;
    let mut walks = BTreeMap::new();
    for (problem, draws) in PLANS {
        if asked.is_some_and(|asked| !asked.contains(problem.name)) {
            continue;
        }
        for family in Family::BOTH {
            let mut fits = Vec::new();
            for seed in 1..=seeds {
                fits.push(measure(&problem, family, seed, Sampling::of_draws(draws))?);
            }
            let mut walking = Vec::new();
            for seed in 1..=if problem.rows > MANY_ROWS { 1 } else { seeds } {
                walking.push(walk(&problem, family, seed, draws, &walks)?);
            }
            walks.insert((problem.name, family.name()), walking[0].bulk);
            let ratios = || {
                walking
                    .iter()
                    .zip(&fits)
                    .map(|(walk, fit)| fit.per_second() / walk.per_second())
            };
            let plain = seconds_of_walk(&problem, family, draws, 1)? / seconds_of_walk(&problem, family, draws, 8)?;
            writeln!(
                out,
                "| {} | {} | {} | {} | {} | {:.0} | {:.1} | {} | {} |",
                problem.name,
                family.name(),
                worst_and_median(fits.iter().map(|fit| fit.bulk), 3),
                worst_and_median(fits.iter().map(|fit| fit.tail), 3),
                worst_and_median(fits.iter().map(|fit| fit.accepted), 2),
                Spread::of(fits.iter().map(Measured::per_second)).median,
                Spread::of(walking.iter().map(Measured::per_second)).median,
                worst_and_median(ratios(), 0),
                worst_and_median(ratios().map(|ratio| ratio * plain), 0),
            )?;
        }
    }
    Ok(())
}

/// What one fit showed.
struct Measured {
    /// Fewest bulk effective draws of a parameter, per kept draw.
    bulk: f64,
    /// Fewest tail effective draws of a parameter, per kept draw.
    tail: f64,
    /// Share of proposals accepted.
    accepted: f64,
    /// Seconds that a draw takes.
    seconds_per_draw: f64,
}

impl Measured {
    /// Bulk effective draws a second.
    fn per_second(&self) -> f64 {
        self.bulk / self.seconds_per_draw
    }
}

fn worst_and_median(values: impl Iterator<Item = f64>, digits: usize) -> String {
    let values: Vec<f64> = values.collect();
    let worst = values.iter().copied().fold(f64::INFINITY, f64::min);
    format!("{worst:.digits$} / {:.digits$}", Spread::of(values).median)
}

/// One core: its chains are then moved by the thread that is watched.
const ONE_CORE: Machine = Machine {
    threads: 1,
    lockstep: 8,
};

fn measure(problem: &Problem, family: Family, seed: u64, sampling: Sampling) -> Result<Measured, Failure> {
    let study = study(problem, family, seed, sampling)?;
    let watch = Stopwatch::new(None);
    let fit = fit::run(&study.model, &study.spec, ONE_CORE, &watch)?;
    let draws = fit.draws.in_all() as f64;
    let fewest =
        |figure: fn(&Assessment) -> f64| fit.assessments.iter().map(figure).fold(f64::INFINITY, f64::min) / draws;
    Ok(Measured {
        bulk: fewest(|a| a.effective_draws),
        tail: fewest(|a| a.effective_tail_draws),
        accepted: fit.accepted,
        seconds_per_draw: watch.seconds_per_draw(sampling.chains),
    })
}

/// The plain random walk on a problem; on L by its time and M's effective draws.
fn walk(
    problem: &Problem,
    family: Family,
    seed: u64,
    draws: usize,
    walks: &BTreeMap<(&str, &str), f64>,
) -> Result<Measured, Failure> {
    let walking = Sampling {
        steps: "walk",
        ..Sampling::of_draws(draws)
    };
    if problem.name != L.name {
        return measure(problem, family, seed, walking);
    }
    let bulk = match walks.get(&(M.name, family.name())) {
        Some(known) => *known,
        None => {
            measure(
                &M,
                family,
                seed,
                Sampling {
                    most_draws: 20_000,
                    ..walking
                },
            )?
            .bulk
        }
    };
    Ok(Measured {
        bulk,
        tail: f64::NAN,
        accepted: f64::NAN,
        seconds_per_draw: seconds_of_walk(problem, family, draws, ONE_CORE.lockstep)?,
    })
}

/// Seconds of one draw of one chain of the walk, `lockstep` chains moved together, over its first iterations.
fn seconds_of_walk(problem: &Problem, family: Family, draws: usize, lockstep: usize) -> Result<f64, Failure> {
    let walking = Sampling {
        steps: "walk",
        ..Sampling::of_draws(draws)
    };
    let study = study(problem, family, 1, walking)?;
    let watch = Stopwatch::new(Some((TIMED / problem.rows).clamp(200, 4_000)));
    match fit::run(&study.model, &study.spec, Machine { lockstep, ..ONE_CORE }, &watch) {
        Err(FitError::Stopped) | Ok(_) => Ok(watch.seconds_per_draw(walking.chains)),
        Err(failed) => Err(failed.into()),
    }
}

/// Adds up the time in which chains move, from what a fit tells of its stages.
struct Stopwatch {
    /// Iterations of warm-up after which the fit is asked to stop.
    stop_after: Option<usize>,
    seen: Mutex<Seen>,
}

#[derive(Default)]
struct Seen {
    /// What was told last, and when.
    last: Option<(Stage, f64)>,
    seconds: f64,
    /// Draws, or iterations of warm-up where the fit is stopped there, in that time.
    moved: usize,
    warmed_up: usize,
}

impl Stopwatch {
    fn new(stop_after: Option<usize>) -> Stopwatch {
        Stopwatch {
            stop_after,
            seen: Mutex::default(),
        }
    }

    /// Seconds of one draw of one chain.
    fn seconds_per_draw(&self, chains: usize) -> f64 {
        let seen = self.seen.lock().unwrap_or_else(PoisonError::into_inner);
        let draws = if self.stop_after.is_some() {
            seen.moved * chains
        } else {
            seen.moved
        };
        seen.seconds / draws as f64
    }
}

impl Watch for Stopwatch {
    fn told(&self, stage: Stage) {
        let now = Clock::Thread.seconds();
        let mut seen = self.seen.lock().unwrap_or_else(PoisonError::into_inner);
        let moved = match (seen.last, stage) {
            // Nothing but moves lies between two of these: the draws are judged where `next` changes.
            (
                Some((Stage::Drawing { done, next, .. }, _)),
                Stage::Drawing {
                    done: since,
                    next: then,
                    ..
                },
            ) if next == then => since - done,
            (Some((Stage::WarmUp { done, .. }, _)), Stage::WarmUp { done: since, .. }) if self.stop_after.is_some() => {
                since - done
            }
            _ => 0,
        };
        if let (true, Some((_, before))) = (moved > 0, seen.last) {
            seen.seconds += now - before;
            seen.moved += moved;
        }
        if let Stage::WarmUp { done, .. } = stage {
            seen.warmed_up = done;
        }
        seen.last = Some((stage, now));
    }

    fn stop_asked(&self) -> bool {
        let seen = self.seen.lock().unwrap_or_else(PoisonError::into_inner);
        self.stop_after.is_some_and(|limit| seen.warmed_up >= limit)
    }
}
