//! Which other columns of an unprepared table can be covariates, and how.

use super::super::types::PARAMETERS;
use super::PROGRAMME;
use super::look::{Facts, Numbers};
use super::roles::{INCIDENTS, LABELS, Roles};
use crate::table::Table;

/// A category has at most this many levels in a draft.
const MOST_LEVELS: usize = 12;
/// A number that takes at most this many values is a category in a draft.
const FEW_VALUES: usize = 2;
/// A unit of at most this many levels, with [`ROWS_PER_TERM`] rows each, may matter as a category too.
const UNIT_LEVELS: usize = 5;
/// A draft has at most this many covariates: more are for the evaluator to choose.
const MOST_COVARIATES: usize = 8;
/// A draft has at most one coefficient for this many rows.
const ROWS_PER_TERM: usize = 5;
/// A positive number whose largest value is this many times its smallest enters by its logarithm.
const WIDE: f64 = 100.0;

/// A covariate of a draft.
pub(super) struct Entry {
    pub column: String,
    pub kind: EntryKind,
    pub comment: String,
}

pub(super) enum EntryKind {
    Category { reference: String },
    Number { centre: String, step: String },
    LogNumber,
}

/// A column that a draft leaves out, and why.
pub(super) struct LeftOut {
    pub column: String,
    pub because: String,
}

/// Sorts the columns without a role into covariates and columns left out, in the order of the file.
/// A unit of few levels, such as a district, may matter as a category too; it comes last, so that
/// it and not the covariate that it determines is then found to be one too many.
pub(super) fn entries(table: &Table, facts: &[Facts], roles: &Roles) -> (Vec<Entry>, Vec<LeftOut>) {
    let rows = table.rows();
    let mut entries = Vec::new();
    let mut left_out = Vec::new();
    let mut terms = 1;
    let has_role =
        |place: usize| [Some(roles.incidents), roles.exposure, Some(roles.unit), roles.period].contains(&Some(place));
    let unit = &facts[roles.unit];
    let unit_too =
        unit.numbers.is_none() && unit.levels.len() <= UNIT_LEVELS && rows >= ROWS_PER_TERM * unit.levels.len();
    let others = (0..facts.len()).filter(|&place| !has_role(place));
    for place in others.chain(unit_too.then_some(roles.unit)) {
        let facts = &facts[place];
        let width = facts.levels.len().saturating_sub(1);
        let found = match entry(table, facts) {
            Ok(_) if entries.len() == MOST_COVARIATES => {
                Err(format!("{MOST_COVARIATES} covariates are enough to start with; choose"))
            }
            Ok(entry) => {
                let more = if matches!(entry.kind, EntryKind::Category { .. }) {
                    width
                } else {
                    1
                };
                if ROWS_PER_TERM * (terms + more) > rows {
                    Err(format!("{rows} rows carry no more terms"))
                } else {
                    terms += more;
                    Ok(entry)
                }
            }
            Err(because) => Err(because),
        };
        match found {
            Ok(entry) => entries.push(entry),
            Err(because) => left_out.push(LeftOut {
                column: facts.name().to_owned(),
                because,
            }),
        }
    }
    (entries, left_out)
}

fn entry(table: &Table, facts: &Facts) -> Result<Entry, String> {
    let rows = table.rows();
    let levels = facts.levels.len();
    if PARAMETERS.contains(&facts.name()) {
        return Err("a parameter of the model has this name".to_owned());
    }
    if 5 * facts.gaps > rows {
        return Err(format!("{} of {rows} rows have no value", facts.gaps));
    }
    if levels <= 1 {
        return Err("it is the same in every row".to_owned());
    }
    if is_another_outcome(facts, rows) {
        return Err(
            "it is named like incidents too, and another outcome is no cause; add it if it was settled before them"
                .to_owned(),
        );
    }
    if let Some(because) = spoilt_numbers(table, facts) {
        return Err(because);
    }
    let (kind, comment) = match &facts.numbers {
        Some(numbers) if levels > FEW_VALUES => number(facts, numbers, levels)?,
        Some(numbers) => two_values(facts, numbers),
        None if levels > MOST_LEVELS => {
            return Err(format!(
                "a text with {} different values is a name or a remark",
                at_least(levels)
            ));
        }
        None => category(facts),
    };
    Ok(Entry {
        column: facts.name().to_owned(),
        kind,
        comment,
    })
}

/// Whether a column counts or measures incidents of another kind.
fn is_another_outcome(facts: &Facts, rows: usize) -> bool {
    facts.is_named(&INCIDENTS) && !facts.is_named(&LABELS) && !facts.is_named(&PROGRAMME) && facts.is_number_like(rows)
}

/// What keeps a column from being one of numbers that it is but for some cells. A few numbers
/// among a few words may be levels, but infinity and "not a number" are no levels of anything.
fn spoilt_numbers(table: &Table, facts: &Facts) -> Option<String> {
    let as_level = |row: usize| facts.column.number(row).is_none() && facts.levels.len() <= MOST_LEVELS;
    let &first = facts.no_numbers.iter().find(|&&row| !as_level(row))?;
    facts.is_number_like(table.rows()).then(|| {
        let cells = match facts.no_numbers.len() {
            1 => "1 cell is no number".to_owned(),
            many => format!("{many} cells are no numbers, the first"),
        };
        format!(
            "a column of numbers, but {cells}: {} in line {}",
            facts.column.label(first),
            table.lines[first]
        )
    })
}

/// Level counts stop at 1,001.
fn at_least(levels: usize) -> String {
    if levels > 1000 {
        "more than 1,000".to_owned()
    } else {
        levels.to_string()
    }
}

/// With the most frequent level as reference; of equal ones the first in the file.
fn category(facts: &Facts) -> (EntryKind, String) {
    let most = facts.levels.iter().map(|(_, rows)| *rows).max().unwrap_or(0);
    let reference = facts
        .levels
        .iter()
        .find(|(_, rows)| *rows == most)
        .map(|(level, _)| level.clone())
        .unwrap_or_default();
    let comment = format!("the reference is the most frequent level ({most} rows)");
    (EntryKind::Category { reference }, comment)
}

/// With the smaller value as reference, which is most often "no" or "not yet".
fn two_values(facts: &Facts, numbers: &Numbers) -> (EntryKind, String) {
    let smaller = |(level, _): &&(String, usize)| level.parse() == Ok(numbers.least);
    let reference = facts
        .levels
        .iter()
        .find(smaller)
        .map(|(level, _)| level.clone())
        .unwrap_or_default();
    let comment = format!(
        "a number of two values, of which the smaller, {}, is the reference",
        numbers.least
    );
    (EntryKind::Category { reference }, comment)
}

fn number(facts: &Facts, numbers: &Numbers, levels: usize) -> Result<(EntryKind, String), String> {
    if numbers.counts_up {
        return Err("it counts the rows".to_owned());
    }
    if facts.is_named(&["id", "key", "ref", "index"]) {
        return Err("its name says that it is a label".to_owned());
    }
    if numbers.least > 0.0 && numbers.greatest >= WIDE * numbers.least {
        let comment = format!(
            "from {} to {}, so that doublings say more than steps",
            numbers.least, numbers.greatest
        );
        return Ok((EntryKind::LogNumber, comment));
    }
    let (step, decimals) = round_step(numbers.sd).ok_or("its values differ by next to nothing")?;
    let centre = (numbers.mean / step).round() * step;
    let centre = if (numbers.least..=numbers.greatest).contains(&centre) {
        format!("{centre:.decimals$}")
    } else {
        "\"mean\"".to_owned()
    };
    let codes = numbers.whole && levels <= MOST_LEVELS;
    let comment = format!(
        "from {} to {}; the step is near one standard deviation{}",
        numbers.least,
        numbers.greatest,
        if codes {
            "; `as = \"category\"` if the values are codes"
        } else {
            ""
        }
    );
    let step = format!("{step:.decimals$}");
    Ok((EntryKind::Number { centre, step }, comment))
}

/// The largest number not above `sd` that is 1, 2 or 5 times a power of ten, and the decimals that
/// it needs; `None` outside of what reads well.
fn round_step(sd: f64) -> Option<(f64, usize)> {
    const POWERS: std::ops::RangeInclusive<i32> = -9..=12;
    let mut steps = POWERS.flat_map(|power| [1, 2, 5].map(|times| (times, power)));
    // Read from its decimals, so that 0.2 is the number that "0.2" reads as.
    let step = |(times, power): (i32, i32)| format!("{times}e{power}").parse::<f64>().unwrap_or(f64::NAN);
    let (times, power) = steps.rfind(|&of| step(of) <= sd).filter(|_| sd.is_finite())?;
    Some((step((times, power)), usize::try_from(-power).unwrap_or(0)))
}

#[cfg(test)]
mod tests {
    use super::round_step;

    #[test]
    fn a_step_is_a_round_number_below_the_standard_deviation() {
        assert_eq!(round_step(3.7), Some((2.0, 0)));
        assert_eq!(round_step(0.55), Some((0.5, 1)));
        assert_eq!(round_step(1234.0), Some((1000.0, 0)));
        assert_eq!(round_step(0.0), None);
        assert_eq!(round_step(f64::INFINITY), None);
    }
}
