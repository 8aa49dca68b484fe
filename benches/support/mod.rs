//! What the benches share.
//!
//! No harness on the registries gives what is asked here: the ratio of two ways of doing the same
//! work, taken in turns in one run, beside the limits of the very machine that ran them. So the
//! harness is our own, and small:
//!
//! | module | gives |
//! | --- | --- |
//! | [`clock`] | seconds of wall time, of one thread, of finished child processes |
//! | [`pairs`] | several pieces of work timed in turns: medians and ratios, with their quartiles |
//! | [`machine`] | the machine's own limits: read bandwidth and arithmetic peak |
//! | [`plain`] | the likelihood as it would first be written, to be compared with |
//! | [`problems`] | simulated studies of stated size and difficulty |
//! | [`simulate`] | their rows, also as the CSV file that they could have come from |
//! | [`program`] | the program, started as a person starts it: time and memory |
//! | [`table`] | CSV tables, read and written |
//! | [`curves`] | the curves of a table, as SVG |
//!
//! Nothing here asserts a time: a bench tells figures, and people judge them.

pub mod clock;
pub mod curves;
pub mod machine;
pub mod pairs;
pub mod plain;
pub mod problems;
pub mod program;
pub mod simulate;
pub mod table;

/// What any bench may end with.
pub type Failure = Box<dyn std::error::Error>;

/// The arguments given to a bench, without the `--bench` that Cargo adds.
pub fn arguments() -> Vec<String> {
    std::env::args()
        .skip(1)
        .filter(|argument| argument != "--bench")
        .collect()
}

/// The whole number after `name` among the arguments, or `otherwise` where it is not given.
///
/// # Errors
/// What follows `name` is no whole number.
pub fn number_after(arguments: &[String], name: &str, otherwise: u64) -> Result<u64, Failure> {
    let Some(place) = arguments.iter().position(|argument| argument == name) else {
        return Ok(otherwise);
    };
    let text = arguments.get(place + 1).ok_or(format!("a number must follow {name}"))?;
    text.parse()
        .map_err(|_| format!("{name} {text}: not a whole number").into())
}
