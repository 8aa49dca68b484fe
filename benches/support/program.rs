//! The program itself, started as a person starts it.

use super::Failure;
use super::clock::{Clock, most_memory, of_children};
use std::path::Path;
use std::process::{Command, Stdio};
use std::time::Duration;

/// Time between two looks at a running program: times on the wall are no finer.
const LOOK: Duration = Duration::from_micros(500);

/// What one or several equal starts of the program took.
#[derive(Debug, Clone)]
pub struct Took {
    /// Seconds on the wall, start by start.
    pub wall: Vec<f64>,
    /// Processor seconds of one start, on average; NaN where the system does not tell.
    pub processor: f64,
    /// Most memory that it held, in bytes.
    pub memory: u64,
}

/// Starts the program `times` times with these arguments.
///
/// # Errors
/// It cannot be started, or does not end well.
pub fn start(arguments: &[&str], times: usize) -> Result<Took, Failure> {
    let mut took = Took {
        wall: Vec::new(),
        processor: f64::NAN,
        memory: 0,
    };
    let before = of_children();
    for _ in 0..times {
        let start = Clock::Wall.seconds();
        let mut child = command(arguments).spawn()?;
        let status = loop {
            if let Some(status) = child.try_wait()? {
                break status;
            }
            // The system forgets it when a process ends, so it is asked while it runs: what is missed is what the
            // program takes in its very last moments.
            took.memory = took.memory.max(most_memory(child.id()).unwrap_or(0));
            std::thread::sleep(LOOK);
        };
        took.wall.push(Clock::Wall.seconds() - start);
        // 3 says that a check says stop: the work is done all the same.
        if !matches!(status.code(), Some(0 | 3)) {
            return Err(format!("`ratewright {}` ended with {status}", arguments.join(" ")).into());
        }
    }
    if let (Some(before), Some(after)) = (before, of_children()) {
        took.processor = (after - before) / times as f64;
    }
    Ok(took)
}

fn command(arguments: &[&str]) -> Command {
    let mut command = Command::new(env!("CARGO_BIN_EXE_ratewright"));
    command.args(arguments).stdout(Stdio::null()).stderr(Stdio::null());
    command
}

/// Seconds of each part of a run, as the run tells them.
///
/// # Errors
/// The run's `timings.json` is missing or holds something else.
pub fn parts(run: &Path) -> Result<Vec<(String, f64)>, Failure> {
    let timings: serde_json::Value = serde_json::from_str(&std::fs::read_to_string(run.join("timings.json"))?)?;
    let parts = timings["parts"].as_array().ok_or("timings.json has no parts")?;
    let part = |part: &serde_json::Value| Some((part["part"].as_str()?.to_owned(), part["seconds"].as_f64()?));
    parts
        .iter()
        .map(part)
        .collect::<Option<_>>()
        .ok_or_else(|| "timings.json has an odd part".into())
}

/// A path as an argument.
///
/// # Errors
/// It is no Unicode.
pub fn text(path: &Path) -> Result<&str, Failure> {
    path.to_str()
        .ok_or_else(|| format!("{} is no Unicode", path.display()).into())
}
