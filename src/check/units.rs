//! The predictive check of each unit: is its count one that the fitted model would bring?
//!
//! The rows of a unit are summed, each as often as it stands for others. Given a posterior draw,
//! that sum is Poisson about a mean M: the sum of the rows' means under Poisson, with a gamma factor
//! for each row under the negative binomial (a gamma mixture of Poissons). So no count is ever
//! simulated: probabilities are averages over draws of exact Poisson ones (Rao & Blackwell), and
//! only the gamma factors are random.
//!
//! The data that are judged here also took part in the fit, so the tails are conservative: a truly
//! odd unit pulls the model towards itself.

use super::predictive::Predictive;
use crate::design::Design;
use crate::fit::Draws;
use crate::numeric::{Purpose, Stream, exp, mean, sum};
use crate::spec::Family;
use crate::threads::in_order;
use schemars::JsonSchema;
use serde::{Deserialize, Serialize};

/// Row-by-draw evaluations that the check may cost, within the two limits that follow.
const ROW_DRAWS: usize = 16_000_000;
/// Fewest draws used, where there are as many.
const FEWEST_DRAWS: usize = 400;
/// Most draws used: a tail probability is then known to within 0.004 or so.
const MOST_DRAWS: usize = 8_000;
/// Draws from which the simulation error of a tail probability is estimated.
const ERROR_DRAWS: usize = 400;

/// Above this shape a gamma factor is its mean to within 3e-8, far below what a count can show.
const SHAPE_OF_A_CONSTANT: f64 = 1e15;

/// Means are held below this, so that a wild draw (a rate of exp(700)) leaves finite sums and squares.
const LARGEST_MEAN: f64 = 1e100;

/// The predictive check of every unit.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize, JsonSchema)]
#[serde(deny_unknown_fields)]
pub struct UnitsCheck {
    /// One entry for each unit, in order of first appearance.
    pub units: Vec<UnitCheck>,
    /// Units whose count lies outside its predictive interval.
    pub outside: usize,
    /// How many would, by chance, if the model were right.
    pub outside_by_chance: f64,
    /// Posterior draws that the check used.
    pub draws_used: usize,
    /// The largest simulation error of a tail probability: with other draws it would be this much
    /// different, as a standard deviation.
    pub worst_error_of_tail_probability: f64,
}

/// The predictive check of one unit.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize, JsonSchema)]
#[serde(deny_unknown_fields)]
pub struct UnitCheck {
    /// The unit.
    pub unit: String,
    /// Its rows (each counted as often as it stands for others).
    pub rows: f64,
    /// Its exposure, over all those rows.
    pub exposure: f64,
    /// Its count, over all those rows.
    pub observed: f64,
    /// Posterior mean of its expected count.
    pub expected: f64,
    /// Lower end of the predictive interval.
    pub lower: f64,
    /// Upper end of the predictive interval.
    pub upper: f64,
    /// Predictive probability of a smaller count plus half that of the same count (mid-p):
    /// near 0 the count is unusually low, near 1 unusually high.
    pub tail_probability: f64,
    /// Where the count lies.
    pub state: UnitState,
}

/// Where a unit's count lies in its predictive interval.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, Deserialize, JsonSchema)]
#[serde(rename_all = "kebab-case")]
pub enum UnitState {
    /// Within it, ends included.
    Inside,
    /// Below its lower end.
    Below,
    /// Above its upper end.
    Above,
}

/// Checks every unit of the design against the posterior `draws`, at the level `interval`, say 0.95.
///
/// `seed` is the study's; each unit has its own random stream, so the result does not depend on how
/// many `threads` share the work.
pub fn units(design: &Design, family: &Family, draws: &Draws, interval: f64, seed: u64, threads: usize) -> UnitsCheck {
    let at_most = (ROW_DRAWS / design.counts.len().max(1)).clamp(FEWEST_DRAWS, MOST_DRAWS);
    let used = UsedDraws::new(draws, family, design.terms.len(), at_most);
    let mut rows_of = vec![Vec::new(); design.units.len()];
    for (row, unit) in design.unit_of.iter().enumerate() {
        rows_of[*unit].push(row);
    }

    let found = in_order(design.units.len(), threads, |unit| {
        let stream = Stream::new(seed, Purpose::UnitCheck, unit as u64);
        check_unit(design, unit, &rows_of[unit], &used, interval, stream)
    });

    let chances: Vec<f64> = found.iter().map(|checked| checked.outside).collect();
    let worst_error = found.iter().map(|checked| checked.error).fold(0.0, f64::max);
    let units: Vec<UnitCheck> = found.into_iter().map(|checked| checked.check).collect();
    UnitsCheck {
        outside: units.iter().filter(|unit| unit.state != UnitState::Inside).count(),
        outside_by_chance: sum(&chances),
        draws_used: used.count,
        worst_error_of_tail_probability: worst_error,
        units,
    }
}

/// The check of one unit, and what the check of all needs of it.
struct Checked {
    check: UnitCheck,
    /// The chance that its count would fall outside its interval.
    outside: f64,
    /// Simulation error of its tail probability.
    error: f64,
}

/// Draws whose means are computed side by side, by vector instructions.
const LANES: usize = 8;

/// The draws that the check uses, eight by eight.
struct UsedDraws {
    count: usize,
    /// For each eight draws, each coefficient: the baseline, then the terms. (0 where the last eight are fewer.)
    coefficients: Vec<[f64; LANES]>,
    width: usize,
    /// The scatter of each draw; `None` under Poisson.
    scatter: Option<Vec<f64>>,
}

impl UsedDraws {
    fn new(draws: &Draws, family: &Family, terms: usize, at_most: usize) -> UsedDraws {
        let places = draws.evenly_spaced(at_most);
        let width = terms + 1;
        let mut coefficients = Vec::with_capacity(places.len().div_ceil(LANES) * width);
        for places in places.chunks(LANES) {
            coefficients.extend(draws.values[..width].iter().map(|values| {
                let mut lanes = [0.0; LANES];
                for (lane, place) in lanes.iter_mut().zip(places) {
                    *lane = values[*place];
                }
                lanes
            }));
        }
        let scatter = match family {
            Family::Poisson => None,
            Family::NegativeBinomial { .. } => Some(places.iter().map(|p| draws.values[width][*p].abs()).collect()),
        };
        UsedDraws {
            count: places.len(),
            coefficients,
            width,
            scatter,
        }
    }
}

fn check_unit(
    design: &Design,
    unit: usize,
    rows: &[usize],
    used: &UsedDraws,
    interval: f64,
    stream: Stream,
) -> Checked {
    // Each of the identical rows that a row stands for has the row's count and exposure.
    let total = |of: &dyn Fn(usize) -> f64| {
        let parts: Vec<f64> = rows.iter().map(|row| design.stands_for[*row] * of(*row)).collect();
        sum(&parts)
    };
    let observed = total(&|row| design.counts[row]);
    let (expected, means) = means_of_unit(design, rows, used, stream);
    let mut predictive = Predictive::new(means);
    let lower = predictive.smallest_reaching(0.5 * (1.0 - interval));
    let upper = predictive.smallest_reaching(0.5 * (1.0 + interval));
    let state = if observed < lower.count {
        UnitState::Below
    } else if observed > upper.count {
        UnitState::Above
    } else {
        UnitState::Inside
    };
    let tail = predictive.tail(observed, ERROR_DRAWS);
    let check = UnitCheck {
        unit: design.units[unit].clone(),
        rows: total(&|_| 1.0),
        exposure: total(&|row| design.exposure[row]),
        observed,
        expected,
        lower: lower.count,
        upper: upper.count,
        tail_probability: tail.probability,
        state,
    };
    Checked {
        check,
        outside: lower.below + (1.0 - upper.reached),
        error: tail.error,
    }
}

/// The unit's expected count, and for each draw the Poisson mean of its count.
fn means_of_unit(design: &Design, rows: &[usize], used: &UsedDraws, mut stream: Stream) -> (f64, Vec<f64>) {
    let mut coded = Vec::with_capacity(rows.len() * design.columns.len());
    for row in rows {
        coded.extend(design.columns.iter().map(|column| column[*row]));
    }
    let terms = design.columns.len();
    let mut expected = Vec::with_capacity(used.count);
    let mut means = Vec::with_capacity(used.count);
    let mut of_rows = vec![[0.0; LANES]; rows.len()];
    for coefficients in used.coefficients.chunks_exact(used.width) {
        let mut plain = [0.0; LANES];
        for (place, row) in rows.iter().enumerate() {
            let mut eta = coefficients[0].map(|b| design.log_exposure[*row] + b);
            for (x, b) in coded[place * terms..(place + 1) * terms].iter().zip(&coefficients[1..]) {
                for lane in 0..LANES {
                    eta[lane] += x * b[lane];
                }
            }
            of_rows[place] = eta.map(exp);
            for lane in 0..LANES {
                plain[lane] += of_rows[place][lane] * design.stands_for[*row];
            }
        }
        // One draw after the other from here on: the order of the random numbers is part of the result.
        for lane in 0..LANES.min(used.count - means.len()) {
            let mean = match &used.scatter {
                None => plain[lane],
                Some(scatter) => {
                    let scatter = scatter[means.len()];
                    let mut mixed = 0.0;
                    for (mu, row) in of_rows.iter().zip(rows) {
                        mixed += mu[lane] * factor(scatter, design.stands_for[*row], &mut stream);
                    }
                    mixed
                }
            };
            expected.push(plain[lane].min(LARGEST_MEAN));
            means.push(mean.min(LARGEST_MEAN));
        }
    }
    (mean(&expected), means)
}

/// The sum of `stands_for` independent gamma factors of mean 1 and variance c^2: one gamma of shape stands_for / c^2.
fn factor(scatter: f64, stands_for: f64, stream: &mut Stream) -> f64 {
    let variance = scatter * scatter;
    if stands_for >= SHAPE_OF_A_CONSTANT * variance {
        return stands_for;
    }
    variance * stream.gamma(stands_for / variance)
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::spec::Standing;

    #[test]
    fn the_number_of_threads_changes_nothing() {
        let n = 23;
        let design = Design::of_columns(vec![], vec![2.0; n], (0..n).map(|unit| unit as f64).collect());
        let draws = Draws {
            parameters: vec!["baseline".into(), "scatter".into()],
            chains: 1,
            per_chain: 500,
            values: vec![
                (0..500).map(|k| 0.002 * f64::from(k)).collect(),
                (0..500).map(|k| 0.001 * f64::from(k)).collect(),
            ],
        };
        let family = Family::NegativeBinomial {
            scatter_up_to: 1.0,
            standing: Standing::Settled,
        };
        let one = units(&design, &family, &draws, 0.95, 3, 1);
        for threads in [2, 5, 64] {
            assert_eq!(units(&design, &family, &draws, 0.95, 3, threads), one);
        }
        assert!(
            one.units
                .iter()
                .map(|unit| unit.observed)
                .eq((0..n).map(|unit| unit as f64))
        );
    }

    #[test]
    fn a_factor_has_mean_and_variance_as_stated() {
        let mut stream = Stream::new(2, Purpose::Simulation, 0);
        for (scatter, stands_for) in [(0.4, 1.0), (1.5, 4.0), (1e-3, 2.0)] {
            let n = 100_000;
            let draws: Vec<f64> = (0..n).map(|_| factor(scatter, stands_for, &mut stream)).collect();
            let variance = stands_for * scatter * scatter;
            let found = mean(&draws);
            assert!(
                (found - stands_for).abs() < 5.0 * (variance / f64::from(n)).sqrt(),
                "{found}"
            );
            let squares: Vec<f64> = draws.iter().map(|d| (d - stands_for) * (d - stands_for)).collect();
            assert!(
                (mean(&squares) / variance - 1.0).abs() < 0.05,
                "{}",
                mean(&squares) / variance
            );
        }
        assert_eq!(factor(0.0, 3.0, &mut stream), 3.0);
        assert_eq!(factor(1e-8, 1.0, &mut stream), 1.0);
    }
}
