//! The program as people use it: commands, the run folder, texts, docs and the demo.

#![allow(
    clippy::unwrap_used,
    clippy::panic,
    reason = "a test may stop where it finds a fault"
)]
#![allow(missing_docs, reason = "tests are named after the behaviour that they hold")]

mod command_line;
mod demo;
mod docs;
mod findings_schema;
mod findings_text;
mod prior_look;
mod replays;
mod run_folder;
mod stand_in;
