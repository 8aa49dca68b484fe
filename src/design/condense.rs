//! Rows that the likelihood cannot tell apart, taken together: a table of a hundred thousand rows
//! of categories may be a few hundred patterns, and every evaluation then costs that many rows.
//!
//! The sums are exact, not an approximation. Take rows i of one linear predictor without offset,
//! eta, with exposures e, counts y, each standing for w rows.
//!
//! * Poisson: `sum w (y (eta + log e) - e exp(eta))` depends on these rows only through `Y = sum w y`
//!   and `sum w e`, so rows of one *pattern* (the same coded columns) merge. With `W = sum w` and
//!   their mean exposure, `E = sum w e / W`, the sum is `Y eta - W E exp(eta)` and a constant.
//! * Negative binomial: rows of one pattern and one exposure share their mean mu, so that
//!   `sum w (y + 1/a) log(1 + a mu) = (Y + W/a) log(1 + a mu)`. The count need not be the same: what
//!   else depends on it depends on no coefficient.
//!
//! What depends on counts and exposures but not on the predictor (`y log e`, `log y!`, the rising
//! factorials of the negative binomial) the model takes from the original rows; so do all checks,
//! remarks and tables of units.

use super::types::Design;
use crate::numeric::ln;
use std::borrow::Cow;

/// What rows must have in common to be taken together.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Alike {
    /// The coded columns: enough for the Poisson.
    Pattern,
    /// The coded columns and the exposure, as the negative binomial needs.
    PatternAndExposure,
}

/// The rows of a likelihood. In either family a row's mean is `exp(log_exposure + baseline +
/// columns times coefficients)`, and the expected count of all that it stands for is its weight
/// times that.
#[derive(Debug, Clone, PartialEq)]
pub struct LikelihoodRows<'a> {
    /// One for each term, each of one value a row.
    pub columns: Cow<'a, [Vec<f64>]>,
    /// Log of the exposure; of the mean exposure where rows of several were taken together.
    pub log_exposure: Cow<'a, [f64]>,
    /// Incidents in all that the row stands for: Y, the sum of weighted counts.
    pub counts: Vec<f64>,
    /// How many rows of the study it stands for: W.
    pub weights: Cow<'a, [f64]>,
}

impl<'a> LikelihoodRows<'a> {
    /// The design's own rows, none taken together.
    pub fn of(design: &'a Design) -> Self {
        let weighted = design.counts.iter().zip(&design.stands_for).map(|(y, w)| w * y);
        LikelihoodRows {
            columns: Cow::Borrowed(&design.columns),
            log_exposure: Cow::Borrowed(&design.log_exposure),
            counts: weighted.collect(),
            weights: Cow::Borrowed(&design.stands_for),
        }
    }

    /// Number of rows.
    pub fn rows(&self) -> usize {
        self.counts.len()
    }
}

/// Condensing pays where at least one row in this many goes. To find the groups costs as much as
/// one to three evaluations of the likelihood, and a fit takes hundreds; a design that loses fewer rows
/// than this keeps its own, which need no copy and stay as they were read.
const ONE_IN: usize = 10;

/// The rows of a design as the likelihood needs them: those that are alike taken together, in order
/// of first appearance, or all of them as they are where that would not pay. A function of the
/// design alone, to the last bit.
pub fn condense(design: &Design, alike: Alike) -> LikelihoodRows<'_> {
    let rows = design.counts.len();
    match Groups::find(design, alike, rows - rows.div_ceil(ONE_IN)) {
        Some(groups) => groups.merge(design, alike),
        None => LikelihoodRows::of(design),
    }
}

/// Rows that are alike, in order of first appearance.
struct Groups {
    /// The first row of each group.
    firsts: Vec<usize>,
    /// The group of each row.
    group_of: Vec<usize>,
}

impl Groups {
    /// Groups the rows; `None` as soon as there are more than `most` groups.
    fn find(design: &Design, alike: Alike, most: usize) -> Option<Self> {
        let mut keys: Vec<&[f64]> = design.columns.iter().map(Vec::as_slice).collect();
        if alike == Alike::PatternAndExposure {
            // By its log, which is all that the likelihood sees of it.
            keys.push(&design.log_exposure);
        }
        let rows = design.counts.len();
        let hashes = hashes(&keys, rows);
        let same = |a: usize, b: usize| hashes[a] == hashes[b] && keys.iter().all(|key| bits(key[a]) == bits(key[b]));
        // Open addressing, at most half full: a slot holds a group, or `rows` where it is free.
        let mut slots = vec![rows; (2 * rows).next_power_of_two()];
        let mask = slots.len() - 1;
        let mut firsts: Vec<usize> = Vec::new();
        let mut group_of = Vec::with_capacity(rows);
        for row in 0..rows {
            let mut slot = hashes[row] as usize & mask;
            while slots[slot] != rows && !same(firsts[slots[slot]], row) {
                slot = (slot + 1) & mask;
            }
            if slots[slot] == rows {
                if firsts.len() == most {
                    return None;
                }
                slots[slot] = firsts.len();
                firsts.push(row);
            }
            group_of.push(slots[slot]);
        }
        Some(Groups { firsts, group_of })
    }

    /// One row for each group.
    fn merge<'a>(&self, design: &Design, alike: Alike) -> LikelihoodRows<'a> {
        let groups = self.firsts.len();
        let (mut counts, mut weights, mut exposure) = (vec![0.0; groups], vec![0.0; groups], vec![0.0; groups]);
        for (row, &group) in self.group_of.iter().enumerate() {
            let weight = design.stands_for[row];
            weights[group] += weight;
            counts[group] += weight * design.counts[row];
            exposure[group] += weight * design.exposure[row];
        }
        let of_firsts = |values: &[f64]| -> Vec<f64> { self.firsts.iter().map(|&row| values[row]).collect() };
        let log_exposure = match alike {
            Alike::Pattern => exposure.iter().zip(&weights).map(|(sum, w)| ln(sum / w)).collect(),
            Alike::PatternAndExposure => of_firsts(&design.log_exposure),
        };
        let columns: Vec<Vec<f64>> = design.columns.iter().map(|column| of_firsts(column)).collect();
        LikelihoodRows {
            columns: columns.into(),
            log_exposure: Cow::Owned(log_exposure),
            counts,
            weights: weights.into(),
        }
    }
}

/// A hash for each row of the key columns. Column by column, as they lie in memory; no random
/// seed, so that the same design takes the same way through the slots on every run.
fn hashes(keys: &[&[f64]], rows: usize) -> Vec<u64> {
    let mut hashes = vec![0; rows];
    for key in keys {
        for (hash, value) in hashes.iter_mut().zip(*key) {
            *hash = mix(*hash ^ bits(*value));
        }
    }
    hashes
}

/// The bits of a value, those of 0 for -0: the two give the same mean.
fn bits(value: f64) -> u64 {
    // -0 + 0 is 0 in round-to-nearest; every other value stays as it is.
    (value + 0.0).to_bits()
}

/// Every bit of the result depends on every bit of the argument (the last step of SplitMix64:
/// Steele, Lea & Flood 2014, Fast splittable pseudorandom number generators; constants from
/// memory). Coded columns of 0 and 1 differ in their high bits only and slots are chosen by the
/// low ones, so a bare product would put all rows in one slot.
fn mix(x: u64) -> u64 {
    let x = (x ^ (x >> 30)).wrapping_mul(0xbf58_476d_1ce4_e5b9);
    let x = (x ^ (x >> 27)).wrapping_mul(0x94d0_49bb_1331_11eb);
    x ^ (x >> 31)
}
