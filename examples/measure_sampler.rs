//! Measures the sampler on simulated problems: effective draws per draw, and draws per second.
//!
//! `cargo run --release --example measure_sampler [SEEDS [LETTERS]]`, say `10 DZ` for two of the problems

mod problems;

use ratewright::fit::{self, Assessment, Machine, Unwatched};
use ratewright::model::Model;
use ratewright::spec;
use std::error::Error;
use std::io::Write;
use std::time::Instant;

fn main() -> Result<(), Box<dyn Error>> {
    let seeds: u64 = std::env::args().nth(1).map_or(Ok(3), |text| text.parse())?;
    let letters = std::env::args().nth(2).unwrap_or_default();
    let mut out = std::io::stdout().lock();
    writeln!(
        out,
        "| problem | rows | terms | bulk per draw | tail per draw | accepted | draws | seconds |"
    )?;
    writeln!(out, "| --- | --- | --- | --- | --- | --- | --- | --- |")?;
    let asked = |plan: &&problems::Plan| letters.is_empty() || plan.name.starts_with(|c| letters.contains(c));
    for plan in problems::PLANS.iter().filter(asked) {
        let mut worst = Measured {
            bulk: f64::INFINITY,
            tail: f64::INFINITY,
            accepted: f64::INFINITY,
            draws: 0,
            seconds: 0.0,
        };
        for seed in 1..=seeds {
            worst = worst.worse_of(measure(plan, seed)?);
        }
        let Measured {
            bulk,
            tail,
            accepted,
            draws,
            seconds,
        } = worst;
        writeln!(
            out,
            "| {} | {} | {} | {bulk:.3} | {tail:.3} | {accepted:.2} | {draws} | {seconds:.2} |",
            plan.name, plan.rows, plan.terms
        )?;
    }
    Ok(())
}

/// What one fit, or the worst of several, showed.
struct Measured {
    /// Smallest bulk effective draws of a parameter, per kept draw.
    bulk: f64,
    /// Smallest tail effective draws of a parameter, per kept draw.
    tail: f64,
    /// Share of proposals accepted.
    accepted: f64,
    /// Kept draws.
    draws: usize,
    /// Time of the whole fit.
    seconds: f64,
}

impl Measured {
    /// The worse of each figure.
    fn worse_of(self, other: Measured) -> Measured {
        Measured {
            bulk: self.bulk.min(other.bulk),
            tail: self.tail.min(other.tail),
            accepted: self.accepted.min(other.accepted),
            draws: self.draws.max(other.draws),
            seconds: self.seconds.max(other.seconds),
        }
    }
}

fn measure(plan: &problems::Plan, seed: u64) -> Result<Measured, Box<dyn Error>> {
    let design = problems::simulate(plan, seed);
    let spec = spec::parse(plan.name, &problems::spec_text(&design, seed))?;
    let start = Instant::now();
    let fit = fit::run(&Model::new(&spec, &design), &spec, Machine::default(), &Unwatched)?;
    let seconds = start.elapsed().as_secs_f64();
    let draws = fit.draws.in_all();
    let fewest = |figure: fn(&Assessment) -> f64| {
        fit.assessments.iter().map(figure).fold(f64::INFINITY, f64::min) / draws as f64
    };
    Ok(Measured {
        bulk: fewest(|a| a.effective_draws),
        tail: fewest(|a| a.effective_tail_draws),
        accepted: fit.accepted,
        draws,
        seconds,
    })
}
