//! The file of the demo's true values, in two forms: as people say them, and as the parameters of
//! the fit.

use super::pools;
use serde_json::{Map, Value, json};

/// `truth.json` for the table of this seed.
pub fn json_text(seed: u64) -> String {
    let parameters: Map<String, Value> = pools::true_values()
        .into_iter()
        .map(|(name, value)| (name.to_string(), json!(value)))
        .collect();
    let truth = json!({
        "seed": seed,
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
