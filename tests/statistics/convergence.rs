//! Convergence figures against arviz-stats on small checked-in chains, and at the edges.

use crate::tables::Table;
use ratewright::fit::{Assessment, assess};
use ratewright::numeric::{Purpose, Stream};

/// The cases of `tests/tables/make_chains.py`, in its order.
const CASES: [&str; 10] = [
    "independent",
    "slow",
    "very_slow",
    "one_stuck",
    "antithetic",
    "odd_length",
    "many_ties",
    "spread_apart",
    "one_chain",
    "drifting",
];

fn figures(a: &Assessment) -> [f64; 13] {
    [
        a.mean,
        a.sd,
        a.median,
        a.lower,
        a.upper,
        a.error_of_mean,
        a.error_of_sd,
        a.error_of_median,
        a.error_of_lower,
        a.error_of_upper,
        a.effective_draws,
        a.effective_tail_draws,
        a.split_r_hat.unwrap_or(f64::NAN),
    ]
}

#[test]
fn every_figure_meets_the_reference() {
    let expected = Table::read("chains.csv");
    assert_eq!(expected.rows().len(), CASES.len());
    for (case, row) in CASES.iter().zip(expected.rows()) {
        let draws = Table::read(&format!("chains_{case}.csv")).column("value");
        let found = figures(&assess(&draws, row[0] as usize, 0.9));
        for (k, (found, expected)) in found.iter().zip(&row[1..]).enumerate() {
            // Both sides sum the same numbers; the order of summation is all that differs.
            assert!(
                (found - expected).abs() <= 1e-9 * expected.abs(),
                "{case}, figure {k}: {found} for {expected}"
            );
        }
    }
}

fn all_finite(a: &Assessment) {
    for (k, figure) in figures(a).iter().enumerate().take(12) {
        assert!(figure.is_finite(), "figure {k} of {a:?}");
    }
    assert!(a.split_r_hat.is_none_or(f64::is_finite));
}

#[test]
fn a_parameter_that_never_moves_is_worth_one_draw() {
    let a = assess(&[0.1; 400], 4, 0.95);
    all_finite(&a);
    assert_eq!(
        (a.mean, a.sd, a.median, a.error_of_mean, a.error_of_upper),
        (0.1, 0.0, 0.1, 0.0, 0.0)
    );
    assert_eq!(
        (a.effective_draws, a.effective_tail_draws, a.split_r_hat),
        (1.0, 1.0, None)
    );
}

#[test]
fn chains_stuck_apart_are_worth_a_draw_for_each_half() {
    let draws: Vec<f64> = (0..400).map(|k| 0.1 + f64::from(k / 100)).collect();
    let a = assess(&draws, 4, 0.95);
    all_finite(&a);
    assert_eq!(a.split_r_hat, None);
    assert_eq!(a.effective_draws, 8.0);
}

#[test]
fn few_draws_are_no_fault() {
    for chains in 1..5 {
        for per_chain in 0..12 {
            let draws: Vec<f64> = (0..chains * per_chain).map(|k| ((k * k) % 7) as f64).collect();
            all_finite(&assess(&draws, chains, 0.95));
        }
    }
    all_finite(&assess(&[], 0, 0.95));
}

/// Lags beyond the direct ones go through a transform: a chain that needs both must give one figure.
///
/// A first-order autoregression of coefficient r has the autocorrelation time (1 + r) / (1 - r).
#[test]
fn a_slow_chain_has_the_effective_draws_of_its_law() {
    let r: f64 = 0.98;
    let (chains, per_chain) = (4, 50_000);
    let mut draws = Vec::new();
    for chain in 0..chains {
        let mut stream = Stream::new(11, Purpose::Simulation, chain);
        let mut x = stream.normal();
        for _ in 0..per_chain {
            x = r * x + (1.0 - r * r).sqrt() * stream.normal();
            draws.push(x);
        }
    }
    let a = assess(&draws, chains as usize, 0.95);
    let expected = draws.len() as f64 * (1.0 - r) / (1.0 + r);
    assert!(
        (a.effective_draws / expected - 1.0).abs() < 0.1,
        "{} for {expected}",
        a.effective_draws
    );
    let by_mean = (a.sd / a.error_of_mean) * (a.sd / a.error_of_mean);
    assert!((by_mean / expected - 1.0).abs() < 0.1, "{by_mean} for {expected}");
}
