//! Makes the table of the demo and the file of its true values, from seed 1.
//!
//! `cargo run --release --example make_demo_data FOLDER`

mod pools;
#[path = "pools/truth.rs"]
mod truth;

use std::error::Error;
use std::path::Path;

/// Seed of the checked-in table.
const SEED: u64 = 1;

fn main() -> Result<(), Box<dyn Error>> {
    let folder = std::env::args()
        .nth(1)
        .ok_or("name the folder to write pools.csv and truth.json into")?;
    let folder = Path::new(&folder);
    std::fs::write(folder.join("pools.csv"), pools::csv(&pools::simulate(SEED)))?;
    std::fs::write(folder.join("truth.json"), truth::json_text(SEED))?;
    Ok(())
}
