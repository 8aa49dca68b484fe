//! The rules that single cells can break, each with its code, its message and its remedy.

use super::types::LARGEST_COUNT;

/// A cell that breaks a rule.
#[derive(Debug, Clone, PartialEq)]
pub struct BadCell {
    /// Line of the file.
    pub line: u64,
    /// Column name.
    pub column: String,
    /// What the cell holds.
    pub value: String,
}

/// A rule that a cell breaks.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord)]
pub enum CellRule {
    /// A column that the fit needs holds a value in every row.
    Gap,
    /// What `[data] keep` compares with `from` and `to` is a number.
    KeepNumber,
    /// A count is a number.
    CountNumber,
    /// A count is finite.
    CountFinite,
    /// A count is at least 0.
    CountNegative,
    /// A count is whole.
    CountFraction,
    /// A count is at most [`LARGEST_COUNT`].
    CountLargest,
    /// An exposure is a number.
    ExposureNumber,
    /// An exposure is finite.
    ExposureFinite,
    /// An exposure is at least 0.
    ExposureNegative,
    /// Where there were incidents there was exposure.
    ExposureMissed,
    /// A row has some exposure.
    ExposureZero,
    /// With one incident each at most, a count is no larger than its exposure.
    MoreThanChances,
    /// What a row stands for is a whole number from 1.
    StandsFor,
    /// What a row stands for is at most [`LARGEST_COUNT`].
    StandsForLargest,
    /// A number covariate is a number.
    CovariateNumber,
    /// A number covariate is finite.
    CovariateFinite,
    /// A covariate whose logarithm is taken is above 0.
    CovariatePositive,
    /// A number covariate lies within [`MOST_STEPS`] steps of its centre.
    CovariateFar,
    /// A level is one that the coding knows.
    NewLevel,
}

/// How many steps from its centre a number covariate may lie: beyond it the step, or the cell, is
/// a mistake, and squares of the coded column would lose the other columns.
pub const MOST_STEPS: f64 = 1e9;

impl CellRule {
    /// The stable code of a broken rule.
    pub fn code(self) -> &'static str {
        match self {
            CellRule::Gap => "gap",
            CellRule::KeepNumber => "keep-not-a-number",
            CellRule::CountNumber => "count-not-a-number",
            CellRule::CountFinite => "count-not-finite",
            CellRule::CountNegative => "count-negative",
            CellRule::CountFraction => "count-fractional",
            CellRule::CountLargest => "count-too-large",
            CellRule::ExposureNumber => "exposure-not-a-number",
            CellRule::ExposureFinite => "exposure-not-finite",
            CellRule::ExposureNegative => "exposure-negative",
            CellRule::ExposureMissed => "incidents-without-exposure",
            CellRule::ExposureZero => "exposure-zero",
            CellRule::MoreThanChances => "more-incidents-than-exposure",
            CellRule::StandsFor => "stands-for-not-whole",
            CellRule::StandsForLargest => "stands-for-too-large",
            CellRule::CovariateNumber => "covariate-not-a-number",
            CellRule::CovariateFinite => "covariate-not-finite",
            CellRule::CovariatePositive => "covariate-not-positive",
            CellRule::CovariateFar => "covariate-far-from-centre",
            CellRule::NewLevel => "new-level",
        }
    }

    /// What is wrong with `cells` cells that break the rule.
    pub(super) fn message(self, cells: usize) -> String {
        let (one, many) = match self {
            CellRule::Gap => ("cell that the fit needs is empty", "cells that the fit needs are empty"),
            CellRule::KeepNumber => (
                "cell that `[data] keep` compares with numbers is no number",
                "cells that `[data] keep` compares with numbers are no numbers",
            ),
            CellRule::CountNumber => ("incident count is no number", "incident counts are no numbers"),
            CellRule::CountFinite => ("incident count is not finite", "incident counts are not finite"),
            CellRule::CountNegative => ("incident count is below 0", "incident counts are below 0"),
            CellRule::CountFraction => ("incident count is not whole", "incident counts are not whole"),
            CellRule::CountLargest => {
                return format!(
                    "{} above {LARGEST_COUNT}, the largest that is accepted",
                    counted(cells, "incident count is", "incident counts are")
                );
            }
            CellRule::ExposureNumber => ("exposure is no number", "exposures are no numbers"),
            CellRule::ExposureFinite => ("exposure is not finite", "exposures are not finite"),
            CellRule::ExposureNegative => ("exposure is below 0", "exposures are below 0"),
            CellRule::ExposureMissed => (
                "row has incidents but no exposure",
                "rows have incidents but no exposure",
            ),
            CellRule::ExposureZero => (
                "row has no exposure and no incident",
                "rows have no exposure and no incident",
            ),
            CellRule::MoreThanChances => (
                "row has more incidents than exposure, though `one_incident_each_at_most` is set",
                "rows have more incidents than exposure, though `one_incident_each_at_most` is set",
            ),
            CellRule::StandsFor => (
                "row stands for no whole number of rows from 1 up",
                "rows stand for no whole number of rows from 1 up",
            ),
            CellRule::StandsForLargest => {
                return format!(
                    "{} for more than {LARGEST_COUNT} rows, the most that is accepted",
                    counted(cells, "row stands", "rows stand")
                );
            }
            CellRule::CovariateNumber => (
                "cell of a number covariate is no number",
                "cells of number covariates are no numbers",
            ),
            CellRule::CovariateFinite => (
                "cell of a number covariate is not finite",
                "cells of number covariates are not finite",
            ),
            CellRule::CovariatePositive => (
                "cell of a log-number covariate is not above 0",
                "cells of log-number covariates are not above 0",
            ),
            CellRule::CovariateFar => {
                return format!(
                    "{} more than {MOST_STEPS} steps from its centre",
                    counted(cells, "number is", "numbers are")
                );
            }
            CellRule::NewLevel => (
                "cell holds a level that the fit never saw",
                "cells hold a level that the fit never saw",
            ),
        };
        counted(cells, one, many)
    }

    /// What to do about it.
    pub(super) fn help(self, cells: &[BadCell]) -> String {
        let help = match self {
            CellRule::Gap => {
                "fill the cells, or set `rows_with_gaps = \"drop\"` in `[data]` to leave such rows out and have them \
                 listed; a text that means \"no value\" belongs in `gap_marks`"
            }
            CellRule::KeepNumber => {
                "write them as plain numbers, or name the levels to keep: `keep = { column = [\"…\"] }`"
            }
            CellRule::CountNumber => {
                "write each count as a plain whole number without separators or units; a text that means \"no value\" \
                 belongs in `[data] gap_marks`"
            }
            CellRule::CountFinite => "write the number of incidents of the row",
            CellRule::CountNegative => {
                "a count starts at 0: correct the cells; a correction entry belongs to the row that it corrects"
            }
            CellRule::CountFraction => {
                "a count of incidents is whole: use the raw count, not a rate, a share or an average, and name its \
                 opportunity in `[exposure]`"
            }
            CellRule::CountLargest => "correct the cells, or count in larger events",
            CellRule::ExposureNumber => {
                "write each exposure as a plain number with a decimal point, without separators or units"
            }
            CellRule::ExposureFinite => "write how much opportunity the row had",
            CellRule::ExposureNegative => "exposure measures opportunity and is above 0: correct the cells",
            CellRule::ExposureMissed => {
                "an incident needs an opportunity: correct the exposure or the count; such rows must not be left out, \
                 for their incidents happened"
            }
            CellRule::ExposureZero => {
                let column = cells.first().map_or("", |cell| cell.column.as_str());
                return format!(
                    "such rows tell nothing about the rate: leave them out with `keep = {{ \"{column}\" = {{ from = 1 }} }}` in \
                     `[data]`, or whatever is the least exposure that counts"
                );
            }
            CellRule::MoreThanChances => {
                "correct the cells, or take `one_incident_each_at_most` out if one unit of exposure can bring several incidents"
            }
            CellRule::StandsFor => "write how many identical rows the row stands for: 1, 2, 3 and so on",
            CellRule::StandsForLargest => "correct the cells: no table condenses so many rows into one",
            CellRule::CovariateNumber => {
                "write each as a plain number with a decimal point, without separators or units, or code the column \
                 `as = \"category\"`; a text that means \"no value\" belongs in `[data] gap_marks`"
            }
            CellRule::CovariateFinite => "write the value of the row",
            CellRule::CovariatePositive => {
                "a logarithm needs numbers above 0: correct the cells, or code the column `as = \"number\"`"
            }
            CellRule::CovariateFar => "correct the cells, or choose a larger `step`",
            CellRule::NewLevel => "correct the level, or fit again with rows that have it",
        };
        help.to_owned()
    }
}

/// "1 row is" or "3 rows are".
fn counted(cells: usize, one: &str, many: &str) -> String {
    if cells == 1 {
        format!("1 {one}")
    } else {
        format!("{cells} {many}")
    }
}
