//! Takes all that a fit found; gives the run folder, terminal text, JSON, CSV and Parquet.

pub mod diagnostic;
pub mod findings;
