//! Takes a spec and a table; gives counts, offset, coded columns, and the coding itself.

mod build;
mod cell_rule;
mod coding;
mod collinear;
mod covariates;
mod fault;
mod nearest;
mod outcome;
mod rows;
mod types;

pub use build::{build, used_columns, used_rows};
pub use cell_rule::{CellRule, MOST_STEPS};
pub use collinear::OPEN_SHARE;
pub use fault::{BadCell, CollinearTerm, DesignError, DesignFault, LevelRole, MissingColumn, UnknownLevel};
pub use types::{Audit, Coding, ColumnCoding, CovariateCoding, Design, LARGEST_COUNT, Term};
