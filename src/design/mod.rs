//! Takes a spec and a table; gives counts, offset, coded columns, and the coding itself.

mod build;
mod cell_rule;
mod coding;
mod collinear;
mod condense;
mod condition;
mod covariates;
mod draft;
mod fault;
mod outcome;
mod remark;
mod rows;
mod told;
mod types;

pub use build::{build, used_columns, used_rows};
pub use cell_rule::{BadCell, CellRule, MOST_STEPS};
pub use collinear::OPEN_SHARE;
pub use condense::{Alike, LikelihoodRows, condense};
pub use draft::{Draft, DraftError, DraftFault, draft};
pub use fault::{CollinearTerm, DesignError, DesignFault, LevelRole, MissingColumn, UnknownLevel};
pub use remark::{FEW_LEVEL_ROWS, HIGH_CONDITION, HIGH_LEVERAGE, Remark, WIDE_EXPOSURE, remarks};
pub use types::{Audit, Coding, ColumnCoding, CovariateCoding, Design, LARGEST_COUNT, Term};
