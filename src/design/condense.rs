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

/// Rows are taken together where at least one in this many goes. To find the groups of 100,000 rows
/// of 20 columns costs as much as four evaluations of the negative binomial, to merge them as much
/// again; a fit takes thousands, so even one row in a hundred would pay. What saves less than a
/// tenth nobody notices, and such a design keeps its own rows: no copy, no other rounding.
const ONE_IN: usize = 10;

/// The rows of a design as the likelihood needs them: those that are alike taken together, in order
/// of first appearance, or all of them as they are where that would not pay. A function of the
/// design alone, to the last bit.
pub fn condense(design: &Design, alike: Alike) -> LikelihoodRows<'_> {
    let mut keys: Vec<&[f64]> = design.columns.iter().map(Vec::as_slice).collect();
    if alike == Alike::PatternAndExposure {
        // By its log, which is all that the likelihood sees of it.
        keys.push(&design.log_exposure);
    }
    match Groups::find(&keys, design.counts.len()) {
        Some(groups) => merge(design, alike, &groups),
        None => LikelihoodRows::of(design),
    }
}

/// One row for each group.
fn merge<'a>(design: &Design, alike: Alike, groups: &Groups) -> LikelihoodRows<'a> {
    let size = groups.firsts.len();
    let (mut counts, mut weights, mut exposure) = (vec![0.0; size], vec![0.0; size], vec![0.0; size]);
    for (row, &group) in groups.group_of.iter().enumerate() {
        let weight = design.stands_for[row];
        weights[group] += weight;
        counts[group] += weight * design.counts[row];
        exposure[group] += weight * design.exposure[row];
    }
    let log_exposure = match alike {
        Alike::Pattern => exposure.iter().zip(&weights).map(|(sum, w)| ln(sum / w)).collect(),
        Alike::PatternAndExposure => groups.of_firsts(&design.log_exposure),
    };
    let columns: Vec<Vec<f64>> = design.columns.iter().map(|column| groups.of_firsts(column)).collect();
    LikelihoodRows {
        columns: columns.into(),
        log_exposure: Cow::Owned(log_exposure),
        counts,
        weights: weights.into(),
    }
}

/// Rows of equal keys, in order of first appearance.
struct Groups {
    /// The first row of each group.
    firsts: Vec<usize>,
    /// The group of each row.
    group_of: Vec<usize>,
}

impl Groups {
    /// Groups rows by their values in the key columns; `None` where fewer than one row in [`ONE_IN`]
    /// would go.
    fn find(keys: &[&[f64]], rows: usize) -> Option<Self> {
        let most = rows - rows.div_ceil(ONE_IN);
        let groups = Groups::by_hash(&hashes(keys, rows), most)?;
        // Two hashes of 64 bits may be equal where the rows are not, in one of 10^9 tables of 10^5
        // rows. Such a table is not condensed.
        keys.iter().all(|key| groups.agree_in(key)).then_some(groups)
    }

    /// Groups rows by their hashes; `None` as soon as there are more than `most` groups.
    fn by_hash(hashes: &[u64], most: usize) -> Option<Self> {
        let rows = hashes.len();
        // Open addressing, at most half full: a slot holds a group, or `rows` where it is free.
        let mut slots = vec![rows; (2 * rows).next_power_of_two()];
        let mask = slots.len() - 1;
        let mut firsts: Vec<usize> = Vec::new();
        let mut group_of = Vec::with_capacity(rows);
        for (row, hash) in hashes.iter().enumerate() {
            let mut slot = *hash as usize & mask;
            while slots[slot] != rows && hashes[firsts[slots[slot]]] != *hash {
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

    /// Whether every row has the value of its group's first row.
    fn agree_in(&self, key: &[f64]) -> bool {
        // Gathered first: the firsts of a table that condenses fit in the cache, the column does not.
        let firsts = self.of_firsts(key);
        let mut rows = self.group_of.iter().zip(key);
        rows.all(|(&group, value)| bits(firsts[group]) == bits(*value))
    }

    /// The values of the groups' first rows.
    fn of_firsts(&self, values: &[f64]) -> Vec<f64> {
        self.firsts.iter().map(|&row| values[row]).collect()
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

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn rows_of_one_hash_that_differ_are_not_taken_together() {
        // 20 rows of (1, 2), and among them one (3, b) with b made so that its hash is theirs.
        let b = f64::from_bits(mix(bits(1.0)) ^ bits(2.0) ^ mix(bits(3.0)));
        let (mut first, mut second) = (vec![1.0; 20], vec![2.0; 20]);
        assert_eq!(Groups::find(&[&first, &second], 20).unwrap().firsts, [0]);
        (first[7], second[7]) = (3.0, b);
        let hashes = hashes(&[&first, &second], 20);
        assert!(b.is_finite() && hashes[7] == hashes[0]);
        assert!(Groups::find(&[&first, &second], 20).is_none());
    }
}
