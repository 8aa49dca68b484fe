//! When there are enough draws.

use super::convergence::{Assessment, assess};
use crate::threads::in_order;

/// Draws between two looks, all chains together.
const ROUND: usize = 1_000;
/// R-hat at or below this and at least this many effective draws (Vehtari et al. 2021).
pub const LARGEST_R_HAT: f64 = 1.01;
/// Fewest effective draws, in the bulk and in the tails.
pub const FEWEST_EFFECTIVE: f64 = 400.0;
/// An interval end may be this many times less precise than a mean.
pub const INTERVAL_END: f64 = 2.5;

/// What sampling aims at.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Goal {
    /// Largest simulation error of a mean, in posterior standard deviations.
    pub precision: f64,
    /// Level of the intervals.
    pub interval: f64,
    /// Most kept draws, all chains together.
    pub most_draws: usize,
}

/// Whether the goal is met.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum Verdict {
    /// It is.
    Met,
    /// Not yet: `worth` times as many draws may do.
    More {
        /// How many times as many draws the worst figure asks for, above 1.
        worth: f64,
    },
}

impl Goal {
    /// Most kept draws of each chain.
    pub fn most_per_chain(&self, chains: usize) -> usize {
        (self.most_draws / chains).max(4)
    }

    /// Draws of each chain before the first look.
    pub fn first_per_chain(&self, chains: usize) -> usize {
        ROUND.div_ceil(chains).min(self.most_per_chain(chains))
    }

    /// Draws of each chain before the next look: a whole number of rounds. Looks that cannot succeed
    /// are left out, since each costs a sort of all draws: the next one is just beyond what
    /// the last one asked for, and at most four times as far.
    pub fn next_per_chain(&self, per_chain: usize, worth: f64, chains: usize) -> usize {
        let round = ROUND.div_ceil(chains);
        let asked = (per_chain as f64 * (1.02 * worth).min(4.0)) as usize;
        let next = (asked / round * round).max(per_chain + round);
        next.min(self.most_per_chain(chains))
    }

    /// Assesses every parameter and judges them together.
    pub fn judge(&self, values: &[Vec<f64>], chains: usize, threads: usize) -> (Vec<Assessment>, Verdict) {
        let assessments = assess_all(values, chains, self.interval, threads);
        let worth = assessments.iter().map(|a| self.worth(a)).fold(0.0, worse);
        let verdict = if worth <= 1.0 {
            Verdict::Met
        } else {
            Verdict::More { worth }
        };
        (assessments, verdict)
    }

    /// How many times as many draws a parameter asks for: at most 1 when it is precise enough.
    fn worth(&self, a: &Assessment) -> f64 {
        // A parameter that never moved has no simulation error to speak of, and is no result.
        if a.sd <= 0.0 {
            return 4.0;
        }
        let error = |error: f64, allowed: f64| {
            let ratio = error / (allowed * a.sd);
            ratio * ratio
        };
        let ends = INTERVAL_END * self.precision;
        let agreement = match a.split_r_hat {
            Some(r_hat) if r_hat <= LARGEST_R_HAT => 1.0,
            _ => 1.1,
        };
        [
            error(a.error_of_mean, self.precision),
            error(a.error_of_lower, ends),
            error(a.error_of_upper, ends),
            FEWEST_EFFECTIVE / a.effective_draws,
            FEWEST_EFFECTIVE / a.effective_tail_draws,
            agreement,
        ]
        .into_iter()
        .fold(0.0, worse)
    }
}

/// The larger of two figures; one that is no number is worse than any.
fn worse(a: f64, b: f64) -> f64 {
    if a.is_nan() || b.is_nan() {
        f64::INFINITY
    } else {
        a.max(b)
    }
}

/// One assessment for each parameter, on several threads; each is computed whole by one of them.
fn assess_all(values: &[Vec<f64>], chains: usize, interval: f64, threads: usize) -> Vec<Assessment> {
    in_order(values.len(), threads, |place| assess(&values[place], chains, interval))
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::numeric::{Purpose, Stream};

    fn goal(precision: f64, most_draws: usize) -> Goal {
        Goal {
            precision,
            interval: 0.95,
            most_draws,
        }
    }

    fn independent(draws: usize) -> Vec<f64> {
        let mut stream = Stream::new(3, Purpose::Simulation, 0);
        (0..draws).map(|_| stream.normal()).collect()
    }

    #[test]
    fn looks_are_at_whole_rounds_and_never_beyond_the_limit() {
        for chains in [4, 5, 7] {
            let goal = goal(0.02, 9_999);
            let round = 1_000_usize.div_ceil(chains);
            let mut per_chain = goal.first_per_chain(chains);
            assert_eq!(per_chain, round);
            for worth in [1.01, 1.7, 300.0, 1.2, 50.0] {
                let next = goal.next_per_chain(per_chain, worth, chains);
                assert!(next > per_chain || next == 9_999 / chains);
                assert!(next <= 4 * per_chain && (next.is_multiple_of(round) || next == 9_999 / chains));
                per_chain = next;
            }
            assert!(per_chain * chains <= 9_999);
        }
    }

    /// Independent draws have an error of the mean of 1/sqrt(n) standard deviations, and of the
    /// 2.5 % quantile of 2.67/sqrt(n): the quantile's allowance of 0.05 decides, near n = 2,850. Its error is
    /// estimated from the gaps between neighbouring draws out there, and so is rough by a half.
    #[test]
    fn independent_draws_are_enough_when_theory_says_so() {
        let (_, few) = goal(0.02, 100_000).judge(&[independent(2_000)], 4, 1);
        assert!(
            matches!(few, Verdict::More { worth } if (1.1..2.2).contains(&worth)),
            "{few:?}"
        );
        let (_, enough) = goal(0.02, 100_000).judge(&[independent(12_000)], 4, 1);
        assert_eq!(enough, Verdict::Met);
    }

    #[test]
    fn one_bad_parameter_among_good_ones_decides() {
        let good = independent(4_000);
        let mut apart = good.clone();
        apart[..1_000].iter_mut().for_each(|value| *value += 1.0);
        let stuck = vec![0.25; 4_000];
        for bad in [apart, stuck] {
            let (_, verdict) = goal(0.02, 100_000).judge(&[good.clone(), bad], 4, 2);
            assert!(matches!(verdict, Verdict::More { worth } if worth > 1.0), "{verdict:?}");
        }
    }
}
