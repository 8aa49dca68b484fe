//! The part of the negative binomial's log likelihood that depends on the counts and the scatter
//! alone: the sum over rows of `log(Gamma(y + 1/a) / Gamma(1/a)) + y log a`, with a = c^2.
//!
//! For a whole count it is `sum_{j < y} log(1 + a j)`, so over all rows it is
//! `sum_j n_j log(1 + a j)` with n_j the number of counts above j: one short table instead of two
//! log-gammas a row, and no cancellation as a goes to 0 (Lawless 1987, Canadian Journal of
//! Statistics 15, 209-225, writes the likelihood so). Above [`TABLE`] counts take a log-gamma difference
//! that is stable for small a, and where they are many, nodes take their place (see [`on_nodes`]).

use super::blocks::{Eight, LANES};
use super::kernel::{self, Instructions};
use crate::numeric::ln_rising;
use std::collections::BTreeMap;

/// Counts up to here are served by the table.
const TABLE: usize = 1_024;

/// Counts up to here, and those that are few in their range, are taken as they are.
const AS_THEY_ARE: u64 = 1_040;
/// A range of counts ends at this multiple of its beginning.
const RANGE: f64 = 1.25;
/// The positive nodes of Chebyshev's interpolation by 12: cos((2i + 1) pi / 24).
const NODES: [f64; 6] = [
    0.991_444_861_373_810_4,
    0.923_879_532_511_286_8,
    0.793_353_340_291_235_2,
    0.608_761_429_008_720_6,
    0.382_683_432_365_089_8,
    0.130_526_192_220_051_6,
];

/// How often each count occurs, as the likelihood needs it.
#[derive(Debug, Clone)]
pub struct CountTable {
    /// Entry j, eight to a chunk: rows with a count above j, each as often as it stands for others.
    above: Vec<Eight>,
    /// Counts above [`TABLE`], or nodes in place of many, and how often each counts.
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
        let large: Vec<(f64, f64)> = occurrences
            .range(TABLE as u64 + 1..)
            .map(|(count, times)| (*count as f64, *times))
            .collect();
        let large = on_nodes(&large);
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

/// Counts and how often each occurs, rising; where more than twelve fall into one range, twelve nodes with
/// weights that give the same sums.
///
/// As a function of the count y the part is log Gamma(y + 1/a) and terms linear in y: smooth, its nearest
/// singularity at -1/a. On a range from y to 1.25 y the polynomial through twelve Chebyshev nodes is
/// right to 17.9^-12 = 1e-15 of it (Trefethen 2013, Approximation Theory and Approximation Practice,
/// theorem 8.2: the range is seen from 0 under rho = 9 + sqrt(80)), and so are its derivatives by a. The sum
/// over the counts of that polynomial is a weighted sum of its values at the nodes, whatever a: twenty
/// thousand different counts cost as much as three hundred.
fn on_nodes(counts: &[(f64, f64)]) -> Vec<(f64, f64)> {
    let (few, mut rest) = counts.split_at(counts.partition_point(|(count, _)| *count <= AS_THEY_ARE as f64));
    let mut out = few.to_vec();
    while let Some((first, _)) = rest.first() {
        let (range, beyond) = rest.split_at(rest.partition_point(|(count, _)| *count <= RANGE * first));
        if range.len() <= 2 * NODES.len() {
            out.extend(range);
        } else {
            out.extend(nodes_of(range));
        }
        rest = beyond;
    }
    out
}

/// The nodes of one range and their weights: the sum over its counts of each node's Lagrange polynomial.
fn nodes_of(range: &[(f64, f64)]) -> Vec<(f64, f64)> {
    let (lowest, highest) = (range[0].0, range[range.len() - 1].0);
    let (middle, half) = (0.5 * (lowest + highest), 0.5 * (highest - lowest));
    let at: Vec<f64> = NODES.iter().flat_map(|node| [-node, *node]).collect();
    let weight = |node: usize| -> f64 {
        let others = || {
            at.iter()
                .enumerate()
                .filter(move |(other, _)| *other != node)
                .map(|(_, at)| *at)
        };
        let scale: f64 = others().map(|other| at[node] - other).product();
        let of_count = |count: f64| -> f64 { others().map(|other| (count - middle) / half - other).product() };
        range.iter().map(|(count, times)| times * of_count(*count)).sum::<f64>() / scale
    };
    (0..at.len())
        .map(|node| (middle + half * at[node], weight(node)))
        .collect()
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::numeric::{Purpose, Stream, exp};

    #[test]
    fn nodes_give_the_sums_of_the_counts_that_they_stand_for() {
        let mut stream = Stream::new(4, Purpose::Simulation, 0);
        let counts: Vec<f64> = (0..6_000)
            .map(|_| (1_025.0 * exp(11.0 * stream.uniform())).floor())
            .collect();
        let weights: Vec<f64> = (0..6_000).map(|row| f64::from(1 + row % 3)).collect();
        let table = CountTable::new(&counts, &weights);
        assert!(table.large.len() < 1_000, "{}", table.large.len());
        for a in [1e-30, 1e-12, 1e-6, 1e-3, 0.2, 1.0, 30.0, 2_500.0] {
            let here = table.derivatives(a, Instructions::widest());
            let mut direct = CountPart {
                value: 0.0,
                first: 0.0,
                second: 0.0,
            };
            for (count, weight) in counts.iter().zip(&weights) {
                let rising = ln_rising(0.0, *count, a);
                direct.value += weight * rising.value;
                direct.first += weight * rising.slope;
                direct.second += weight * rising.curvature;
            }
            for (node, count) in [
                (here.value, direct.value),
                (here.first, direct.first),
                (here.second, direct.second),
            ] {
                assert!((node / count - 1.0).abs() < 2e-13, "a = {a:e}: {node:e} for {count:e}");
            }
        }
    }
}
