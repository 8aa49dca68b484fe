//! The swimming pools of the demo: 160 invented public pools over one summer, simulated from stated
//! true values. Nothing here is a real place.
//!
//! A pool's slips are negative-binomial around `swims * rate`, where the log of the rate is the sum
//! of the true values below. The floor programme was given by lot to half of the pools.

use ratewright::numeric::{Purpose, Stream, exp, ln};
use std::fmt::Write;

/// Number of pools.
pub const POOLS: usize = 160;

/// Slips per 10,000 swims at an indoor pool with a plain floor, no water attraction and a mean
/// queue of [`QUEUE_CENTRE`] people.
pub const BASELINE_PER_10000: f64 = 6.0;
/// Rate ratio of a textured floor against a plain one.
pub const TEXTURED: f64 = 0.7;
/// Rate ratio of an outdoor pool against an indoor one.
pub const OUTDOOR: f64 = 0.85;
/// Rate ratio of slides against no water attraction.
pub const SLIDES: f64 = 1.3;
/// Rate ratio of a wave machine against no water attraction.
pub const WAVES: f64 = 1.15;
/// Rate ratio for [`QUEUE_STEP`] more people in the mean queue on the steps.
pub const QUEUE: f64 = 1.1;
/// Coefficient of variation of the true rate among pools that look alike.
pub const SCATTER: f64 = 0.4;
/// Mean queue at which the baseline sits, people.
pub const QUEUE_CENTRE: f64 = 4.0;
/// Change in the mean queue that [`QUEUE`] stands for, people.
pub const QUEUE_STEP: f64 = 2.0;

const STEMS: [&str; 16] = [
    "Bobbin", "Bonnet", "Crumpet", "Custard", "Doorknob", "Gherkin", "Marzipan", "Mustard", "Noodle", "Parsnip",
    "Pudding", "Rhubarb", "Teaspoon", "Trombone", "Trumpet", "Turnip",
];
const ENDINGS: [&str; 10] = [
    "combe", "fleet", "garth", "haven", "holm", "mere", "sands", "stead", "weir", "wick",
];

/// One pool, one row of the table.
pub struct Pool {
    /// Its invented name.
    pub name: String,
    /// Swims over the summer: the exposure.
    pub swims: u64,
    /// Slips beside the pool over the summer: the count.
    pub slips: u64,
    /// `plain` or `textured`.
    pub floor: &'static str,
    /// `indoor` or `outdoor`.
    pub setting: &'static str,
    /// `none`, `slides` or `waves`.
    pub attractions: &'static str,
    /// Mean queue on the steps, tenths of a person.
    pub queue_tenths: u64,
}

/// All pools, in the order of their names.
pub fn simulate(seed: u64) -> Vec<Pool> {
    let textured = lot(&mut Stream::new(seed, Purpose::Demo, 0));
    let names = STEMS
        .iter()
        .flat_map(|stem| ENDINGS.iter().map(move |ending| format!("{stem}{ending}")));
    names
        .enumerate()
        // A stream for each pool: what one pool draws moves no other.
        .map(|(place, name)| {
            pool(
                name,
                textured[place],
                &mut Stream::new(seed, Purpose::Demo, 1 + place as u64),
            )
        })
        .collect()
}

/// Which pools have the textured floor: half of them, by lot (a shuffle from the last place down).
fn lot(stream: &mut Stream) -> Vec<bool> {
    let mut textured: Vec<bool> = (0..POOLS).map(|place| place < POOLS / 2).collect();
    for last in (1..POOLS).rev() {
        let other = stream.below(last as u64 + 1) as usize;
        textured.swap(last, other);
    }
    textured
}

fn pool(name: String, textured: bool, stream: &mut Stream) -> Pool {
    let outdoor = stream.uniform() < 0.4;
    let attractions = match stream.uniform() {
        u if u < 0.5 => "none",
        u if u < 0.8 => "slides",
        _ => "waves",
    };
    // Slides make people wait on the steps, so the two go together in the data.
    let usual_queue: f64 = if attractions == "slides" { 5.0 } else { 3.5 };
    let queue_tenths = (10.0 * usual_queue * stream.gamma(6.0) / 6.0).round().max(1.0);
    let swims = 10.0 * (2_500.0 * exp(0.6 * stream.normal())).round().max(1.0);

    let mut log_rate = ln(BASELINE_PER_10000 / 10_000.0);
    log_rate += if textured { ln(TEXTURED) } else { 0.0 };
    log_rate += if outdoor { ln(OUTDOOR) } else { 0.0 };
    log_rate += match attractions {
        "slides" => ln(SLIDES),
        "waves" => ln(WAVES),
        _ => 0.0,
    };
    log_rate += ln(QUEUE) * (queue_tenths / 10.0 - QUEUE_CENTRE) / QUEUE_STEP;
    // Negative-binomial counts: Poisson around a gamma factor of mean 1 and variance scatter^2.
    let square = SCATTER * SCATTER;
    let own_factor = square * stream.gamma(1.0 / square);
    let slips = stream.poisson(swims * exp(log_rate) * own_factor);

    Pool {
        name,
        swims: swims as u64,
        slips: slips as u64,
        floor: if textured { "textured" } else { "plain" },
        setting: if outdoor { "outdoor" } else { "indoor" },
        attractions,
        queue_tenths: queue_tenths as u64,
    }
}

/// The table as a CSV file.
pub fn csv(pools: &[Pool]) -> String {
    let mut text = String::from("pool,swims,slips,floor,setting,attractions,queue\n");
    for pool in pools {
        let Pool {
            name,
            swims,
            slips,
            floor,
            setting,
            attractions,
            queue_tenths,
        } = pool;
        let (people, tenths) = (queue_tenths / 10, queue_tenths % 10);
        // Writing to a String cannot fail.
        let _ = writeln!(
            text,
            "{name},{swims},{slips},{floor},{setting},{attractions},{people}.{tenths}"
        );
    }
    text
}

/// The true value of every parameter of the demo's spec, by the name that a run gives it: log scale
/// for the baseline (per swim) and the terms, the scatter as itself.
pub fn true_values() -> [(&'static str, f64); 7] {
    [
        ("baseline", ln(BASELINE_PER_10000 / 10_000.0)),
        ("floor=textured", ln(TEXTURED)),
        ("setting=outdoor", ln(OUTDOOR)),
        ("attractions=slides", ln(SLIDES)),
        ("attractions=waves", ln(WAVES)),
        ("queue", ln(QUEUE)),
        ("scatter", SCATTER),
    ]
}
