//! Specs and tables as people hand them in: what is read, what is refused, and how it is told.

#![allow(
    clippy::unwrap_used,
    clippy::panic,
    reason = "a test may stop where it finds a fault"
)]
#![allow(missing_docs, reason = "tests are named after the behaviour that they hold")]

mod bad_data;
mod bad_spec;
mod design;
mod diagnostic_text;
mod draft;
mod spec;
mod spec_keys;
mod study;
