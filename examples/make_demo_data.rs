//! Makes the table of the demo and the file of its true values, from seed 1.
//!
//! `cargo run --release --example make_demo_data FOLDER`

mod pools;

use serde_json::{Map, json};
use std::error::Error;
use std::path::Path;

/// Seed of the checked-in table.
const SEED: u64 = 1;

fn main() -> Result<(), Box<dyn Error>> {
    let folder = std::env::args().nth(1).ok_or("name the folder to write pools.csv and truth.json into")?;
    let folder = Path::new(&folder);
    std::fs::write(folder.join("pools.csv"), pools::csv(&pools::simulate(SEED)))?;
    std::fs::write(folder.join("truth.json"), truth())?;
    Ok(())
}

/// The true values in two forms: as people say them, and as the parameters of the fit.
fn truth() -> String {
    let parameters: Map<_, _> = pools::true_values().map(|(name, value)| (name.to_string(), json!(value))).into_iter().collect();
    let truth = json!({
        "seed": SEED,
        "stated": {
            "slips per 10,000 swims at the baseline": pools::BASELINE_PER_10000,
            "rate ratio of a textured floor": pools::TEXTURED,
            "rate ratio of an outdoor pool": pools::OUTDOOR,
            "rate ratio of slides": pools::SLIDES,
            "rate ratio of waves": pools::WAVES,
            "rate ratio for two more people in the queue": pools::QUEUE,
            "scatter": pools::SCATTER,
        },
        "parameters": parameters,
    });
    format!("{truth:#}\n")
}
