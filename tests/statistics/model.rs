//! The log posterior: its derivatives against finite differences, its limits, and that it says the
//! same whatever the company.

use crate::designs::design;
use ratewright::design::Design;
use ratewright::model::{BaselinePrior, Model, NormalPrior, PREDICTOR_LIMIT, ScatterPrior};
use ratewright::numeric::{Purpose, Stream, ln};

/// A design of made-up rows: `terms` standard normal columns, counts about `mean`, and each fifth
/// row standing for two.
fn made_up(rows: usize, terms: usize, mean: f64, seed: u64) -> Design {
    let mut stream = Stream::new(seed, Purpose::Simulation, 0);
    let columns: Vec<Vec<f64>> = (0..terms)
        .map(|_| (0..rows).map(|_| stream.normal()).collect())
        .collect();
    let exposure: Vec<f64> = (0..rows).map(|_| 0.5 + stream.uniform()).collect();
    let counts = exposure
        .iter()
        .map(|e| {
            let factor = stream.gamma(4.0) / 4.0;
            stream.poisson(mean * e * factor)
        })
        .collect();
    let mut made = design(columns, exposure, counts);
    made.stands_for = (0..rows).map(|row| 1.0 + f64::from(u8::from(row % 5 == 0))).collect();
    made
}

fn model(design: &Design, scatter: bool) -> Model {
    let baseline = BaselinePrior::Range(NormalPrior { mean: 0.3, sd: 1.5 });
    let terms = design
        .terms
        .iter()
        .map(|t| NormalPrior {
            mean: t.prior_mean,
            sd: t.prior_sd,
        })
        .collect();
    Model::with_priors(design, baseline, terms, scatter.then_some(ScatterPrior { rate: 3.0 }))
}

/// Five-point differences: error of order h^4, so with h = 1e-3 near 1e-12 of the scale, plus
/// rounding of 1e-16/h times the value.
fn difference(f: impl Fn(f64) -> f64) -> f64 {
    let h = 1e-3;
    (8.0 * (f(h) - f(-h)) - (f(2.0 * h) - f(-2.0 * h))) / (12.0 * h)
}

#[test]
fn gradient_and_hessian_are_the_differences_of_value_and_gradient() {
    for (seed, scatter, largest) in [(1, false, 4.0), (2, true, 4.0), (3, true, 3_000.0), (4, true, 0.3)] {
        let design = made_up(150, 6, largest, seed);
        let model = model(&design, scatter);
        let d = model.dimension();
        let mut stream = Stream::new(seed, Purpose::Simulation, 99);
        for trial in 0..20 {
            let mut point: Vec<f64> = (0..d).map(|_| 0.3 * stream.normal()).collect();
            point[0] += ln(largest);
            if scatter {
                // From nearly nothing to large, on either side of 0.
                let size = [0.01, 0.1, 0.5, 2.0][trial % 4] * (0.5 + stream.uniform());
                point[d - 1] = if trial % 3 == 0 { -size } else { size };
            }
            let here = model.derivatives(&point, 1).unwrap();
            let at = |place: usize, off: f64| {
                let mut moved = point.clone();
                moved[place] += off;
                moved
            };
            // The value is a difference of sums as large as this; a difference of two values over
            // 1e-3 shows their rounding a thousandfold.
            let summed: f64 = design.counts.iter().zip(&design.stands_for).map(|(y, w)| y * w).sum();
            let rounding = 3e-12 * 10.0 * (summed + 150.0);
            for i in 0..d {
                // A step of 1e-3 across a scatter of 0.005 would cross the kink of |c| at 0.
                let shrink = if scatter && i == d - 1 { point[i].abs() } else { 1.0 };
                let slope = difference(|h| model.log_density(&at(i, h * shrink))) / shrink;
                let tolerance = rounding / shrink;
                assert!(
                    (here.gradient[i] - slope).abs() < tolerance + 1e-9 * slope.abs(),
                    "seed {seed}, parameter {i}: {} against {slope}",
                    here.gradient[i]
                );
                for j in 0..d {
                    let curvature =
                        difference(|h| model.derivatives(&at(i, h * shrink), 1).unwrap().gradient[j]) / shrink;
                    let entry = here.hessian[i * d + j];
                    assert!(
                        (entry - curvature).abs() < rounding / shrink + 1e-8 * curvature.abs(),
                        "seed {seed}, {i} by {j}: {entry} against {curvature}"
                    );
                }
            }
        }
    }
}

#[test]
fn the_negative_binomial_tends_to_the_poisson_as_the_scatter_vanishes() {
    let design = made_up(130, 3, 5.0, 8);
    let (poisson, negative_binomial) = (model(&design, false), model(&design, true));
    let at = [1.2, 0.1, -0.2, 0.3];
    let limit = poisson.log_density(&at) + ln(3.0);
    for (scatter, tolerance) in [
        (0.0, 1e-13),
        (1e-30, 1e-13),
        (1e-21, 1e-13),
        (1e-10, 1e-13),
        (1e-8, 1e-13),
        (1e-4, 1e-6),
    ] {
        let mut point = at.to_vec();
        point.push(scatter);
        let value = negative_binomial.log_density(&point) + 3.0 * scatter;
        assert!(
            (value - limit).abs() < tolerance * limit.abs(),
            "c = {scatter}: {value} against {limit}"
        );
        let slope = negative_binomial.derivatives(&point, 1).unwrap();
        let flat = poisson.derivatives(&at, 1).unwrap();
        for i in 0..4 {
            assert!((slope.gradient[i] - flat.gradient[i]).abs() < 1e-4);
        }
    }
}

#[test]
fn a_row_that_stands_for_three_is_three_rows() {
    let mut once = made_up(90, 2, 6.0, 5);
    once.stands_for = (0..90).map(|row| [1.0, 3.0, 2.0][row % 3]).collect();
    let mut repeated = once.clone();
    let pick = |values: &[f64]| -> Vec<f64> {
        (0..90)
            .flat_map(|row| vec![values[row]; once.stands_for[row] as usize])
            .collect()
    };
    repeated.columns = once.columns.iter().map(|column| pick(column)).collect();
    repeated.exposure = pick(&once.exposure);
    repeated.log_exposure = pick(&once.log_exposure);
    repeated.counts = pick(&once.counts);
    repeated.stands_for = vec![1.0; repeated.counts.len()];
    for scatter in [false, true] {
        let point: Vec<f64> = [0.9, 0.2, -0.1, 0.7]
            .into_iter()
            .take(3 + usize::from(scatter))
            .collect();
        let (a, b) = (model(&once, scatter), model(&repeated, scatter));
        approx::assert_relative_eq!(a.log_density(&point), b.log_density(&point), max_relative = 1e-13);
    }
}

#[test]
fn a_density_does_not_depend_on_its_company() {
    let design = made_up(200, 5, 4.0, 6);
    let model = model(&design, true);
    let d = model.dimension();
    let mut stream = Stream::new(6, Purpose::Simulation, 1);
    let mut points: Vec<f64> = (0..9 * d).map(|_| 0.4 * stream.normal()).collect();
    // A scatter of exactly 0, and a point beyond the limit, among others.
    points[2 * d - 1] = 0.0;
    points[3 * d] = 2.0 * PREDICTOR_LIMIT;
    let mut together = vec![0.0; 9];
    model.log_densities(&points, &mut together);
    for (point, value) in points.chunks_exact(d).zip(&together) {
        assert_eq!(model.log_density(point).to_bits(), value.to_bits());
    }
    assert_eq!(together[3], f64::NEG_INFINITY);
}

#[test]
fn wild_points_have_a_density_and_never_nan() {
    let design = made_up(70, 2, 4.0, 7);
    let model = model(&design, true);
    for wild in [f64::NAN, f64::INFINITY, -f64::INFINITY, 1e300, -1e300, 700.0, -700.0] {
        for place in 0..4 {
            let mut point = vec![0.5, 0.1, 0.1, 0.5];
            point[place] = wild;
            let value = model.log_density(&point);
            assert!(value < f64::INFINITY, "{wild} at {place}: {value}");
        }
    }
}

#[test]
fn earlier_data_is_the_conjugate_gamma() {
    // Shape 12 and rate 30: the log density of the log rate b is that of the gamma at exp(b) plus b.
    use statrs::distribution::{Continuous, Gamma};
    let prior = BaselinePrior::Earlier {
        incidents: 12.0,
        exposure: 30.0,
    };
    let gamma = Gamma::new(12.0, 30.0).unwrap();
    for b in [-3.0, -1.0, 0.0, 0.4] {
        let rate = ratewright::numeric::exp(b);
        approx::assert_relative_eq!(prior.at(b).value, gamma.ln_pdf(rate) + b, max_relative = 1e-12);
    }
}
