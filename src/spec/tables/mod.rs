//! The one list of tables and keys: reader, schema and docs all follow it.

mod belief;
mod build;
mod running;
mod subject;

use belief::{BASELINE, COVARIATE, FAMILY, JOINT};
use build::not_yet;
use running::{REPORT, SAMPLING};
use subject::{DATA, EXPOSURE, INCIDENTS, STUDY};

use super::keys::{NotYet, TableInfo};

pub(super) use belief::EARLIER;
pub(super) use subject::KEEP_ENDS;

/// Every table that a spec may hold, in the order of the docs.
pub static TABLES: &[TableInfo] = &[
    STUDY, DATA, INCIDENTS, EXPOSURE, FAMILY, BASELINE, COVARIATE, JOINT, SAMPLING, REPORT,
];

/// Tables that are planned and that this version refuses by name.
pub static TABLES_NOT_YET: &[NotYet] = &[
    not_yet("grouping", "rates that vary from group to group"),
    not_yet("contrast", "answers averaged over rows"),
];
