//! Ratewright: incident rates for programme evaluation.
//!
//! A study is one spec file and the table that it names. The flow is one way, and each folder may
//! use those above it in this list and none below:
//!
//! | module | takes | gives |
//! | --- | --- | --- |
//! | [`numeric`] | floats | special functions, random streams, fixed-order sums, kernels |
//! | [`spec`] | TOML text | a checked [`spec::Spec`]; values keep their place in the text |
//! | [`table`] | CSV, or a run's own rows | typed columns, with line numbers |
//! | [`design`] | spec and table | counts, offset, coded columns, and the coding itself |
//! | [`model`] | design and priors | the log posterior: value, gradient, Hessian |
//! | [`fit`] | model | mode, Laplace approximation, draws, convergence |
//! | [`check`] | draws and design | the predictive check of each unit |
//! | [`answer`] | draws and coding | rate ratios, and the answer in words |
//! | [`output`] | all of the above | the run folder, terminal text, JSON, CSV, Parquet |
//! | [`command`] | arguments | one file per command; no statistics there |
//!
//! Everything that a run decides goes through [`numeric`]'s own arithmetic in a fixed order, so
//! that the same spec, data and version give the same bytes on any x86-64 processor.

pub mod answer;
pub mod check;
pub mod command;
pub mod design;
pub mod diagnostic;
pub mod error;
pub mod fit;
pub mod model;
pub mod numeric;
pub mod output;
mod regular_file;
pub mod spec;
pub mod table;
mod threads;
