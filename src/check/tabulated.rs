//! The distribution function of a mixture of Poissons, tabulated from 0 as far as it is asked for.

use crate::numeric::exp;

/// Counts that are tabulated in one go: their probabilities under one mean are then side by side,
/// and are added to their sums by vector instructions.
const BLOCK: usize = 8;
/// Where, beyond the mean, a probability falls below this, nothing is left that a sum could show.
const NOTHING: f64 = 1e-25;

/// P(k or fewer) for k from 0, the average over Poissons about given means.
///
/// P(k + 1) = P(k) mean / (k + 1) takes a multiplication for each count and mean, where the
/// distribution function itself takes a sum. Only the counts up to the largest that anybody asks about
/// are ever tabulated: a third of those up to where the last probability vanishes.
pub(super) struct Tabulated {
    /// For each mean, the probability of the first count that is not in the table yet; 0 where
    /// nothing is left.
    next: Vec<f64>,
    /// P(k or fewer) for k from 0.
    at_most: Vec<f64>,
    /// Counts that the table can hold: beyond them less than 1e-20 is left under any mean.
    most_counts: usize,
}

impl Tabulated {
    /// For these means, the largest of them `most`; every one finite. The other calls take the same means.
    pub(super) fn new(means: &[f64], most: f64) -> Tabulated {
        Tabulated {
            next: means.iter().map(|mean| exp(-mean)).collect(),
            at_most: Vec::new(),
            most_counts: (most + 12.0 * most.sqrt() + 40.0) as usize,
        }
    }

    /// How many counts, from 0, the table can tell about.
    pub(super) fn most_counts(&self) -> usize {
        self.most_counts
    }

    /// P(count or fewer), for a count below [`Tabulated::most_counts`].
    pub(super) fn at_most(&mut self, count: usize, means: &[f64]) -> f64 {
        while self.at_most.len() <= count {
            self.extend(means);
        }
        self.at_most[count]
    }

    /// The smallest count whose distribution function is at least `p`; [`Tabulated::most_counts`] where none is.
    pub(super) fn smallest_reaching(&mut self, p: f64, means: &[f64]) -> usize {
        while self.at_most.len() < self.most_counts && self.at_most.last().is_none_or(|reached| *reached < p) {
            self.extend(means);
        }
        self.at_most.partition_point(|reached| *reached < p)
    }

    /// Tabulates the next block of counts.
    fn extend(&mut self, means: &[f64]) {
        let from = self.at_most.len();
        let reciprocals: [f64; BLOCK] = std::array::from_fn(|k| 1.0 / (from + k + 1) as f64);
        let last = (from + BLOCK - 1) as f64;
        let mut sums = [0.0; BLOCK];
        for (mean, next) in means.iter().zip(&mut self.next) {
            let mut probabilities = [0.0; BLOCK];
            for k in 0..BLOCK {
                probabilities[k] = *next;
                *next *= mean * reciprocals[k];
            }
            // Beyond the mean they only fall, so the last one tells whether any has vanished.
            if *next < NOTHING && last > *mean {
                *next = 0.0;
                for k in 1..BLOCK {
                    if probabilities[k] < NOTHING && (from + k - 1) as f64 > *mean {
                        probabilities[k] = 0.0;
                    }
                }
            }
            for k in 0..BLOCK {
                sums[k] += probabilities[k];
            }
        }
        let mut below = self.at_most.last().copied().unwrap_or(0.0);
        let share = 1.0 / means.len().max(1) as f64;
        for sum in &sums[..BLOCK.min(self.most_counts - from)] {
            below += sum * share;
            self.at_most.push(below);
        }
    }
}
