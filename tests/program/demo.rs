//! The demo: its table and true values are what the stated program makes, and the fit finds them.

#[path = "../../examples/pools/mod.rs"]
mod pools;
#[path = "../../examples/pools/truth.rs"]
mod truth;

use ndarray::{Array1, Array2};
use ndarray_linalg::Solve;
use ratewright::fit::{self, Machine, Unwatched};
use ratewright::model::Model;
use ratewright::{design, spec, table};
use statrs::distribution::{ChiSquared, ContinuousCDF};
use std::path::{Path, PathBuf};

/// Seed of the checked-in table.
const SEED: u64 = 1;

fn folder() -> PathBuf {
    Path::new(env!("CARGO_MANIFEST_DIR")).join("demo-data/swimming-pools")
}

fn checked_in(file: &str) -> String {
    let path = std::path::Path::new(env!("CARGO_MANIFEST_DIR"))
        .join("demo-data/swimming-pools")
        .join(file);
    std::fs::read_to_string(path).unwrap()
}

#[test]
fn making_the_table_again_gives_the_same_bytes() {
    assert_eq!(pools::csv(&pools::simulate(SEED)), checked_in("pools.csv"));
    assert_eq!(truth::json_text(SEED), checked_in("truth.json"));
}

#[test]
fn another_seed_gives_another_table() {
    assert_ne!(pools::csv(&pools::simulate(SEED + 1)), checked_in("pools.csv"));
}

#[test]
fn half_of_the_pools_have_the_textured_floor() {
    for seed in 0..20 {
        let textured = pools::simulate(seed)
            .iter()
            .filter(|pool| pool.floor == "textured")
            .count();
        assert_eq!(textured, pools::POOLS / 2, "seed {seed}");
    }
}

/// Posterior mean and covariance of the demo's fit, in the order of `pools::true_values`.
fn posterior() -> (Array1<f64>, Array2<f64>) {
    let folder = folder();
    let spec = spec::read(&folder.join("pools.toml")).unwrap();
    let table = table::read_csv("pools.csv", &folder.join("pools.csv")).unwrap();
    let design = design::build(&spec, &table).unwrap();
    let fit = fit::run(&Model::new(&spec, &design), &spec, Machine::default(), &Unwatched).unwrap();
    assert_eq!(fit.draws.values.len(), pools::true_values().len());
    let values = pools::true_values().map(|(name, _)| {
        let place = fit.draws.parameters.iter().position(|parameter| parameter == name);
        &fit.draws.values[place.unwrap_or_else(|| panic!("the fit has no {name}"))]
    });

    let draws = fit.draws.in_all() as f64;
    let means: Array1<f64> = values.iter().map(|values| values.iter().sum::<f64>() / draws).collect();
    let covariance = Array2::from_shape_fn((values.len(), values.len()), |(i, j)| {
        let pairs = values[i].iter().zip(values[j]);
        pairs.map(|(a, b)| (a - means[i]) * (b - means[j])).sum::<f64>() / (draws - 1.0)
    });
    (means, covariance)
}

/// Squared distance of a point from the posterior mean, in the posterior's own covariance.
fn distance((means, covariance): &(Array1<f64>, Array2<f64>), point: &[f64]) -> f64 {
    let shift = Array1::from(point.to_vec()) - means;
    shift.dot(&covariance.solve(&shift).unwrap())
}

/// The distance has a chi-square law only where the posterior is Gaussian and the prior wide, which
/// is near enough here; the 99.9 % point is statrs'.
#[test]
fn the_truth_lies_where_the_posterior_says() {
    let posterior = posterior();
    let truth = pools::true_values().map(|(_, value)| value);
    let limit = ChiSquared::new(truth.len() as f64).unwrap().inverse_cdf(0.999);
    let found = distance(&posterior, &truth);
    assert!(found < limit, "distance {found}, limit {limit}");

    // Planted errors: each must be seen, or the test above says nothing.
    let planted: [(usize, f64); 3] = [
        (0, truth[0] + 0.5), // a baseline 65 % too high, as from a wrong `per`
        (1, -truth[1]),      // the floor's ratio the wrong way up
        (6, 0.4 * truth[6]), // the scatter's square in place of the scatter
    ];
    for (place, value) in planted {
        let mut wrong = truth;
        wrong[place] = value;
        let found = distance(&posterior, &wrong);
        assert!(
            found > limit,
            "parameter {place} at {value}: distance {found} went unseen"
        );
    }
}

/// A search for the mode that judges every step by the rise it brings loses its way on this seed's
/// pools: the last rises are below the rounding of the log density.
#[test]
fn the_mode_is_found_where_its_last_rise_cannot_be_seen() {
    let spec = spec::read(&folder().join("pools.toml")).unwrap();
    let csv = pools::csv(&pools::simulate(205));
    let table = table::parse_csv("pools.csv", csv.as_bytes()).unwrap();
    let design = design::build(&spec, &table).unwrap();
    fit::laplace(&Model::new(&spec, &design), 1, &Unwatched).unwrap();
}
