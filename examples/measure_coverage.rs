//! Measures how often the 95 % intervals of the demo's spec hold the truth: simulates the pools from
//! many seeds, fits each, and counts. Prints the table of `docs/calibration.md`.
//!
//! `cargo run --release --example measure_coverage [SEEDS]`

mod pools;

use ratewright::{design, fit, spec, table};
use std::error::Error;
use std::io::Write;
use std::path::Path;
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
    let folder = tempfile::tempdir()?;
    let next = AtomicU64::new(1);
    let workers = thread::available_parallelism()?.get();
    let per_worker = thread::scope(|scope| {
        let hands: Vec<_> = (0..workers)
            .map(|_| scope.spawn(|| tally_seeds(&next, seeds, folder.path())))
            .collect();
        hands.into_iter().map(|hand| hand.join().map_err(|_| "a worker stopped")?).collect::<Result<Vec<_>, Failure>>()
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
fn tally_seeds(next: &AtomicU64, seeds: u64, folder: &Path) -> Result<Tallies, Failure> {
    let mut tallies = Tallies::default();
    loop {
        let seed = next.fetch_add(1, Ordering::Relaxed);
        if seed > seeds {
            return Ok(tallies);
        }
        tally(seed, folder, &mut tallies)?;
    }
}
