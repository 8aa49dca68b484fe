//! The predictive check of units against closed forms and other routes.

use ratewright::check::{UnitState, UnitsCheck, units};
use ratewright::design::{Audit, Coding, Design, Term};
use ratewright::fit::Draws;
use ratewright::numeric::{Purpose, Stream, exp, ln, nb2_cdf, nb2_ln_pmf, nb2_pmf, poisson_sf};
use ratewright::spec::{Family, Standing};
use std::path::Path;

/// Rows of a study with at most one covariate: unit, count, exposure, how many rows it stands for, covariate.
fn design(rows: &[(usize, f64, f64, f64, f64)]) -> Design {
    let units = rows.iter().map(|row| row.0).max().map_or(0, |last| last + 1);
    Design {
        terms: vec![Term {
            name: "wet".into(),
            change: "1 more".into(),
            prior_mean: 0.0,
            prior_sd: 1.0,
        }],
        columns: vec![rows.iter().map(|row| row.4).collect()],
        exposure: rows.iter().map(|row| row.2).collect(),
        log_exposure: rows.iter().map(|row| ln(row.2)).collect(),
        counts: rows.iter().map(|row| row.1).collect(),
        stands_for: rows.iter().map(|row| row.3).collect(),
        unit_of: rows.iter().map(|row| row.0).collect(),
        units: (0..units).map(|unit| format!("place {unit}")).collect(),
        lines: (0..rows.len() as u64).map(|row| row + 2).collect(),
        coding: Coding {
            exposure_column: Some("hours".into()),
            per: 1.0,
            covariates: vec![],
            joints: vec![],
            terms: vec!["wet".into()],
        },
        audit: Audit {
            rows_read: rows.len(),
            rows_not_kept: 0,
            lines_dropped: vec![],
            rows_used: rows.len(),
            units,
        },
    }
}

fn draws(baseline: Vec<f64>, slope: Vec<f64>, scatter: Option<Vec<f64>>) -> Draws {
    let per_chain = baseline.len();
    let mut parameters = vec!["baseline".to_string(), "wet".to_string()];
    let mut values = vec![baseline, slope];
    if let Some(scatter) = scatter {
        parameters.push("scatter".into());
        values.push(scatter);
    }
    Draws {
        parameters,
        chains: 1,
        per_chain,
        values,
    }
}

fn negative_binomial() -> Family {
    Family::NegativeBinomial {
        scatter_up_to: 1.0,
        standing: Standing::Settled,
    }
}

/// Ten invented clinics under a Gamma(2, 1.5) prior: the posterior is Gamma(2 + events, 1.5 + years),
/// and the predictive distribution of a unit is negative binomial. The figures of
/// `tests/reference/exact_clinic_gamma.units.csv` are that closed form, computed with scipy 1.17.1.
#[test]
fn conjugate_clinics_meet_their_closed_form() {
    let (header, rows) = reference("exact_clinic_gamma.units.csv");
    let at = |name: &str| header.iter().position(|column| *column == name).expect("a column");
    assert_eq!(rows.len(), 10);

    let (y, exposure) = (at("y"), at("exposure"));
    let shape = 2.0 + rows.iter().map(|row| row[y]).sum::<f64>();
    let rate = 1.5 + rows.iter().map(|row| row[exposure]).sum::<f64>();
    // Not random draws but the middles of 2,000 equal slices of the posterior: an integral by the
    // midpoint rule, so the comparison can be far sharper than simulation error.
    let slices = 2000;
    let baseline: Vec<f64> = (0..slices)
        .map(|k| ln(gamma_quantile(shape, (f64::from(k) + 0.5) / f64::from(slices)) / rate))
        .collect();
    let posterior = draws(baseline, vec![0.0; 2000], None);
    let study: Vec<_> = rows
        .iter()
        .enumerate()
        .map(|(k, row)| (k, row[y], row[exposure], 1.0, 0.0))
        .collect();
    let found = units(&design(&study), &Family::Poisson, &posterior, 0.9, 7, 2);

    let mut outside = 0.0;
    for (unit, row) in found.units.iter().zip(&rows) {
        let tail = row[at("p_less")] + 0.5 * row[at("p_equal")];
        assert!((unit.tail_probability - tail).abs() < 1e-5, "{unit:?} for {tail}");
        let mean = row[at("posterior_mean_mu")];
        assert!((unit.expected / mean - 1.0).abs() < 2e-5, "{unit:?} for {mean}");
        let scatter = 1.0 / shape.sqrt();
        let smallest = |p: f64| {
            (0..)
                .map(f64::from)
                .find(|k| nb2_cdf(*k, mean, scatter) >= p)
                .expect("a count")
        };
        assert_eq!((unit.lower, unit.upper), (smallest(0.05), smallest(0.95)), "{unit:?}");
        outside += nb2_cdf(unit.lower - 1.0, mean, scatter) + 1.0 - nb2_cdf(unit.upper, mean, scatter);
        let state = match row[y] {
            y if y < unit.lower => UnitState::Below,
            y if y > unit.upper => UnitState::Above,
            _ => UnitState::Inside,
        };
        assert_eq!(unit.state, state);
    }
    assert!(
        (found.outside_by_chance - outside).abs() < 1e-4,
        "{} for {outside}",
        found.outside_by_chance
    );
    assert_eq!(found.draws_used, 2000);
    assert_eq!(
        found.outside,
        found
            .units
            .iter()
            .filter(|unit| unit.state != UnitState::Inside)
            .count()
    );
}

/// A table of `tests/reference`: its header and rows, labels as NaN.
fn reference(name: &str) -> (Vec<String>, Vec<Vec<f64>>) {
    let path = Path::new(env!("CARGO_MANIFEST_DIR")).join("tests/reference").join(name);
    let text = std::fs::read_to_string(path).expect("the reference");
    let mut lines = text.lines();
    let header = lines.next().expect("a header").split(',').map(String::from).collect();
    let rows = lines.map(|line| line.split(',').map(|cell| cell.parse().unwrap_or(f64::NAN)).collect());
    (header, rows.collect())
}

/// The same clinics as negative-binomial counts: baseline from Normal(0, 1.1748), scatter exponential of
/// rate 2.9957. `tests/reference/clinic.nb2.units.csv` averages over 80,000 draws of a general-purpose
/// sampler (numpyro 0.22.0); here the posterior is 2,000 equal steps through a fine grid.
#[test]
fn clinics_meet_a_general_purpose_sampler() {
    let (_, clinics) = reference("exact_clinic_gamma.units.csv");
    let (header, expected) = reference("clinic.nb2.units.csv");
    let at = |name: &str| header.iter().position(|column| *column == name).expect("a column");
    let data: Vec<(f64, f64)> = clinics.iter().map(|row| (row[1], row[2])).collect();

    let mut grid = Vec::new();
    for i in 0..350 {
        for j in 0..250 {
            let (b0, c) = (-1.25 + 0.01 * f64::from(i), 0.005 + 0.01 * f64::from(j));
            let z = b0 / 1.174_809_900_159_67;
            let prior = -0.5 * z * z - 2.995_732_273_553_99 * c;
            let log: f64 = data.iter().map(|(y, years)| nb2_ln_pmf(*y, years * exp(b0), c)).sum();
            grid.push((b0, c, exp(prior + log)));
        }
    }
    let whole: f64 = grid.iter().map(|point| point.2).sum();
    let (mut baseline, mut scatter, mut passed) = (vec![], vec![], 0.0);
    for (b0, c, weight) in grid {
        passed += weight / whole * 2000.0;
        while (baseline.len() as f64) + 0.5 < passed {
            baseline.push(b0);
            scatter.push(c);
        }
    }
    assert_eq!(baseline.len(), 2000);
    let posterior = draws(baseline, vec![0.0; 2000], Some(scatter));
    let study: Vec<_> = data
        .iter()
        .enumerate()
        .map(|(k, (y, years))| (k, *y, *years, 1.0, 0.0))
        .collect();
    let design = design(&study);

    let repeats = 25;
    let runs: Vec<UnitsCheck> = (0..repeats)
        .map(|seed| units(&design, &negative_binomial(), &posterior, 0.95, seed, 2))
        .collect();
    for (k, row) in expected.iter().enumerate() {
        assert_eq!(row[at("y")], data[k].0);
        let tail = runs.iter().map(|run| run.units[k].tail_probability).sum::<f64>() / repeats as f64;
        let wanted = row[at("p_less")] + 0.5 * row[at("p_equal")];
        // Gamma factors: below 0.012 / sqrt(25); the sampler's 30,000 effective draws: below 0.001.
        assert!((tail - wanted).abs() < 0.006, "clinic {k}: {tail} for {wanted}");
        let mean = row[at("mu_mean")];
        assert!(
            (runs[0].units[k].expected / mean - 1.0).abs() < 0.005,
            "{:?} for {mean}",
            runs[0].units[k]
        );
    }
}

/// For a whole shape P(G <= x) = P(Poisson(x) >= shape).
fn gamma_quantile(shape: f64, p: f64) -> f64 {
    let (mut low, mut high) = (0.0, 10.0 * shape);
    while high - low > 1e-13 * high {
        let middle = 0.5 * (low + high);
        if poisson_sf(shape - 1.0, middle) < p {
            low = middle;
        } else {
            high = middle;
        }
    }
    low
}

/// A posterior with correlated figures, made up.
fn invented_posterior(count: usize) -> Draws {
    let mut stream = Stream::new(3, Purpose::Simulation, 0);
    let (mut baseline, mut slope, mut scatter) = (vec![], vec![], vec![]);
    for _ in 0..count {
        let z = stream.normal();
        baseline.push(-1.0 + 0.2 * z);
        slope.push(0.3 - 0.1 * z + 0.1 * stream.normal());
        // Signed on purpose: only its size may matter.
        scatter.push(0.5 + 0.25 * stream.normal());
    }
    draws(baseline, slope, Some(scatter))
}

/// Tail probabilities of single rows, averaged over seeds, against the average of exact negative-binomial ones.
#[test]
fn single_rows_meet_the_negative_binomial() {
    let posterior = invented_posterior(2000);
    let study: Vec<_> = (0..12)
        .map(|k| {
            (
                k,
                f64::from(k as u32 * k as u32 % 17),
                2.0 + 3.0 * k as f64,
                1.0,
                f64::from(k as u32 % 3),
            )
        })
        .collect();
    let design = design(&study);
    let repeats = 50;
    let runs: Vec<UnitsCheck> = (0..repeats)
        .map(|seed| units(&design, &negative_binomial(), &posterior, 0.95, seed, 2))
        .collect();
    for (k, (_, y, exposure, _, x)) in study.iter().enumerate() {
        let mut exact = 0.0;
        for d in 0..posterior.in_all() {
            let mean = exposure * exp(posterior.values[0][d] + x * posterior.values[1][d]);
            let c = posterior.values[2][d].abs();
            exact += (nb2_cdf(y - 1.0, mean, c) + 0.5 * nb2_pmf(*y, mean, c)) / posterior.in_all() as f64;
        }
        let tails: Vec<f64> = runs.iter().map(|run| run.units[k].tail_probability).collect();
        let n = tails.len() as f64;
        let mean = tails.iter().sum::<f64>() / n;
        let sd = (tails.iter().map(|t| (t - mean) * (t - mean)).sum::<f64>() / (n - 1.0)).sqrt();
        assert!(
            (mean - exact).abs() < 4.5 * sd / n.sqrt(),
            "row {k}: {mean} +- {sd} for {exact}"
        );
        assert!(sd < 0.012, "row {k}: {sd}");
    }
}

/// Whole units against counts simulated row by row; some rows stand for several.
#[test]
fn sums_of_rows_meet_simulation() {
    let posterior = invented_posterior(2000);
    let study = [
        (0, 4.0, 3.0, 1.0, 0.0),
        (1, 9.0, 2.0, 3.0, 1.0),
        (0, 2.0, 5.0, 1.0, 2.0),
        (1, 1.0, 0.5, 2.0, 0.0),
        (0, 0.0, 1.0, 1.0, 1.0),
    ];
    let found = units(&design(&study), &negative_binomial(), &posterior, 0.9, 1, 2);
    let mut stream = Stream::new(8, Purpose::Simulation, 5);
    let simulations = 200_000;
    for (k, unit) in found.units.iter().enumerate() {
        let mine: Vec<_> = study.iter().filter(|row| row.0 == k).collect();
        let observed: f64 = mine.iter().map(|row| row.3 * row.1).sum();
        assert_eq!(unit.observed, observed);
        assert_eq!(unit.rows, mine.iter().map(|row| row.3).sum::<f64>());
        assert_eq!(unit.exposure, mine.iter().map(|row| row.3 * row.2).sum::<f64>());
        let (mut tail, mut expected, mut low, mut high) = (0.0, 0.0, 0.0, 0.0);
        for s in 0..simulations {
            let d = s % posterior.in_all();
            let c = posterior.values[2][d].abs();
            let mut count = 0.0;
            for (_, _, exposure, stands_for, x) in &mine {
                for _ in 0..*stands_for as u32 {
                    let mean = exposure * exp(posterior.values[0][d] + x * posterior.values[1][d]);
                    let factor = c * c * stream.gamma(1.0 / (c * c));
                    count += stream.poisson(mean * factor);
                    expected += mean / f64::from(simulations as u32);
                }
            }
            let share = 1.0 / f64::from(simulations as u32);
            tail += share
                * if count < observed {
                    1.0
                } else if count == observed {
                    0.5
                } else {
                    0.0
                };
            low += if count < unit.lower { share } else { 0.0 };
            high += if count <= unit.upper { share } else { 0.0 };
        }
        // Gamma factors of the check (2,000) and the simulation (200,000): sd at most 0.5 / sqrt(2000).
        assert!((unit.tail_probability - tail).abs() < 0.03, "{unit:?} for {tail}");
        assert!((unit.expected / expected - 1.0).abs() < 1e-9, "{unit:?} for {expected}");
        assert!(
            low < 0.05 + 0.015 && high > 0.95 - 0.015,
            "{unit:?}: {low} below, {high} up to the upper end"
        );
    }
}

#[test]
fn wild_draws_and_empty_corners_give_finite_figures() {
    let study = [
        (0, 0.0, 1e-9, 1.0, 0.0),
        (1, 1e9, 1e9, 1.0, 1.0),
        (2, 5.0, 1.0, 1e6, 0.0),
    ];
    let scatters = [0.0, 1e-12, 1e-8, 0.3, 50.0];
    let baseline: Vec<f64> = (0..500).map(|k| f64::from(k % 7 - 3) * 200.0).collect();
    let scatter: Vec<f64> = (0..500).map(|k| scatters[k % scatters.len()]).collect();
    for family in [Family::Poisson, negative_binomial()] {
        let found = units(
            &design(&study),
            &family,
            &draws(baseline.clone(), vec![0.1; 500], Some(scatter.clone())),
            0.95,
            2,
            2,
        );
        for unit in &found.units {
            for figure in [unit.expected, unit.lower, unit.upper, unit.tail_probability] {
                assert!(figure.is_finite() && figure >= 0.0, "{unit:?}");
            }
            assert!(unit.lower <= unit.upper && unit.tail_probability <= 1.0, "{unit:?}");
        }
        assert!(found.outside_by_chance.is_finite());
    }
}
