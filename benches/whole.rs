//! The whole program on the demo, and whole fits on two threads against one.
//!
//! `cargo bench --bench whole -- [--runs 20] [--turns 3]`

#[allow(dead_code, reason = "each bench uses its part")]
mod support;

use ratewright::fit::{self, Machine, Unwatched};
use std::io::Write;
use std::path::Path;
use support::clock::Clock;
use support::pairs::{Piece, Spread, take_turns};
use support::problems::{Family, L, M, Sampling, study};
use support::program::{parts, start, text};
use support::{Failure, arguments, number_after};

fn main() -> Result<(), Failure> {
    let arguments = arguments();
    let runs = number_after(&arguments, "--runs", 20)?.max(1) as usize;
    let turns = number_after(&arguments, "--turns", 3)?.max(1) as usize;
    let mut out = std::io::stdout().lock();
    demo(&mut out, runs)?;
    threads(&mut out, turns)
}

fn demo(out: &mut impl Write, runs: usize) -> Result<(), Failure> {
    let root = Path::new(env!("CARGO_MANIFEST_DIR"));
    let run = root.join("target/bench/pools.run");
    std::fs::create_dir_all(root.join("target/bench"))?;
    let spec = root.join("demo-data/swimming-pools/pools.toml");
    let (spec, run_text) = (text(&spec)?, text(&run)?);
    writeln!(
        out,
        "The whole program on the demo, {runs} runs\n\n\
         | command | ms on the wall (quartiles) | ms of processor | MB at most |\n| --- | --- | --- | --- |"
    )?;
    let fit = ["fit", spec, "--into", run_text, "--replace", "--quiet"];
    for (name, command) in [("fit", fit.as_slice()), ("vet", &["vet", spec])] {
        let took = start(command, runs)?;
        let wall = Spread::of(took.wall.iter().map(|seconds| seconds * 1e3));
        let processor = took.processor * 1e3;
        writeln!(
            out,
            "| {name} | {wall} | {processor:.0} | {:.0} |",
            took.memory as f64 * 1e-6
        )?;
    }
    let parts = parts(&run)?
        .into_iter()
        .map(|(part, seconds)| format!("{part} {:.0} ms", seconds * 1e3));
    writeln!(
        out,
        "\nParts of the last fit: {}\n",
        parts.collect::<Vec<_>>().join(", ")
    )?;
    Ok(())
}

/// Whole fits on one thread and on two, in turns. The draws are the same bits.
fn threads(out: &mut impl Write, turns: usize) -> Result<(), Failure> {
    writeln!(
        out,
        "Whole fits, {turns} turns\n\n\
         | problem | family | s on one thread | s on two | one against two (quartiles) | draws |\n\
         | --- | --- | --- | --- | --- | --- |"
    )?;
    for problem in [M, L] {
        for family in Family::BOTH {
            let study = study(&problem, family, 1, Sampling::default())?;
            let draws = fit(&study, 2)?;
            let on = |threads| {
                let study = &study;
                // Fitted above without a failure, and every fit of it is the same.
                Piece::new(move || fit(study, threads).unwrap_or(f64::NAN))
            };
            let times = take_turns(vec![on(1), on(2)], turns, Clock::Wall);
            writeln!(
                out,
                "| {} | {} | {:.2} | {:.2} | {} | {draws} |",
                problem.name,
                family.name(),
                times.seconds(0).median,
                times.seconds(1).median,
                times.ratio(0, 1)
            )?;
        }
    }
    Ok(())
}

/// Kept draws of a whole fit on so many threads.
fn fit(study: &support::problems::Study, threads: usize) -> Result<f64, fit::FitError> {
    let machine = Machine {
        threads,
        ..Machine::default()
    };
    let fit = fit::run(&study.model, &study.spec, machine, &Unwatched)?;
    Ok(fit.draws.in_all() as f64)
}
