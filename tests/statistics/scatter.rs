//! The scatter where counts are large and it is small: its posterior may be a thousand times
//! narrower than its prior, and its mode inside or at 0 by the luck of the data.

use crate::designs::design;
use ratewright::fit::{self, Goal, Plan, Unwatched, sample};
use ratewright::model::{BaselinePrior, Model, NormalPrior, ScatterPrior};
use ratewright::numeric::{Purpose, Stream, exp, ln};
use ratewright::spec::Steps;

/// Rows of exposure 1 with this mean count and this true scatter, and no covariate.
fn model(rows: usize, mean: f64, scatter: f64, seed: u64) -> Model {
    let mut stream = Stream::new(seed, Purpose::Simulation, 0);
    let mut count = || {
        let factor = if scatter > 0.0 {
            stream.gamma(1.0 / (scatter * scatter)) * scatter * scatter
        } else {
            1.0
        };
        stream.poisson(mean * factor)
    };
    let counts = (0..rows).map(|_| count()).collect();
    let design = design(vec![], vec![1.0; rows], counts);
    let baseline = BaselinePrior::Range(NormalPrior {
        mean: ln(mean),
        sd: 1.0,
    });
    // P(c > 1) = 0.05.
    Model::with_priors(&design, baseline, vec![], Some(ScatterPrior { rate: -ln(0.05) }))
}

/// Mean and standard deviation of the scatter by brute force: a fine grid over both parameters.
fn by_brute_force(model: &Model, about: f64, highest: f64) -> (f64, f64) {
    let cells = 500;
    let step = highest / f64::from(cells);
    let values: Vec<(f64, f64)> = (0..cells)
        .map(|k| {
            let c = (f64::from(k) + 0.5) * step;
            // The baseline's width at this scatter, from the Hessian; 12 of them hold all.
            let hessian = model.derivatives(&[about, c], 1).unwrap().hessian;
            let width = 1.0 / (-hessian[0]).sqrt();
            let across: Vec<f64> = (-40..=40)
                .map(|j| model.log_density(&[about + 0.15 * f64::from(j) * width, c]))
                .collect();
            let top = across.iter().copied().fold(f64::NEG_INFINITY, f64::max);
            let sum: f64 = across.iter().map(|value| exp(value - top)).sum();
            (c, top + ln(sum * width))
        })
        .collect();
    let top = values.iter().map(|(_, v)| *v).fold(f64::NEG_INFINITY, f64::max);
    let moment = |f: &dyn Fn(f64) -> f64| values.iter().map(|(c, v)| f(*c) * exp(v - top)).sum::<f64>();
    let whole = moment(&|_| 1.0);
    let mean = moment(&|c| c) / whole;
    (mean, (moment(&|c| (c - mean) * (c - mean)) / whole).sqrt())
}

#[test]
fn the_profile_finds_the_scatter_at_every_size_of_counts() {
    for (mean, scatter) in [
        (3.0, 0.0),
        (300.0, 0.0),
        (2_000.0, 0.0),
        (20_000.0, 0.0),
        (1e5, 0.008),
        (1e7, 0.0),
        (40.0, 0.5),
    ] {
        for seed in 1..=6 {
            let model = model(60, mean, scatter, seed);
            let (mode, laplace) = fit::laplace(&model, &Unwatched).unwrap();
            let (exact, exact_sd) = by_brute_force(&model, mode.point[0], laplace.mean[1] + 12.0 * laplace.sd(1));
            let (found, sd) = (laplace.mean[1], laplace.sd(1));
            assert!(
                (found - exact).abs() < 0.03 * exact_sd && (sd / exact_sd - 1.0).abs() < 0.03,
                "mean {mean}, scatter {scatter}, seed {seed}: {found} ± {sd} against {exact} ± {exact_sd}"
            );
        }
    }
}

#[test]
fn chains_move_at_every_size_of_counts() {
    for (mean, scatter) in [(300.0, 0.0), (2_000.0, 0.0), (20_000.0, 0.0), (1e5, 0.008)] {
        for seed in 1..=25 {
            let model = model(60, mean, scatter, seed);
            let (_, laplace) = fit::laplace(&model, &Unwatched).unwrap();
            let plan = Plan {
                chains: 4,
                steps: Steps::Mixed,
                seed,
                warm_up: 600,
                width: 4,
                threads: 2,
                goal: Goal {
                    precision: 1e-9,
                    interval: 0.95,
                    most_draws: 4_000,
                },
            };
            let sampled = sample(&model, &laplace, &plan, &Unwatched).unwrap();
            for a in &sampled.assessments {
                assert!(
                    a.effective_draws > 400.0 && a.effective_tail_draws > 200.0,
                    "mean {mean}, scatter {scatter}, seed {seed}: {} of 4,000 draws",
                    a.effective_draws
                );
            }
        }
    }
}
