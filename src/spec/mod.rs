//! Takes TOML text; gives a checked [`Spec`].

mod study;

pub use study::*;
