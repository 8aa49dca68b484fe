//! The part of the negative binomial's log likelihood that depends on the counts and the scatter
//! alone: the sum over rows of `log(Gamma(y + 1/a) / Gamma(1/a)) + y log a`, with a = c^2.
//!
//! For a whole count it is `sum_{j < y} log(1 + a j)`, so over all rows it is
//! `sum_j n_j log(1 + a j)` with n_j the number of counts above j: one short table instead of two
//! log-gammas a row, and no cancellation as a goes to 0 (Lawless 1987, Canadian Journal of
//! Statistics 15, 209-225, writes the likelihood so). Above [`TABLE`] the few counts left take a
//! log-gamma difference that is stable for small a.

use super::blocks::{Eight, LANES};
use super::kernel::{self, Instructions};
use crate::numeric::ln_rising;
use std::collections::BTreeMap;

/// Counts up to here are served by the table.
const TABLE: usize = 1_024;

/// How often each count occurs, as the likelihood needs it.
#[derive(Debug, Clone)]
pub struct CountTable {
    /// Entry j, eight to a chunk: rows with a count above j, each as often as it stands for others.
    above: Vec<Eight>,
    /// Counts above [`TABLE`] and how often each occurs.
    large: Vec<(f64, f64)>,
}

/// Value of the part and its first two derivatives by a.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct CountPart {
    /// The part itself.
    pub value: f64,
    /// First derivative by a.
    pub first: f64,
    /// Second derivative by a.
    pub second: f64,
}

impl CountTable {
    /// Counts the counts; `weights` says how many rows each stands for.
    pub fn new(counts: &[f64], weights: &[f64]) -> Self {
        let mut occurrences: BTreeMap<u64, f64> = BTreeMap::new();
        for (count, weight) in counts.iter().zip(weights) {
            *occurrences.entry(*count as u64).or_insert(0.0) += weight;
        }
        let longest = occurrences
            .keys()
            .next_back()
            .map_or(0, |count| (*count as usize).min(TABLE));
        // From the largest count down: rows above j are those of count j + 1 and those above it.
        let mut above = vec![Eight::ZERO; longest.div_ceil(LANES)];
        let mut rows: f64 = occurrences.range(longest as u64 + 1..).map(|(_, times)| times).sum();
        for j in (0..longest).rev() {
            rows += occurrences.get(&(j as u64 + 1)).unwrap_or(&0.0);
            above[j / LANES].0[j % LANES] = rows;
        }
        let large = occurrences
            .range(TABLE as u64 + 1..)
            .map(|(count, times)| (*count as f64, *times))
            .collect();
        CountTable { above, large }
    }

    /// The part at a = c^2.
    pub fn value(&self, a: f64, instructions: Instructions) -> f64 {
        let mut sum = kernel::sum_of_count_logs(instructions, &self.above, a);
        for (count, times) in &self.large {
            sum += times * ln_rising(TABLE as f64, *count, a).value;
        }
        sum
    }

    /// The part and its derivatives at a = c^2.
    pub fn derivatives(&self, a: f64, instructions: Instructions) -> CountPart {
        let mut part = CountPart {
            value: self.value(a, instructions),
            first: 0.0,
            second: 0.0,
        };
        for (j, rows) in self.above.iter().flat_map(|chunk| chunk.0).enumerate() {
            let j = j as f64;
            let share = j / (1.0 + a * j);
            part.first += rows * share;
            part.second -= rows * share * share;
        }
        for (count, times) in &self.large {
            let rising = ln_rising(TABLE as f64, *count, a);
            part.first += times * rising.slope;
            part.second += times * rising.curvature;
        }
        part
    }
}
