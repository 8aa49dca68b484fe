//! Fits of open data sets against maximum likelihood by statsmodels and R, densities by scipy, and
//! posteriors by a general-purpose sampler; tests/reference/README.md says how each was made.

use crate::cases::{CASES, number, reference, study};
use ratewright::design::Design;
use ratewright::fit::{self, Fit, Machine, ScatterMode, Unwatched, Verdict};
use ratewright::model::{BaselinePrior, Model, NormalPrior, ScatterPrior};
use ratewright::spec::{Spec, Steps};
use serde_json::Value;

/// Names of the coefficients in the reference's words and order.
fn coefficients(reference: &Value) -> Vec<String> {
    let order = reference["coefficient_order"].as_array().unwrap();
    order.iter().map(|name| name.as_str().unwrap().to_owned()).collect()
}

/// A model whose priors say next to nothing: the mode is then the maximum of the likelihood.
fn without_priors(spec: &Spec, design: &Design) -> Model {
    let flat = NormalPrior { mean: 0.0, sd: 1e6 };
    let scatter = spec.family.scatter_rate().map(|_| ScatterPrior { rate: 1e-9 });
    Model::with_priors(
        design,
        BaselinePrior::Range(flat),
        vec![flat; design.terms.len()],
        scatter,
    )
}

#[test]
fn the_log_density_is_the_references_at_its_points() {
    for case in CASES {
        let (spec, design) = study(case);
        let model = Model::new(&spec, &design);
        let reference = reference(case);
        for point in reference["density_points"].as_array().unwrap() {
            let mut at: Vec<f64> = coefficients(&reference)
                .iter()
                .map(|name| number(&point["b"][name]))
                .collect();
            at.extend(point["scatter"].as_f64());
            let prior = number(&point["log_prior"]);
            let both = prior + number(&point["log_likelihood"]);
            approx::assert_relative_eq!(model.log_prior(&at), prior, max_relative = 1e-9);
            approx::assert_relative_eq!(model.log_density(&at), both, max_relative = 1e-9);
            approx::assert_relative_eq!(model.derivatives(&at, 1).unwrap().value, both, max_relative = 1e-9);
        }
    }
}

#[test]
fn without_priors_the_mode_is_the_maximum_of_the_likelihood() {
    for case in CASES {
        let (spec, design) = study(case);
        let reference = reference(case);
        let classical = &reference["classical"]["statsmodels"];
        let model = without_priors(&spec, &design);
        let (mode, _) = fit::laplace(&model, &Unwatched).unwrap();
        let d = model.dimension();
        let boundary = classical["boundary"].as_bool() == Some(true);
        // Standard errors of the NB2 fits come from the observed information of the joint fit.
        let inside = classical.get("joint_ml").filter(|_| !boundary);
        for (place, name) in coefficients(&reference).iter().enumerate() {
            let published = &inside.unwrap_or(classical)["estimates"][name];
            let se = number(&published["se"]);
            let off = (mode.point[place] - number(&published["estimate"])).abs() / se;
            assert!(off < 1e-4, "{case} {name}: off by {off} standard errors");
            let found = mode.covariance[place * d + place].sqrt();
            let tolerance = if inside.is_some() { 1e-4 } else { 1e-5 };
            assert!(
                (found / se - 1.0).abs() < tolerance,
                "{case} {name}: {found} against {se}"
            );
        }
        match (spec.family.scatter_rate(), boundary) {
            (None, _) => assert_eq!(mode.scatter, None, "{case}"),
            (Some(_), true) => {
                assert_eq!(mode.scatter, Some(ScatterMode::AtZero), "{case}");
                // At the edge the score by c^2 is half the second derivative by c.
                let score = 0.5 * model.derivatives(&mode.point, 1).unwrap().hessian[d * d - 1];
                let published = number(&classical["score_at_zero"]);
                assert!(score < 0.0);
                approx::assert_relative_eq!(score, published, max_relative = 1e-5);
            }
            (Some(_), false) => {
                assert_eq!(mode.scatter, Some(ScatterMode::Inside), "{case}");
                let published = number(&classical["scatter"]["estimate"]);
                let se = number(&classical["scatter"]["se"]);
                assert!((mode.point[d - 1] - published).abs() < 1e-4 * se, "{case}: scatter");
            }
        }
    }
}

/// The clinic's posterior of baseline and scatter is known by two-dimensional quadrature (its JSON,
/// `independent_check.quadrature`). Laplace integrates only the baseline approximately, so its
/// figures are near but not equal; the Gaussian at the mode, at a scatter of 0, would be far off.
#[test]
fn the_profile_gives_the_scatters_moments_where_its_mode_is_at_zero() {
    let (spec, design) = study("clinic.nb2");
    let (mode, laplace) = fit::laplace(&Model::new(&spec, &design), &Unwatched).unwrap();
    assert_eq!(mode.scatter, Some(ScatterMode::AtZero));
    let reference = reference("clinic.nb2");
    let exact = &reference["independent_check"]["quadrature"]["parameters"];
    for (place, name) in [(0, "b0"), (1, "scatter")] {
        let (mean, sd) = (number(&exact[name]["mean"]), number(&exact[name]["sd"]));
        assert!(
            (laplace.mean[place] - mean).abs() < 0.1 * sd,
            "{name}: {} against {mean}",
            laplace.mean[place]
        );
        approx::assert_relative_eq!(laplace.sd(place), sd, max_relative = 0.05);
    }
}

fn run(case: &str, steps: Steps, precision: f64) -> Fit {
    let (mut spec, design) = study(case);
    spec.sampling.steps = steps;
    spec.sampling.precision = precision;
    spec.sampling.most_draws = 8_000_000;
    let model = Model::new(&spec, &design);
    let fit = fit::run(&model, &spec, Machine::default(), &Unwatched).unwrap();
    assert_eq!(
        fit.verdict,
        Verdict::Met,
        "{case}: precision not met after {} draws",
        fit.draws.in_all()
    );
    fit
}

/// Every posterior mean, sd and quantile lies within four combined Monte Carlo errors.
fn agrees(case: &str, fit: &Fit) {
    let reference = reference(case);
    let parameters = &reference["posterior"]["parameters"];
    let mut worst = (0.0, String::new());
    for (place, ours) in fit.draws.parameters.iter().enumerate() {
        let theirs = match ours.as_str() {
            "baseline" => "b0".to_owned(),
            "scatter" => "scatter".to_owned(),
            term => format!("{}]", term.replace('=', "[")),
        };
        let a = &fit.assessments[place];
        for (figure, value, error) in [
            ("mean", a.mean, a.error_of_mean),
            ("sd", a.sd, a.error_of_sd),
            ("q2.5", a.lower, a.error_of_lower),
            ("q50", a.median, a.error_of_median),
            ("q97.5", a.upper, a.error_of_upper),
        ] {
            let published = &parameters[&theirs][figure];
            let mcse = number(&published["mcse"]);
            let z = (value - number(&published["value"])).abs() / (mcse * mcse + error * error).sqrt();
            if z > worst.0 {
                worst = (z, format!("{ours} {figure}: {value} against {published}"));
            }
        }
    }
    assert!(worst.0 < 4.0, "{case}: {} combined errors at {}", worst.0, worst.1);
}

#[test]
fn mixed_steps_give_the_reference_posterior() {
    for case in CASES {
        agrees(case, &run(case, Steps::Mixed, 0.005));
    }
}

#[test]
fn the_plain_random_walk_gives_the_reference_posterior() {
    for case in CASES {
        agrees(case, &run(case, Steps::Walk, 0.005));
    }
}
