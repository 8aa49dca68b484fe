//! The predictive distribution of a count, given for each posterior draw the mean of a Poisson.

use crate::fit::quantile_of_sorted;
use crate::numeric::{exp, mean, poisson_cdf, poisson_pmf};

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
    Table(Vec<f64>),
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

impl Predictive {
    /// From the mean under each draw; every one finite.
    pub(super) fn new(means: Vec<f64>) -> Predictive {
        let mut sorted = means.clone();
        sorted.sort_unstable_by(f64::total_cmp);
        let most = sorted.last().copied().unwrap_or(0.0);
        let shape = if most <= TABULATED_TO {
            Shape::Table(table(&means, most))
        } else {
            coarse(&sorted)
        };
        Predictive { means, shape }
    }

    /// P(count or fewer).
    pub(super) fn at_most(&self, count: f64) -> f64 {
        if count < 0.0 {
            return 0.0;
        }
        match &self.shape {
            Shape::Table(table) if count < table.len() as f64 => table[count as usize],
            _ => at_most(&self.means, count),
        }
    }

    /// P(exactly this count).
    pub(super) fn exactly(&self, count: f64) -> f64 {
        average(&self.means, |mean| poisson_pmf(count, mean))
    }

    /// Monte Carlo standard error of the mid-p tail probability of a count, its spread over draws
    /// taken from `at_most` of them.
    pub(super) fn error_of_tail(&self, count: f64, at_most: usize) -> f64 {
        let used = self.means.len().min(at_most);
        let tails: Vec<f64> = (0..used)
            .map(|k| self.means[k * self.means.len() / used])
            .map(|mean| poisson_cdf(count - 1.0, mean) + 0.5 * poisson_pmf(count, mean))
            .collect();
        let centre = mean(&tails);
        let squares: Vec<f64> = tails.iter().map(|tail| (tail - centre) * (tail - centre)).collect();
        (mean(&squares) / self.means.len() as f64).sqrt()
    }

    /// The smallest count whose distribution function is at least `p`, exact over the draws.
    pub(super) fn smallest_reaching(&self, p: f64) -> Reached {
        match &self.shape {
            Shape::Table(table) => {
                let count = table.partition_point(|reached| *reached < p) as f64;
                Reached {
                    count,
                    reached: self.at_most(count),
                    below: self.at_most(count - 1.0),
                }
            }
            Shape::Coarse(coarse, sd) => {
                let most = coarse.last().copied().unwrap_or(0.0);
                let rough = search(p, most.floor(), (0.25 * sd).floor(), |count| at_most(coarse, count));
                search(p, rough.count, (0.02 * sd).floor(), |count| self.at_most(count))
            }
        }
    }
}

/// The distribution function from 0 to where less than 1e-20 is left, by p(k + 1) = p(k) mean / (k + 1).
///
/// A multiplication for each count and draw, where the distribution function itself takes a sum.
fn table(means: &[f64], most: f64) -> Vec<f64> {
    let length = (most + 12.0 * most.sqrt() + 40.0) as usize;
    let reciprocals: Vec<f64> = (1..=length).map(|k| 1.0 / k as f64).collect();
    let mut probabilities = vec![0.0; length];
    for mean in means {
        let mut p = exp(-mean);
        for (k, (sum, reciprocal)) in probabilities.iter_mut().zip(&reciprocals).enumerate() {
            *sum += p;
            p *= mean * reciprocal;
            if p < 1e-25 && k as f64 > *mean {
                break;
            }
        }
    }
    let mut below = 0.0;
    let share = 1.0 / means.len().max(1) as f64;
    probabilities
        .iter()
        .map(|p| {
            below += p * share;
            below
        })
        .collect()
}

fn coarse(sorted: &[f64]) -> Shape {
    let groups = 48;
    let middles = (0..groups).map(|g| quantile_of_sorted(sorted, (f64::from(g) + 0.5) / f64::from(groups)));
    let coarse: Vec<f64> = middles.collect();
    // Of the coarse means, so that one wild draw does not set the step of the search.
    let centre = mean(&coarse);
    let squares: Vec<f64> = coarse.iter().map(|m| (m - centre) * (m - centre)).collect();
    let sd = (centre + mean(&squares)).sqrt();
    Shape::Coarse(coarse, sd)
}

fn at_most(means: &[f64], count: f64) -> f64 {
    if count < 0.0 {
        0.0
    } else {
        average(means, |mean| poisson_cdf(count, mean))
    }
}

fn average(means: &[f64], of: impl Fn(f64) -> f64) -> f64 {
    let values: Vec<f64> = means.iter().map(|mean| of(*mean)).collect();
    mean(&values)
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
            let predictive = Predictive::new(invented_means(300, centre, cv));
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
        let predictive = Predictive::new(vec![3.0; 10]);
        assert_eq!(predictive.at_most(1e6), 1.0);
        assert!((predictive.exactly(150.0) / poisson_pmf(150.0, 3.0) - 1.0).abs() < 1e-14);
    }

    #[test]
    fn quantiles_of_large_counts_are_bracketed() {
        for (centre, cv) in [(1e6, 0.3), (1e9, 1e-6), (1e12, 0.5)] {
            let predictive = Predictive::new(invented_means(300, centre, cv));
            for p in [0.025, 0.975] {
                let found = predictive.smallest_reaching(p);
                assert!(predictive.at_most(found.count) >= p && predictive.at_most(found.count - 1.0) < p);
            }
        }
    }
}
