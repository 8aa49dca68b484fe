//! The specs of the reference cases say what the reference fits were made of: the same rows, terms
//! and priors.

use crate::cases::{CASES, file, reference, study};
use ratewright::spec::{Baseline, Family};
use serde_json::Value;

/// The reference writes `type[B]` where this program writes `type=B`.
fn in_our_words(coefficient: &str) -> String {
    match coefficient {
        "b0" => "baseline".to_string(),
        _ => coefficient.replace('[', "=").replace(']', ""),
    }
}

#[test]
fn rows_and_terms_are_those_of_the_reference() {
    for case in CASES {
        let (_, design) = study(case);
        let reference = reference(case);
        assert_eq!(
            design.counts.len() as u64,
            reference["rows"].as_u64().unwrap(),
            "{case}"
        );
        assert_eq!(design.units.len(), design.counts.len(), "{case}: every row is a unit");
        let ours: Vec<String> = std::iter::once("baseline".to_string())
            .chain(design.terms.iter().map(|term| term.name.clone()))
            .collect();
        let theirs: Vec<String> = reference["coefficient_order"]
            .as_array()
            .unwrap()
            .iter()
            .map(|name| in_our_words(name.as_str().unwrap()))
            .filter(|name| name != "scatter")
            .collect();
        assert_eq!(ours, theirs, "{case}");
    }
}

#[test]
fn priors_are_those_of_the_reference() {
    for case in CASES {
        let (spec, design) = study(case);
        let model = &reference(case)["model"];
        let Baseline::PlausibleRate(range) = &spec.baseline else {
            panic!("{case}: no range");
        };
        assert_same(range.log_mean(), &model["baseline"]["prior"]["mean"], case);
        assert_same(range.log_sd(), &model["baseline"]["prior"]["sd"], case);
        assert_eq!(design.coding.per, 1.0, "{case}");

        let mut terms = design.terms.iter();
        for group in model["terms"].as_array().unwrap() {
            for _ in group["coefficients"].as_array().unwrap() {
                let term = terms.next().unwrap();
                assert_same(term.prior_mean, &group["prior"]["mean"], &term.name);
                assert_same(term.prior_sd, &group["prior"]["sd"], &term.name);
            }
        }
        assert!(terms.next().is_none(), "{case}");

        match spec.family {
            Family::Poisson => assert!(model.get("scatter").is_none(), "{case}"),
            Family::NegativeBinomial { scatter_up_to, .. } => {
                assert_same(scatter_up_to, &model["scatter"]["upper"], case);
            }
        }
    }
}

/// The reference figures have 15 digits; a mean of 0 may come out as a rounding error of 1.
fn assert_same(ours: f64, theirs: &Value, what: &str) {
    let theirs = theirs.as_f64().unwrap();
    assert!(
        (ours - theirs).abs() <= 2e-14 * theirs.abs().max(1.0),
        "{what}: {ours} against {theirs}"
    );
}

#[test]
fn the_exact_cases_are_accepted() {
    for (case, rows) in [
        ("exact_clinic_gamma", 10),
        ("exact_textbook_short", 1),
        ("exact_textbook_long", 1),
    ] {
        let (spec, design) = study(case);
        assert!(matches!(spec.baseline, Baseline::Earlier { .. }), "{case}");
        assert_eq!(design.counts.len(), rows, "{case}");
    }
}

/// A study without `[exposure]` was refused at the last moment once: its coding has no exposure
/// column, and the absent name was taken for a figure that is not finite.
#[test]
fn a_study_without_exposure_leaves_a_run_that_repeats() {
    let folder = tempfile::tempdir().unwrap();
    let run = folder.path().join("quine.run");
    let program = || assert_cmd::Command::cargo_bin("ratewright").unwrap();
    program()
        .arg("fit")
        .arg(file("quine.poisson.toml"))
        .arg("--into")
        .arg(&run)
        .arg("--quiet")
        .assert()
        .success();
    program().arg("replay").arg(&run).arg("--quiet").assert().success();
}
