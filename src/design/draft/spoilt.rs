//! Which cells keep a column from being what its name says.

use super::super::types::LARGEST_COUNT;
use super::look::Facts;
use super::roles::OPPORTUNITY;

/// The rows whose cells hold something that is no count.
pub(super) fn no_counts(facts: &Facts, rows: usize) -> Vec<usize> {
    broken(facts, rows, |count| {
        (0.0..=LARGEST_COUNT).contains(&count) && count.fract() == 0.0
    })
}

/// The rows whose cells hold something that is no exposure; one of 0 is left out by the draft and
/// is none of them.
pub(super) fn no_exposures(facts: &Facts, rows: usize) -> Vec<usize> {
    broken(facts, rows, |exposure| exposure.is_finite() && exposure >= 0.0)
}

fn broken(facts: &Facts, rows: usize, holds: impl Fn(f64) -> bool) -> Vec<usize> {
    (0..rows)
        .filter(|&row| !facts.is_gap(row) && !facts.column.number(row).is_some_and(&holds))
        .collect()
}

/// Whether a column with cells that are no exposure was meant as one, if its name says so too.
///
/// Many numbers below 0 are a scale of its own (centred, standardised, the time from a start). A
/// name for opportunity may also stand over `1,234` in every row; one for a duration may be a time
/// of day in every row, and is only taken as meant where few cells are at odds.
pub(super) fn meant_as_exposure(facts: &Facts, rows: usize) -> bool {
    let few = ((rows - facts.gaps) / 10).max(1);
    let broken = no_exposures(facts, rows);
    let below_zero = broken.len() - facts.no_numbers.len();
    let for_opportunity = facts.is_named(&["exposure"]) || facts.is_named(&OPPORTUNITY);
    facts.is_number_like(rows) && below_zero <= few && (for_opportunity || broken.len() <= few)
}
