//! The predictive distribution of a count, given for each posterior draw the mean of a Poisson.

use super::tabulated::Tabulated;
use crate::fit::quantile_of_sorted;
use crate::numeric::{PoissonCount, mean, sum_with};

/// Up to this largest mean the distribution is tabulated count by count; above it, searched.
const TABULATED_TO: f64 = 200.0;

/// A count's predictive distribution: the average of Poissons about these means.
pub(super) struct Predictive {
    means: Vec<f64>,
    shape: Shape,
}

/// What finds the quantiles of a [`Predictive`].
enum Shape {
    /// P(k or fewer) for k from 0.
    Table(Tabulated),
    /// A few means that stand for groups of neighbouring ones, and the standard deviation of the count by them.
    Coarse(Vec<f64>, f64),
}

/// A quantile of a count.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Reached {
    /// The smallest count at which the distribution function reaches the probability asked for.
    pub(super) count: f64,
    /// P(count or fewer).
    pub(super) reached: f64,
    /// P(fewer).
    pub(super) below: f64,
}

/// Where a count lies in its predictive distribution.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Tail {
    /// P(fewer) + P(exactly as many) / 2: the mid-p tail probability.
    pub(super) probability: f64,
    /// Monte Carlo standard error of that probability.
    pub(super) error: f64,
}

impl Predictive {
    /// From the mean under each draw; every one finite.
    pub(super) fn new(means: Vec<f64>) -> Predictive {
        let most = means.iter().copied().fold(0.0, f64::max);
        let shape = if most <= TABULATED_TO {
            Shape::Table(Tabulated::new(&means, most))
        } else {
            coarse(&means)
        };
        Predictive { means, shape }
    }

    /// P(count or fewer). (What had to be tabulated for it is kept.)
    pub(super) fn at_most(&mut self, count: f64) -> f64 {
        if count < 0.0 {
            return 0.0;
        }
        match &mut self.shape {
            Shape::Table(table) if count < table.most_counts() as f64 => table.at_most(count as usize, &self.means),
            _ => at_most(&self.means, count),
        }
    }

    /// The mid-p tail probability of a count, and its simulation error: its spread over draws, taken
    /// from `at_most` of them.
    pub(super) fn tail(&mut self, count: f64, at_most: usize) -> Tail {
        let fewer = PoissonCount::new(count - 1.0);
        let exactly = PoissonCount::new(count).pmf_each(&self.means);

        let used = self.means.len().min(at_most);
        let tails: Vec<f64> = (0..used)
            .map(|k| k * self.means.len() / used)
            .map(|k| fewer.cdf_before(self.means[k], exactly[k]) + 0.5 * exactly[k])
            .collect();
        let centre = mean(&tails);
        let squares: Vec<f64> = tails.iter().map(|tail| (tail - centre) * (tail - centre)).collect();
        Tail {
            // Two roundings can add up to a hair above 1.
            probability: (self.at_most(count - 1.0) + 0.5 * mean(&exactly)).min(1.0),
            error: (mean(&squares) / self.means.len() as f64).sqrt(),
        }
    }

    /// The smallest count whose distribution function is at least `p`, exact over the draws.
    pub(super) fn smallest_reaching(&mut self, p: f64) -> Reached {
        match &mut self.shape {
            Shape::Table(table) => {
                let count = table.smallest_reaching(p, &self.means) as f64;
                Reached {
                    count,
                    reached: self.at_most(count),
                    below: self.at_most(count - 1.0),
                }
            }
            Shape::Coarse(coarse, sd) => {
                let most = coarse.last().copied().unwrap_or(0.0);
                let rough = search(p, most.floor(), (0.25 * *sd).floor(), |count| at_most(coarse, count));
                let means = &self.means;
                search(p, rough.count, (0.02 * *sd).floor(), |count| at_most(means, count))
            }
        }
    }
}

fn coarse(means: &[f64]) -> Shape {
    let mut sorted = means.to_vec();
    sorted.sort_unstable_by(f64::total_cmp);
    let groups = 48;
    let middles = (0..groups).map(|g| quantile_of_sorted(&sorted, (f64::from(g) + 0.5) / f64::from(groups)));
    let coarse: Vec<f64> = middles.collect();
    // Of the coarse means, so that one wild draw does not set the step of the search.
    let centre = mean(&coarse);
    let squares: Vec<f64> = coarse.iter().map(|m| (m - centre) * (m - centre)).collect();
    let sd = (centre + mean(&squares)).sqrt();
    Shape::Coarse(coarse, sd)
}

fn at_most(means: &[f64], count: f64) -> f64 {
    let count = PoissonCount::new(count);
    sum_with(means, |so_far, mean| count.add_cdf(so_far, mean)) / means.len().max(1) as f64
}

/// The smallest whole number at which the distribution function `cdf` reaches `p`, searched outwards
/// from `guess` in doubling steps and then between by interpolation, held to halve the gap in time.
fn search(p: f64, guess: f64, first_step: f64, cdf: impl Fn(f64) -> f64) -> Reached {
    let mut step = first_step.max(1.0);
    let (mut low, mut below, mut high, mut reached);
    let at_guess = cdf(guess);
    if at_guess >= p {
        (high, reached) = (guess, at_guess);
        loop {
            low = (high - step).max(-1.0);
            below = cdf(low);
            // Nothing lies below 0, whatever p is.
            if below < p || low < 0.0 {
                break;
            }
            (high, reached) = (low, below);
            step *= 2.0;
        }
    } else {
        (low, below) = (guess, at_guess);
        loop {
            high = low + step;
            reached = cdf(high);
            if reached >= p || high == f64::INFINITY {
                break;
            }
            (low, below) = (high, reached);
            step *= 2.0;
        }
    }
    let mut interpolate = true;
    loop {
        let gap = high - low;
        let share = if interpolate && reached > below {
            (p - below) / (reached - below)
        } else {
            0.5
        };
        let between = (low + share * gap).floor().min(high - 1.0).max(low + 1.0);
        // Neighbours; or, beyond 2^53, no whole number between them.
        if gap <= 1.0 || between <= low || between >= high {
            return Reached {
                count: high,
                reached,
                below,
            };
        }
        let value = cdf(between);
        if value >= p {
            (high, reached) = (between, value);
        } else {
            (low, below) = (between, value);
        }
        interpolate = high - low < 0.5 * gap;
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::numeric::{Purpose, Stream};

    fn invented_means(count: usize, centre: f64, cv: f64) -> Vec<f64> {
        let mut stream = Stream::new(1, Purpose::Simulation, 0);
        let shape = 1.0 / (cv * cv);
        (0..count).map(|_| centre * stream.gamma(shape) / shape).collect()
    }

    /// A table that grows as it is asked for holds the same bits as one that is filled at once.
    #[test]
    fn the_order_of_the_questions_changes_nothing() {
        for (centre, cv) in [(0.01, 0.5), (7.0, 0.1), (60.0, 0.7)] {
            let means = invented_means(300, centre, cv);
            let mut upwards = Predictive::new(means.clone());
            let mut downwards = Predictive::new(means);
            let counts: Vec<f64> = (0..180).map(f64::from).collect();
            let up: Vec<f64> = counts.iter().map(|count| upwards.at_most(*count)).collect();
            let down: Vec<f64> = counts.iter().rev().map(|count| downwards.at_most(*count)).collect();
            assert!(up.iter().eq(down.iter().rev()));
        }
    }

    /// The walk sums exact probabilities, the table a recurrence, and above 200 nothing is tabulated.
    #[test]
    fn quantiles_are_those_of_a_walk_from_zero() {
        for (centre, cv) in [
            (0.0, 0.5),
            (0.01, 0.5),
            (0.8, 1.0),
            (7.0, 0.1),
            (60.0, 0.7),
            (450.0, 0.02),
            (900.0, 0.02),
        ] {
            let mut predictive = Predictive::new(invented_means(300, centre, cv));
            for p in [0.001, 0.025, 0.5, 0.9, 0.975, 0.9999] {
                let found = predictive.smallest_reaching(p);
                let walked = (0..).map(f64::from).find(|k| at_most(&predictive.means, *k) >= p);
                assert_eq!(Some(found.count), walked, "about {centre}, cv {cv}, p {p}");
                for (found, count) in [(found.reached, found.count), (found.below, found.count - 1.0)] {
                    let exact = at_most(&predictive.means, count);
                    assert!(
                        (found - exact).abs() <= 1e-12 * exact,
                        "{centre} {cv} {p}: {found} for {exact}"
                    );
                }
            }
        }
    }

    #[test]
    fn a_count_beyond_the_table_is_still_exact() {
        let mut predictive = Predictive::new(vec![3.0; 10]);
        assert_eq!(predictive.at_most(1e6), 1.0);
        assert_eq!(predictive.tail(150.0, 10).probability, 1.0);
    }

    #[test]
    fn quantiles_of_large_counts_are_bracketed() {
        for (centre, cv) in [(1e6, 0.3), (1e9, 1e-6), (1e12, 0.5)] {
            let mut predictive = Predictive::new(invented_means(300, centre, cv));
            for p in [0.025, 0.975] {
                let found = predictive.smallest_reaching(p);
                assert!(predictive.at_most(found.count) >= p && predictive.at_most(found.count - 1.0) < p);
            }
        }
    }
}
