//! Takes a spec and a table; gives counts, offset, coded columns, and the coding itself.

mod types;

pub use types::{Audit, Coding, ColumnCoding, CovariateCoding, Design, LARGEST_COUNT, Term};
