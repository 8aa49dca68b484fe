//! Numbers against the outside: tables, closed forms, other programs' fits, laws.

#![allow(
    clippy::unwrap_used,
    clippy::panic,
    reason = "a test may stop where it finds a fault"
)]
#![allow(missing_docs, reason = "tests are named after the behaviour that they hold")]

mod cases;
mod conjugacy;
mod convergence;
mod designs;
mod elementary;
mod kernels;
mod model;
mod numeric;
mod random;
mod reference_fits;
mod reference_specs;
mod sameness;
mod scatter;
mod tables;
mod units;
