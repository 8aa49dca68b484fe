//! `timings.json`: how long each part took, and on what. The one file of a run that is not hashed.

use serde::{Deserialize, Serialize};
use std::time::Instant;

/// Name of the file in a run.
pub const FILE: &str = "timings.json";

/// How long each part took, and on what machine.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct Timings {
    /// Processor family, as in `x86_64`.
    pub processor: String,
    /// Operating system, as in `linux`.
    pub system: String,
    /// Threads that the fit could use.
    pub threads: usize,
    /// The parts in order.
    pub parts: Vec<Part>,
}

/// One part.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct Part {
    /// Its name.
    pub part: String,
    /// Seconds of wall time.
    pub seconds: f64,
}

/// A watch with one hand: each lap is the time since the last.
#[derive(Debug)]
pub struct Laps {
    last: Instant,
    parts: Vec<Part>,
}

impl Laps {
    /// Starts it.
    #[allow(clippy::new_without_default)]
    pub fn new() -> Laps {
        Laps {
            last: Instant::now(),
            parts: Vec::new(),
        }
    }

    /// Ends a part.
    pub fn lap(&mut self, part: &str) {
        let now = Instant::now();
        self.parts.push(Part {
            part: part.to_owned(),
            seconds: (now - self.last).as_secs_f64(),
        });
        self.last = now;
    }

    /// All parts so far, and the machine.
    pub fn timings(&self, threads: usize) -> Timings {
        Timings {
            processor: std::env::consts::ARCH.to_owned(),
            system: std::env::consts::OS.to_owned(),
            threads,
            parts: self.parts.clone(),
        }
    }
}
