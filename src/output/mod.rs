//! Takes all that a fit found; gives the run folder, terminal text, JSON, CSV and Parquet.

mod error;
pub mod findings;
pub mod json;
pub mod parquet;
pub mod shown;
pub mod tables;

pub use error::OutputError;
