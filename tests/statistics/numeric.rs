//! Special functions against the tables of `tests/tables/make_counts.py`, and identities between them.

use crate::tables::Table;
use ratewright::numeric::{
    beta_quantile, incomplete_beta, ln_factorial, ln_gamma, ln_rising, nb2_cdf, nb2_ln_pmf, nb2_pmf, nb2_sf,
    normal_cdf, normal_quantile, poisson_cdf, poisson_ln_pmf, poisson_pmf, poisson_sf,
};

/// The worst of many comparisons, with what it was about.
#[derive(Default)]
struct Worst {
    error: f64,
    about: String,
}

impl Worst {
    /// Relative error; values below 1e-290 only have to be that small, because exp ends at 1e-304.
    fn compare(&mut self, found: f64, expected: f64, about: &str) {
        let error = if expected.abs() < 1e-290 && found.abs() < 1e-280 {
            0.0
        } else {
            ((found - expected) / expected).abs()
        };
        if error > self.error || error.is_nan() {
            self.error = error;
            self.about = format!("{about}: {found:e} for {expected:e}");
        }
    }

    fn below(&self, tolerance: f64) {
        assert!(self.error < tolerance, "{:e}: {}", self.error, self.about);
    }
}

#[test]
fn ln_gamma_meets_its_table() {
    let mut worst = Worst::default();
    for row in Table::read("ln_gamma.csv").rows() {
        if row[1] == 0.0 {
            assert_eq!(ln_gamma(row[0]), 0.0, "at {}", row[0]);
        } else {
            worst.compare(ln_gamma(row[0]), row[1], &format!("{:e}", row[0]));
        }
    }
    worst.below(1e-15);
    assert_eq!(ln_gamma(0.0), f64::INFINITY);
    assert_eq!(ln_gamma(f64::INFINITY), f64::INFINITY);
    assert!(ln_gamma(-0.5).is_nan());
}

#[test]
fn ln_factorial_is_the_sum_of_logs() {
    let mut sum = 0.0;
    for n in 0..200 {
        let n = f64::from(n);
        if n > 1.0 {
            sum += ratewright::numeric::ln(n);
        }
        assert!((ln_factorial(n) - sum).abs() <= 1e-14 * sum, "{n}");
    }
}

#[test]
fn normal_meets_its_tables() {
    let mut worst = Worst::default();
    for row in Table::read("normal_cdf.csv").rows() {
        worst.compare(normal_cdf(row[0]), row[1], &format!("cdf {:e}", row[0]));
    }
    // 37 sd out the half square of x is 690, and its rounding is the error of the probability.
    worst.below(1.2e-13);
    let mut worst = Worst::default();
    for row in Table::read("normal_quantile.csv").rows() {
        if row[1] == 0.0 {
            assert_eq!(normal_quantile(row[0]), 0.0);
        } else {
            worst.compare(normal_quantile(row[0]), row[1], &format!("quantile {:e}", row[0]));
        }
    }
    worst.below(1e-15);
    assert_eq!(normal_quantile(0.0), f64::NEG_INFINITY);
    assert_eq!(normal_quantile(1.0), f64::INFINITY);
    assert!(normal_quantile(1.1).is_nan() && normal_quantile(-0.1).is_nan() && normal_quantile(f64::NAN).is_nan());
}

#[test]
fn rising_sums_meet_their_table() {
    let mut worst = [Worst::default(), Worst::default(), Worst::default()];
    for row in Table::read("rising.csv").rows() {
        let found = ln_rising(row[0], row[1], row[2]);
        for (k, found) in [found.value, found.slope, found.curvature].into_iter().enumerate() {
            if row[3 + k] == 0.0 {
                assert_eq!(found, 0.0, "{row:?}");
            } else {
                worst[k].compare(found, row[3 + k], &format!("{row:?}"));
            }
        }
    }
    for worst in worst {
        worst.below(2e-15);
    }
}

#[test]
fn rising_sums_add_up() {
    for a in [0.0, 1e-9, 0.04, 1.0, 2500.0] {
        let whole = ln_rising(1024.0, 90_000.0, a);
        let (left, right) = (ln_rising(1024.0, 5_000.0, a), ln_rising(5_000.0, 90_000.0, a));
        let mut worst = Worst::default();
        if a > 0.0 {
            worst.compare(left.value + right.value, whole.value, "value");
        }
        worst.compare(left.slope + right.slope, whole.slope, "slope");
        worst.compare(left.curvature + right.curvature, whole.curvature, "curvature");
        worst.below(2e-15);
    }
}

#[test]
fn poisson_meets_its_table() {
    let (mut ln_pmf, mut pmf, mut at_most, mut above) =
        (Worst::default(), Worst::default(), Worst::default(), Worst::default());
    for row in Table::read("poisson.csv").rows() {
        let (mean, y, about) = (row[0], row[1], format!("mean {:e}, y {:e}", row[0], row[1]));
        ln_pmf.compare(poisson_ln_pmf(y, mean), row[2], &about);
        pmf.compare(poisson_pmf(y, mean), row[3], &about);
        at_most.compare(poisson_cdf(y, mean), row[4], &about);
        above.compare(poisson_sf(y, mean), row[5], &about);
    }
    ln_pmf.below(5e-15);
    // A probability of 1e-218 is exp(-501), and the rounding of 501 is its relative error.
    pmf.below(2e-13);
    at_most.below(2e-13);
    above.below(2e-13);
}

#[test]
fn poisson_edges() {
    assert_eq!(poisson_pmf(0.0, 0.0), 1.0);
    assert_eq!(poisson_pmf(3.0, 0.0), 0.0);
    assert_eq!(poisson_ln_pmf(3.0, 0.0), f64::NEG_INFINITY);
    assert_eq!((poisson_cdf(0.0, 0.0), poisson_sf(0.0, 0.0)), (1.0, 0.0));
    assert_eq!((poisson_cdf(-1.0, 4.0), poisson_sf(-1.0, 4.0)), (0.0, 1.0));
    assert_eq!((poisson_cdf(1e9, 1e-12), poisson_sf(1e9, 1e-12)), (1.0, 0.0));
    assert_eq!((poisson_cdf(0.0, 1e12), poisson_sf(0.0, 1e12)), (0.0, 1.0));
}

/// The sums, the uniform expansion and the point probabilities are three routes: they must join.
#[test]
fn poisson_steps_are_point_probabilities() {
    for mean in [0.3, 7.0, 29.0, 41.0, 57.1, 300.0, 4000.0] {
        for y in 0..(3.0 * mean) as u32 + 10 {
            let y = f64::from(y);
            let pmf = poisson_pmf(y, mean);
            let step = if y < mean {
                poisson_cdf(y, mean) - poisson_cdf(y - 1.0, mean)
            } else {
                poisson_sf(y - 1.0, mean) - poisson_sf(y, mean)
            };
            let size = poisson_cdf(y, mean).min(poisson_sf(y - 1.0, mean));
            assert!(
                (step - pmf).abs() < 1e-12 * size + 1e-300,
                "mean {mean}, y {y}: {step:e} for {pmf:e}"
            );
        }
    }
}

#[test]
fn negative_binomial_meets_its_table() {
    let (mut ln_pmf, mut pmf, mut at_most, mut above) =
        (Worst::default(), Worst::default(), Worst::default(), Worst::default());
    for row in Table::read("negative_binomial.csv").rows() {
        let (c, mean, y) = (row[0], row[1], row[2]);
        let about = format!("c {c:e}, mean {mean:e}, y {y:e}");
        ln_pmf.compare(nb2_ln_pmf(y, mean, c), row[3], &about);
        pmf.compare(nb2_pmf(y, mean, c), row[4], &about);
        at_most.compare(nb2_cdf(y, mean, c), row[5], &about);
        let found = nb2_sf(y, mean, c);
        // At a scatter of 50 the upper tail may be what the lower one leaves of 1.
        if c < 50.0 || (found - row[6]).abs() > 4e-15 {
            above.compare(found, row[6], &about);
        }
    }
    ln_pmf.below(5e-15);
    pmf.below(2e-13);
    at_most.below(2e-13);
    above.below(2e-13);
}

#[test]
fn negative_binomial_edges() {
    for c in [0.0, 1e-200, 1e-8, 0.5, 50.0] {
        assert_eq!(nb2_pmf(0.0, 0.0, c), 1.0);
        assert_eq!(nb2_pmf(2.0, 0.0, c), 0.0);
        assert_eq!((nb2_cdf(0.0, 0.0, c), nb2_sf(0.0, 0.0, c)), (1.0, 0.0));
        assert_eq!((nb2_cdf(-1.0, 3.0, c), nb2_sf(-1.0, 3.0, c)), (0.0, 1.0));
        for mean in [1e-12, 1.0, 1e12] {
            for y in [0.0, 1.0, 1e9] {
                let (at_most, above) = (nb2_cdf(y, mean, c), nb2_sf(y, mean, c));
                assert!(
                    (at_most + above - 1.0).abs() < 1e-15,
                    "{c} {mean} {y}: {at_most} {above}"
                );
            }
        }
    }
    for y in [0.0, 4.0, 30.0] {
        assert_eq!(nb2_ln_pmf(y, 7.0, 0.0), poisson_ln_pmf(y, 7.0));
        assert_eq!(nb2_cdf(y, 7.0, 1e-200), poisson_cdf(y, 7.0));
    }
}

#[test]
fn negative_binomial_sums_to_one() {
    for (mean, c) in [(0.4, 2.0), (6.0, 0.3), (50.0, 0.8), (3.0, 1e-8)] {
        let mut sum = 0.0;
        for y in 0..4000 {
            sum += nb2_pmf(f64::from(y), mean, c);
            let cdf = nb2_cdf(f64::from(y), mean, c);
            assert!((sum - cdf).abs() < 1e-12, "mean {mean}, c {c}, y {y}: {sum} for {cdf}");
        }
        assert!((sum - 1.0).abs() < 1e-12);
    }
}

/// I_x(a, b) = P(Binomial(a + b - 1, x) >= a) for whole a and b (DLMF 8.17.5), and the quantile undoes it.
#[test]
fn incomplete_beta_is_a_binomial_tail() {
    for (a, b) in [(1, 1), (3, 2), (7, 20), (40, 5)] {
        let n = a + b - 1;
        for x in [0.01, 0.2, 0.5, 0.77, 0.99] {
            let mut tail = 0.0;
            for k in a..=n {
                let mut term = 1.0;
                for j in 0..k {
                    term *= f64::from(n - j) / f64::from(k - j) * x;
                }
                for _ in k..n {
                    term *= 1.0 - x;
                }
                tail += term;
            }
            let (a, b) = (f64::from(a), f64::from(b));
            let found = incomplete_beta(a, b, x);
            assert!((found - tail).abs() < 1e-13 * tail, "{a} {b} {x}: {found} for {tail}");
            // Near 1 the probability no longer tells where it was taken.
            if found < 0.999 {
                assert!((beta_quantile(found, a, b) - x).abs() < 1e-11 * x, "{a} {b} {x}");
            }
        }
    }
    assert_eq!(
        (incomplete_beta(2.0, 3.0, 0.0), incomplete_beta(2.0, 3.0, 1.0)),
        (0.0, 1.0)
    );
}
