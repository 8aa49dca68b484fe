//! Measures how often the 95 % intervals of the demo's spec hold the truth: simulates the pools from
//! many seeds, fits each, and counts. Prints the table of `docs/calibration.md`.
//!
//! `cargo run --release --example measure_coverage [SEEDS]`

mod pools;

use ratewright::fit::{self, Machine, Unwatched};
use ratewright::model::Model;
use ratewright::spec::Spec;
use ratewright::{design, spec, table};
use std::error::Error;
use std::io::Write;
use std::sync::atomic::{AtomicU64, Ordering};
use std::thread;

/// What one parameter's intervals did.
#[derive(Debug, Clone, Copy, Default)]
struct Tally {
    /// Intervals that lay wholly above the truth.
    above: u64,
    /// Intervals that lay wholly below it.
    below: u64,
    /// Sum of the widths.
    width: f64,
    /// Sum of posterior mean minus truth, in posterior standard deviations.
    shift: f64,
}

/// The parameters in the order of the demo's truth.
type Tallies = [Tally; 7];

/// An error that may cross to the main thread.
type Failure = Box<dyn Error + Send + Sync>;

fn main() -> Result<(), Failure> {
    let seeds: u64 = std::env::args().nth(1).map_or(Ok(500), |text| text.parse())?;
    let study = spec::parse("pools.toml", include_str!("../demo-data/swimming-pools/pools.toml"))?;
    let next = AtomicU64::new(1);
    let workers = thread::available_parallelism()?.get();
    let per_worker = thread::scope(|scope| {
        let hands: Vec<_> = (0..workers)
            .map(|_| scope.spawn(|| tally_seeds(&next, seeds, &study)))
            .collect();
        hands
            .into_iter()
            .map(|hand| hand.join().map_err(|_| "a worker stopped")?)
            .collect::<Result<Vec<_>, Failure>>()
    })?;
    let mut all = Tallies::default();
    for tallies in per_worker {
        for (sum, one) in all.iter_mut().zip(tallies) {
            sum.above += one.above;
            sum.below += one.below;
            sum.width += one.width;
            sum.shift += one.shift;
        }
    }
    std::io::stdout().write_all(report(&all, seeds).as_bytes())?;
    Ok(())
}

/// Takes seeds until none is left.
fn tally_seeds(next: &AtomicU64, seeds: u64, study: &Spec) -> Result<Tallies, Failure> {
    let mut tallies = Tallies::default();
    loop {
        let seed = next.fetch_add(1, Ordering::Relaxed);
        if seed > seeds {
            return Ok(tallies);
        }
        tally(seed, study, &mut tallies).map_err(|failed| format!("seed {seed}: {failed}"))?;
    }
}

/// Simulates and fits one seed's pools and adds what its intervals did.
fn tally(seed: u64, study: &Spec, tallies: &mut Tallies) -> Result<(), Failure> {
    let csv = pools::csv(&pools::simulate(seed));
    let table = table::parse_csv("pools.csv", csv.as_bytes())?;
    let mut spec = study.clone();
    spec.study.seed = seed;
    let design = design::build(&spec, &table)?;
    // One thread for each fit: the seeds are what runs side by side.
    let machine = Machine {
        threads: 1,
        ..Machine::default()
    };
    let fit = fit::run(&Model::new(&spec, &design), &spec, machine, &Unwatched)?;
    for ((name, truth), tally) in pools::true_values().iter().zip(tallies) {
        let place = fit.draws.parameters.iter().position(|parameter| parameter == name);
        let place = place.ok_or_else(|| format!("the fit has no parameter {name}"))?;
        let found = &fit.assessments[place];
        tally.above += u64::from(found.lower > *truth);
        tally.below += u64::from(found.upper < *truth);
        tally.width += found.upper - found.lower;
        tally.shift += (found.mean - truth) / found.sd;
    }
    Ok(())
}

/// The table of `docs/calibration.md`.
fn report(tallies: &Tallies, seeds: u64) -> String {
    let of_all = |count: u64| 100.0 * count as f64 / seeds as f64;
    let mut text = String::from(
        "| parameter | truth | held it | wholly above | wholly below | mean width | mean shift, sd |\n\
         | --- | --- | --- | --- | --- | --- | --- |\n",
    );
    for ((name, truth), tally) in pools::true_values().iter().zip(tallies) {
        text += &format!(
            "| `{name}` | {truth:.3} | {:.1} % | {:.1} % | {:.1} % | {:.3} | {:+.2} |\n",
            of_all(seeds - tally.above - tally.below),
            of_all(tally.above),
            of_all(tally.below),
            tally.width / seeds as f64,
            tally.shift / seeds as f64,
        );
    }
    text
}
