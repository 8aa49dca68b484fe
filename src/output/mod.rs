//! Takes all that a fit found; gives the run folder, terminal text, JSON, CSV and Parquet.

pub mod compare;
pub mod consistency;
pub mod diagnostic;
mod error;
pub mod files;
pub mod findings;
pub mod gather;
pub mod json;
pub mod manifest;
pub mod parquet;
pub mod replaying;
pub mod run_folder;
mod schema;
pub mod shown;
pub mod soundness;
pub mod tables;
pub mod terminal;
mod text;
pub mod timings;
pub mod vetting;

pub use error::OutputError;
pub use run_folder::{Replace, RunFolder};
pub use schema::findings_schema;
