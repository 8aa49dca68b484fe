//! What the draws of one parameter say, and how far simulation error reaches into it.
//!
//! Vehtari, Gelman, Simpson, Carpenter & Bürkner (2021), "Rank-normalization, folding, and
//! localization: an improved R-hat", Bayesian Analysis 16(2). Every chain is split into halves, so
//! that a chain that drifts disagrees with itself.

use super::effective::{Chains, centre, squares_about};
use crate::numeric::{beta_quantile, mean, normal_quantile, sum_of};
use std::borrow::Cow;

/// Summary of one parameter's draws, with the simulation error of each figure.
///
/// Quantiles interpolate linearly between order statistics: that of probability p lies at place
/// p (N - 1), counted from 0 (type 7 of Hyndman & Fan 1996).
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Assessment {
    /// Mean.
    pub mean: f64,
    /// Standard deviation, denominator N - 1.
    pub sd: f64,
    /// Median.
    pub median: f64,
    /// Lower end of the equal-tailed interval.
    pub lower: f64,
    /// Upper end of the equal-tailed interval.
    pub upper: f64,
    /// Monte Carlo standard error of the mean: sd over the root of the effective draws for the mean.
    pub error_of_mean: f64,
    /// Monte Carlo standard error of the standard deviation, with the effective draws of squared deviations.
    pub error_of_sd: f64,
    /// Monte Carlo standard error of the median.
    pub error_of_median: f64,
    /// Monte Carlo standard error of the lower end.
    pub error_of_lower: f64,
    /// Monte Carlo standard error of the upper end.
    pub error_of_upper: f64,
    /// Bulk effective draws: those of the rank-normalised draws.
    pub effective_draws: f64,
    /// Tail effective draws: the fewer of those for P(below the 5 % quantile) and P(below the 95 % quantile).
    pub effective_tail_draws: f64,
    /// The larger of rank-normalised and folded rank-normalised split R-hat; `None` with fewer than
    /// four draws a chain or where no chain moves at all (the effective draws then say so).
    pub split_r_hat: Option<f64>,
}

/// Assesses `values`, chain after chain in `chains` chains of equal length; `interval` is the level, say 0.95.
///
/// All values must be finite. A parameter that never moves is worth one effective draw and has no
/// R-hat; nothing here is ever NaN. Takes time proportional to N log N.
pub fn assess(values: &[f64], chains: usize, interval: f64) -> Assessment {
    let per_chain = values.len() / chains.max(1);
    let values = &values[..per_chain * chains];
    let order = Ordered::new(values);
    let at = |p: f64| quantile_of_sorted(&order.sorted, p);
    let (low, high) = (0.5 * (1.0 - interval), 0.5 * (1.0 + interval));
    let centre = centre(values);
    let sum_of_squares = squares_about(values, centre);
    let sd = (sum_of_squares / (values.len() as f64 - 1.0).max(1.0)).sqrt();
    let halves = Halves { per_chain, chains };
    let moves = order.sorted.first() < order.sorted.last();

    let indicator = |threshold: f64| {
        let below: Vec<f64> = values.iter().map(|v| f64::from(u8::from(*v <= threshold))).collect();
        if below.iter().all(|b| *b == below[0]) && moves {
            // Ties at an end: the indicator cannot move and says nothing about the chains.
            return values.len() as f64;
        }
        halves.chains(&below).effective()
    };
    let error_of_quantile = |p: f64| quantile_error(&order.sorted, indicator(at(p)), p);
    let squares: Vec<f64> = values.iter().map(|v| (v - centre) * (v - centre)).collect();

    let ranked = halves.chains(&order.rank_normalised(&halves));
    let folded = {
        let middle = quantile_of_sorted(&order.without_middles(&halves), 0.5);
        halves.chains(&order.folded_about(middle).rank_normalised(&halves))
    };
    let split_r_hat = match (halves.r_hat(&ranked), halves.r_hat(&folded)) {
        (Some(bulk), Some(tail)) => Some(bulk.max(tail)),
        (one, other) => one.or(other),
    };

    Assessment {
        mean: centre,
        sd,
        median: at(0.5),
        lower: at(low),
        upper: at(high),
        error_of_mean: sd / halves.chains(values).effective().sqrt(),
        error_of_sd: error_of_sd(&squares, halves.chains(&squares).effective()),
        error_of_median: error_of_quantile(0.5),
        error_of_lower: error_of_quantile(low),
        error_of_upper: error_of_quantile(high),
        effective_draws: ranked.effective(),
        effective_tail_draws: indicator(at(0.05)).min(indicator(at(0.95))),
        split_r_hat,
    }
}

/// The quantile of probability `p` of sorted values, by linear interpolation (type 7); 0 for none.
pub fn quantile_of_sorted(sorted: &[f64], p: f64) -> f64 {
    let Some(last) = sorted.len().checked_sub(1) else {
        return 0.0;
    };
    let place = p.clamp(0.0, 1.0) * last as f64;
    let below = (place.floor() as usize).min(last);
    let above = (below + 1).min(last);
    let share = place - below as f64;
    sorted[below] + share * (sorted[above] - sorted[below])
}

/// How chains are split: the first and the last half of each, a middle draw left out where their number is odd.
struct Halves {
    per_chain: usize,
    chains: usize,
}

impl Halves {
    fn length(&self) -> usize {
        self.per_chain / 2
    }

    /// Whether the draw at this place is the middle one that no half holds.
    fn is_middle(&self, place: usize) -> bool {
        self.per_chain % 2 == 1 && place % self.per_chain == self.length()
    }

    fn split<'a>(&self, values: &'a [f64]) -> Cow<'a, [f64]> {
        if self.per_chain.is_multiple_of(2) {
            return Cow::Borrowed(values);
        }
        let kept = values.iter().enumerate().filter(|(place, _)| !self.is_middle(*place));
        kept.map(|(_, value)| *value).collect()
    }

    /// The halves, each a chain.
    fn chains(&self, values: &[f64]) -> Chains {
        Chains::new(&self.split(values), 2 * self.chains)
    }

    fn r_hat(&self, halves: &Chains) -> Option<f64> {
        if self.per_chain < 4 { None } else { halves.r_hat() }
    }
}

/// Values in order, and where each came from.
struct Ordered {
    sorted: Vec<f64>,
    place: Vec<usize>,
}

impl Ordered {
    fn new(values: &[f64]) -> Ordered {
        // Value and place as one whole number: a comparison is then a subtraction, and no branch.
        let mut keys: Vec<u128> = (0_u128..)
            .zip(values)
            .map(|(place, value)| u128::from(ordered(value.to_bits())) << 64 | place)
            .collect();
        keys.sort_unstable();
        let sorted = keys.iter().map(|key| f64::from_bits(unordered((key >> 64) as u64)));
        Ordered {
            sorted: sorted.collect(),
            place: keys.iter().map(|key| *key as u64 as usize).collect(),
        }
    }

    /// The distances from `middle` in order. Nothing needs sorting: they fall up to it and rise beyond.
    fn folded_about(&self, middle: f64) -> Ordered {
        let distance = |k: &usize| (self.sorted[*k] - middle).abs();
        let meeting = self.sorted.partition_point(|value| *value < middle);
        let mut below = (0..meeting).rev().peekable();
        let mut above = (meeting..self.sorted.len()).peekable();
        let nearest_first = std::iter::from_fn(|| match (below.peek().map(distance), above.peek().map(distance)) {
            (Some(left), Some(right)) if left < right => below.next(),
            (Some(_), None) => below.next(),
            _ => above.next(),
        });
        let (sorted, place) = nearest_first.map(|k| (distance(&k), self.place[k])).unzip();
        Ordered { sorted, place }
    }

    fn without_middles(&self, halves: &Halves) -> Vec<f64> {
        let kept = self
            .sorted
            .iter()
            .zip(&self.place)
            .filter(|(_, place)| !halves.is_middle(**place));
        kept.map(|(value, _)| *value).collect()
    }

    /// The values replaced by normal quantiles of (rank - 3/8) / (S + 1/4), ties at their average rank; middle
    /// draws that no half holds have no rank.
    fn rank_normalised(&self, halves: &Halves) -> Vec<f64> {
        let kept: Vec<usize> = (0..self.place.len())
            .filter(|k| !halves.is_middle(self.place[*k]))
            .collect();
        let size = kept.len() as f64;
        let mut scores = vec![0.0; self.place.len()];
        let mut start = 0;
        while start < kept.len() {
            let value = self.sorted[kept[start]];
            // At least itself: a NaN, which is not meant, equals nothing and would end no loop.
            let tied = kept[start..]
                .iter()
                .take_while(|k| self.sorted[**k] == value)
                .count()
                .max(1);
            // Ranks from 1: the tied ones are start + 1 to start + tied.
            let rank = start as f64 + 0.5 * (tied as f64 + 1.0);
            let score = normal_quantile((rank - 0.375) / (size + 0.25));
            for k in &kept[start..start + tied] {
                scores[self.place[*k]] = score;
            }
            start += tied;
        }
        scores
    }
}

/// The bits of a float as a whole number in the order of the floats, as `f64::total_cmp` has it.
fn ordered(bits: u64) -> u64 {
    bits ^ (((bits as i64) >> 63) as u64 | 1 << 63)
}

/// What [`ordered`] made the number of.
fn unordered(number: u64) -> u64 {
    number ^ (((!number as i64) >> 63) as u64 | 1 << 63)
}

/// Monte Carlo error of the sd by the delta method: Var(s^2) = (E d^4 - (E d^2)^2) / effective, Var(s) = Var(s^2) / (4 s^2).
fn error_of_sd(squares: &[f64], effective: f64) -> f64 {
    let variance = mean(squares);
    if variance <= 0.0 {
        return 0.0;
    }
    let fourth = sum_of(squares, |square| square * square) / squares.len() as f64;
    let spread = (fourth - variance * variance).max(0.0);
    (spread / effective / variance / 4.0).sqrt()
}

/// Monte Carlo error of a quantile: half the width of the central 68.27 % of its sampling distribution.
///
/// Vehtari et al. (2021), section 4.4: with S effective draws for P(below the quantile), the
/// probability that really lies below it is Beta(S p + 1, S (1 - p) + 1); its two quantiles are
/// read off the ordered draws, outwards to the next one.
fn quantile_error(sorted: &[f64], effective: f64, p: f64) -> f64 {
    let size = sorted.len() as f64;
    let place =
        |probability: f64| beta_quantile(probability, effective * p + 1.0, effective * (1.0 - p) + 1.0) * size - 1.0;
    let last = sorted.len().saturating_sub(1);
    let low = place(0.158_655_3).max(0.0).floor() as usize;
    let high = place(0.841_344_7).max(0.0).ceil() as usize;
    match (sorted.get(low.min(last)), sorted.get(high.min(last))) {
        (Some(low), Some(high)) => 0.5 * (high - low),
        _ => 0.0,
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    /// By the standard library's own sort, at the values where an order by bits could go wrong.
    #[test]
    fn the_order_is_that_of_the_floats() {
        let values = [1.5, -0.0, 3e-320, 0.0, -1e308, -1.5, 1e308, -3e-320, 1.5];
        let order = Ordered::new(&values);
        let mut pairs: Vec<(f64, usize)> = values.iter().copied().zip(0..).collect();
        pairs.sort_by(|a, b| a.0.total_cmp(&b.0).then(a.1.cmp(&b.1)));
        let bits = |sorted: &[f64]| sorted.iter().map(|value| value.to_bits()).collect::<Vec<_>>();
        let (sorted, place): (Vec<f64>, Vec<usize>) = pairs.into_iter().unzip();
        assert_eq!(bits(&order.sorted), bits(&sorted));
        assert_eq!(order.place, place);
    }

    /// By sorting them: from a middle inside, at an end, between and outside of the values.
    #[test]
    fn folded_values_are_in_order() {
        let values = [2.0, -1.0, 0.5, 2.0, 7.0, 0.5, -3.25];
        for middle in [0.5, -3.25, 7.0, 1.0, 90.0, -90.0] {
            let folded = Ordered::new(&values).folded_about(middle);
            let mut distances: Vec<f64> = values.iter().map(|value| (value - middle).abs()).collect();
            for (distance, place) in folded.sorted.iter().zip(&folded.place) {
                assert_eq!(*distance, distances[*place]);
            }
            distances.sort_by(f64::total_cmp);
            assert_eq!(folded.sorted, distances);
        }
    }
}
