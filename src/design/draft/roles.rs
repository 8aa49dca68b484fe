//! Which column of an unprepared table is probably the count, the exposure, the unit, the period.

use super::super::types::LARGEST_COUNT;
use super::look::Facts;
use super::spoilt::{meant_as_exposure, no_counts, no_exposures};
use crate::table::{Column, Table};
use std::collections::HashSet;

/// Words for what is counted.
pub(super) const INCIDENTS: [&str; 42] = [
    "incident",
    "incidents",
    "fall",
    "falls",
    "claim",
    "claims",
    "event",
    "events",
    "case",
    "cases",
    "injury",
    "injuries",
    "slip",
    "slips",
    "accident",
    "accidents",
    "crash",
    "crashes",
    "collision",
    "collisions",
    "complaint",
    "complaints",
    "death",
    "deaths",
    "error",
    "errors",
    "failure",
    "failures",
    "absence",
    "absences",
    "theft",
    "thefts",
    "fire",
    "fires",
    "bite",
    "bites",
    "infection",
    "infections",
    "breach",
    "breaches",
    "casualty",
    "casualties",
];
/// Words that fit a count and much else.
const COUNTS: [&str; 8] = ["count", "counts", "number", "total", "n", "y", "tally", "outcome"];
/// Words for opportunity.
pub(super) const OPPORTUNITY: [&str; 40] = [
    "population",
    "visits",
    "holders",
    "service",
    "boardings",
    "swims",
    "residents",
    "members",
    "trips",
    "journeys",
    "passengers",
    "attendance",
    "attendances",
    "patients",
    "beds",
    "admissions",
    "km",
    "kilometres",
    "miles",
    "vehicles",
    "employees",
    "workers",
    "pupils",
    "students",
    "rides",
    "lessons",
    "flights",
    "customers",
    "swimmers",
    "guests",
    "tickets",
    "users",
    "households",
    "dwellings",
    "persons",
    "people",
    "opportunities",
    "sailings",
    "landings",
    "calls",
];
/// Words for time, which may be opportunity or not.
const DURATION: [&str; 8] = ["hours", "years", "days", "nights", "weeks", "months", "minutes", "time"];
/// Words for a point in time.
const WHEN: [&str; 11] = [
    "period", "month", "year", "quarter", "week", "date", "day", "time", "wave", "round", "season",
];
/// Words for the things that rows belong to.
const UNITS: [&str; 26] = [
    "unit", "site", "place", "landing", "pool", "school", "ward", "clinic", "facility", "location", "station", "store",
    "branch", "team", "hospital", "district", "area", "depot", "plant", "shop", "home", "office", "centre", "name",
    "id", "code",
];
/// Words for a label that is no measure.
pub(super) const LABELS: [&str; 7] = ["id", "code", "key", "ref", "index", "row", "nr"];
/// Cells longer than this on average are remarks and not names.
const LONG: f64 = 40.0;
/// A guess below this is none.
const LEAST_SCORE: i32 = -50;

/// The columns that are probably meant, as places in the table.
pub(super) struct Roles {
    pub incidents: usize,
    /// Whether the name of the count speaks for it.
    pub incidents_named: bool,
    pub exposure: Option<usize>,
    pub unit: usize,
    pub period: Option<usize>,
}

/// Why a draft cannot be written.
pub(super) enum NoRole {
    Incidents,
    /// The column that is named like an exposure, and the rows whose cells are none.
    Exposure {
        place: usize,
        rows: Vec<usize>,
    },
    Unit,
}

/// Guesses the roles.
pub(super) fn roles(table: &Table, facts: &[Facts]) -> Result<Roles, NoRole> {
    let rows = table.rows();
    let scored = |score: &dyn Fn(&Facts) -> Option<i32>, taken: &[usize]| {
        let free = (0..facts.len()).filter(|place| !taken.contains(place));
        let scores = free.filter_map(|place| Some((score(&facts[place])?, place)));
        // The best score, and of equal ones the first column.
        scores.max_by_key(|&(score, place)| (score, std::cmp::Reverse(place)))
    };
    let (best, incidents) = scored(&|facts| incidents_score(facts, rows), &[]).ok_or(NoRole::Incidents)?;
    // Where the column that is named for the counts is spoilt, another one must not step in.
    let instead = !facts[incidents].is_named(&INCIDENTS)
        && facts.iter().any(|facts| {
            facts.is_named(&INCIDENTS)
                && !facts.is_named(&LABELS)
                && facts.is_number_like(rows)
                && !no_counts(facts, rows).is_empty()
        });
    if best <= LEAST_SCORE || instead {
        return Err(NoRole::Incidents);
    }
    let exposure = scored(&|facts| exposure_score(facts, rows), &[incidents]).map(|(_, place)| place);
    if let Some(place) = exposure {
        let spoilt = no_exposures(&facts[place], rows);
        if !spoilt.is_empty() {
            return Err(NoRole::Exposure { place, rows: spoilt });
        }
    }
    let taken: Vec<usize> = exposure.into_iter().chain([incidents]).collect();
    let (_, unit) = scored(&|facts| unit_score(facts, rows), &taken).ok_or(NoRole::Unit)?;
    let orders = |place: &usize| !taken.contains(place) && *place != unit && orders_units(table, facts, unit, *place);
    Ok(Roles {
        incidents,
        incidents_named: facts[incidents].is_named(&INCIDENTS),
        exposure,
        unit,
        period: (0..facts.len()).find(orders),
    })
}

/// Whether a column could hold counts at all: whole numbers from 0, and more than half of them there.
fn incidents_score(facts: &Facts, rows: usize) -> Option<i32> {
    let numbers = facts.numbers.as_ref()?;
    if !numbers.whole || numbers.least < 0.0 || numbers.greatest > LARGEST_COUNT || 2 * facts.gaps > rows {
        return None;
    }
    let rules = [
        (facts.is_named(&INCIDENTS), 100),
        (facts.is_named(&COUNTS), 40),
        (facts.is_named(&LABELS), -200),
        (facts.is_named(&WHEN), -100),
        (facts.is_named(&OPPORTUNITY) || facts.is_named(&["exposure"]), -100),
        (numbers.counts_up, -100),
        (numbers.least >= 1900.0 && numbers.greatest <= 2100.0, -100),
        (facts.levels.len() <= 2, -10),
        (numbers.least == 0.0, 5),
        (numbers.mean > 1000.0, -5),
    ];
    Some(points(&rules))
}

/// Spoilt columns are scored too: one that is named for the exposure must not be passed over in
/// silence for a cell that is none.
fn exposure_score(facts: &Facts, rows: usize) -> Option<i32> {
    let spoilt = !no_exposures(facts, rows).is_empty();
    let could_be = match &facts.numbers {
        Some(numbers) if !spoilt => numbers.greatest > 0.0 && !numbers.counts_up,
        _ => meant_as_exposure(facts, rows),
    };
    if !could_be || 2 * facts.gaps > rows {
        return None;
    }
    let rules = [
        (facts.is_named(&["exposure"]), 100),
        (facts.is_named(&OPPORTUNITY), 50),
        (facts.is_named(&DURATION), 20),
        (facts.is_named(&LABELS), -200),
        (spoilt, -1),
    ];
    Some(points(&rules)).filter(|&score| score > 0)
}

fn unit_score(facts: &Facts, rows: usize) -> Option<i32> {
    let fractional = facts.numbers.as_ref().is_some_and(|numbers| !numbers.whole);
    if fractional || 2 * facts.gaps > rows {
        return None;
    }
    let counts_up = facts.numbers.as_ref().is_some_and(|numbers| numbers.counts_up);
    let rules = [
        (facts.is_named(&UNITS), 50),
        (facts.is_named(&WHEN), -60),
        (facts.numbers.is_none(), 20),
        (facts.numbers.is_some() && !counts_up, -40),
        (facts.levels.len() > 10, 15),
        (facts.levels.len() == rows, 5),
        (facts.levels.len() < 2 && rows > 1, -40),
        (facts.gaps > 0, -30),
        (facts.length > LONG, -60),
    ];
    Some(points(&rules))
}

/// Whether a column is named like a time and sets apart all rows of each unit.
fn orders_units(table: &Table, facts: &[Facts], unit: usize, place: usize) -> bool {
    let (unit, period) = (&facts[unit], &facts[place]);
    if !period.is_named(&WHEN) || period.gaps > 0 || unit.levels.len() == table.rows() {
        return false;
    }
    let mut seen = HashSet::new();
    let mut units = HashSet::new();
    let apart = (0..table.rows()).all(|row| {
        let unit = unit.column.label(row);
        units.insert(unit.clone());
        seen.insert((unit, period.column.label(row)))
    });
    apart && units.len() < table.rows()
}

fn points(rules: &[(bool, i32)]) -> i32 {
    rules.iter().filter(|(holds, _)| *holds).map(|(_, points)| points).sum()
}

/// For each column that is named like a count and holds none: the row of its first cell that is no count.
pub(super) fn spoilt_counts<'t>(facts: &[Facts<'t>], rows: usize) -> Vec<(&'t Column, usize)> {
    facts
        .iter()
        .filter(|facts| facts.is_named(&INCIDENTS) || facts.is_named(&COUNTS))
        .filter_map(|facts| Some((facts.column, *no_counts(facts, rows).first()?)))
        .collect()
}
