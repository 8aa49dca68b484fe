//! The loops over rows: the same bits from every set of instructions, any company and any number of
//! threads, and the value and derivatives of a sum that is written row by row.

use crate::designs::design;
use ratewright::design::Design;
use ratewright::model::{BaselinePrior, Instructions, Model, NormalPrior, ScatterPrior};
use ratewright::numeric::{Purpose, Stream, exp, nb2_ln_pmf, poisson_ln_pmf};

/// Rows with numbers, yes/no columns and two categories, of 5 and 300 levels; many equal counts, so
/// that most blocks are deep, and some that stand for others.
fn mixed_rows(rows: usize) -> Design {
    let mut stream = Stream::new(7, Purpose::Simulation, rows as u64);
    let mut columns: Vec<Vec<f64>> = Vec::new();
    for _ in 0..5 {
        columns.push((0..rows).map(|_| stream.normal()).collect());
    }
    for _ in 0..3 {
        columns.push(
            (0..rows)
                .map(|_| f64::from(u8::from(stream.uniform() < 0.3)) - 0.3)
                .collect(),
        );
    }
    for levels in [5, 300] {
        let level: Vec<usize> = (0..rows)
            .map(|_| (stream.uniform() * f64::from(levels)) as usize)
            .collect();
        for other in 1..levels as usize {
            columns.push(level.iter().map(|&level| f64::from(u8::from(level == other))).collect());
        }
    }
    let exposure: Vec<f64> = (0..rows).map(|_| 0.5 + stream.uniform()).collect();
    let counts = exposure.iter().map(|e| stream.poisson(3.0 * e)).collect();
    let mut made = design(columns, exposure, counts);
    made.stands_for = (0..rows).map(|row| if row % 9 == 0 { 2.0 } else { 1.0 }).collect();
    made
}

fn model(design: &Design, scatter: bool) -> Model {
    let baseline = BaselinePrior::Range(NormalPrior { mean: 0.3, sd: 1.5 });
    let terms = vec![NormalPrior { mean: 0.0, sd: 1.0 }; design.terms.len()];
    Model::with_priors(design, baseline, terms, scatter.then_some(ScatterPrior { rate: 3.0 }))
}

/// Points about a sensible one, the last of `count` far out.
fn points(model: &Model, count: usize) -> Vec<f64> {
    let mut stream = Stream::new(8, Purpose::Simulation, 0);
    (0..count)
        .flat_map(|point| {
            let spread = if point + 1 == count { 4.0 } else { 0.1 };
            let mut one: Vec<f64> = (0..model.dimension()).map(|_| spread * stream.normal()).collect();
            one[0] += 1.0;
            one
        })
        .collect()
}

fn bits(values: &[f64]) -> Vec<u64> {
    values.iter().map(|value| value.to_bits()).collect()
}

#[test]
fn every_set_of_instructions_and_any_company_give_the_same_bits() {
    // A machine with one set compares companies only; any x86-64 of the last ten years has two.
    for rows in [5, 64, 700, 9_000] {
        let design = mixed_rows(rows);
        for scatter in [false, true] {
            let model = model(&design, scatter);
            let d = model.dimension();
            let points = points(&model, 19);
            let alone: Vec<f64> = points.chunks_exact(d).map(|point| model.log_density(point)).collect();
            for set in Instructions::available() {
                let model = model.clone().with_instructions(set);
                for company in [1, 2, 3, 4, 7, 8, 19] {
                    let mut together = vec![0.0; 19];
                    for (points, out) in points.chunks(company * d).zip(together.chunks_mut(company)) {
                        model.log_densities(points, out);
                    }
                    assert_eq!(bits(&together), bits(&alone), "{set}, {company} together, {rows} rows");
                }
            }
        }
    }
}

#[test]
fn derivatives_have_the_same_bits_on_any_instructions_and_threads() {
    for rows in [64, 9_000] {
        let design = mixed_rows(rows);
        for scatter in [false, true] {
            let model = model(&design, scatter);
            let point = &points(&model, 2)[..model.dimension()];
            let first = model.derivatives(point, 1).unwrap();
            for set in Instructions::available() {
                let model = model.clone().with_instructions(set);
                for threads in [1, 2, 3, 8] {
                    let same = model.derivatives(point, threads).unwrap();
                    assert_eq!(same.value.to_bits(), first.value.to_bits());
                    assert_eq!(bits(&same.gradient), bits(&first.gradient));
                    assert_eq!(bits(&same.hessian), bits(&first.hessian), "{set}, {threads} threads");
                }
            }
        }
    }
}

/// Row by row: the linear predictor as a sum of products, the log probability of one count, and the
/// textbook's derivatives by it (Cameron & Trivedi 2013, section 3.3).
fn row_by_row(design: &Design, point: &[f64], scatter: Option<f64>) -> (f64, Vec<f64>, Vec<f64>) {
    let size = design.columns.len() + 1;
    let (mut value, mut gradient, mut hessian) = (0.0, vec![0.0; size], vec![0.0; size * size]);
    for row in 0..design.counts.len() {
        let x: Vec<f64> = std::iter::once(1.0)
            .chain(design.columns.iter().map(|column| column[row]))
            .collect();
        let predictor: f64 = x.iter().zip(point).map(|(x, b)| x * b).sum();
        let mean = exp(predictor + design.log_exposure[row]);
        let (y, w) = (design.counts[row], design.stands_for[row]);
        let a = scatter.map_or(0.0, |c| c * c);
        value += w * scatter.map_or_else(|| poisson_ln_pmf(y, mean), |c| nb2_ln_pmf(y, mean, c));
        let (first, second) = (
            (y - mean) / (1.0 + a * mean),
            -mean * (1.0 + a * y) / ((1.0 + a * mean) * (1.0 + a * mean)),
        );
        for i in 0..size {
            gradient[i] += w * first * x[i];
            for k in 0..size {
                hessian[i * size + k] += w * second * x[i] * x[k];
            }
        }
    }
    (value, gradient, hessian)
}

#[test]
fn sums_are_those_of_a_loop_over_rows() {
    let design = mixed_rows(1_500);
    for scatter in [None, Some(0.7), Some(0.001), Some(40.0)] {
        let model = model(&design, scatter.is_some());
        let d = model.dimension();
        for mut point in points(&model, 4).chunks_exact(d).map(<[f64]>::to_vec) {
            let size = design.columns.len() + 1;
            if let Some(c) = scatter {
                point[d - 1] = c;
            }
            let (value, gradient, hessian) = row_by_row(&design, &point, scatter);
            let prior = model.log_prior(&point);
            approx::assert_relative_eq!(model.log_density(&point), value + prior, max_relative = 1e-11);
            let here = model.derivatives(&point, 2).unwrap();
            approx::assert_relative_eq!(here.value, value + prior, max_relative = 1e-11);
            for i in 0..size {
                // The priors: normal about 0 with sd 1, the baseline's about 0.3 with sd 1.5.
                let (mean, variance) = if i == 0 { (0.3, 2.25) } else { (0.0, 1.0) };
                let own = gradient[i] - (point[i] - mean) / variance;
                let scale: f64 = design.counts.iter().sum::<f64>() + 1.0;
                assert!(
                    (here.gradient[i] - own).abs() < 1e-10 * scale.max(own.abs()),
                    "{i}: {own}"
                );
                for k in 0..size {
                    let own = hessian[i * size + k] - if i == k { 1.0 / variance } else { 0.0 };
                    let error = (here.hessian[i * d + k] - own).abs();
                    assert!(error < 1e-10 * own.abs().max(1.0), "{i}, {k}: {own}");
                }
            }
        }
    }
}

/// Rates so high that the product of a lane's factors would overflow take a logarithm a row.
#[test]
fn a_product_that_would_overflow_is_not_formed() {
    let rows = 640;
    let exposure = vec![1.0; rows];
    let mut design = design(
        vec![(0..rows).map(|row| row as f64 / 640.0).collect()],
        exposure,
        vec![3.0; rows],
    );
    design.stands_for = vec![1.0; rows];
    let model = model(&design, true);
    // At 20 the product of eight factors is below the limit and that of sixteen is not; at 40 that of eight
    // is between the two limits.
    for baseline in [5.0, 20.0, 40.0, 80.0, 84.0, 86.0, 95.0, 300.0, 680.0] {
        let point = [baseline, 0.5, 1.0];
        let (value, ..) = row_by_row(&design, &point[..2], Some(1.0));
        let whole = model.log_density(&point) - model.log_prior(&point);
        approx::assert_relative_eq!(whole, value, max_relative = 1e-12);
        let here = model.derivatives(&point, 1).unwrap();
        let all_finite = |values: &[f64]| values.iter().all(|value| value.is_finite());
        assert!(
            all_finite(&here.gradient) && all_finite(&here.hessian),
            "{baseline}: {here:?}"
        );
    }
}
