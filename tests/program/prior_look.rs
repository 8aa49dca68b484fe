//! What the priors imply, against closed forms.
#![allow(missing_docs)]

use ratewright::check::{PriorState, prior};
use ratewright::numeric::ln;
use ratewright::spec::{Baseline, Chances, Family, Spec, Standing};

fn look(spec: &Spec) -> ratewright::check::PriorLook {
    let design = ratewright::design::build(spec, &crate::stand_in::rows()).unwrap();
    prior(spec, &design)
}

/// A spec of the stand-in with no covariate.
fn bare() -> Spec {
    let mut spec = crate::stand_in::spec();
    spec.covariates.clear();
    spec.study.answer.value = "baseline".into();
    spec.family = Family::Poisson;
    spec
}

#[test]
fn stated_ranges_come_back() {
    let look = look(&crate::stand_in::spec());
    assert!((look.baseline_rate.lower - 0.5).abs() < 1e-12 && (look.baseline_rate.upper - 50.0).abs() < 1e-12);
    let grooved = &look.rate_ratios[0];
    assert!(
        (grooved.ratio.lower - 0.33).abs() < 1e-12 && (grooved.ratio.upper - 3.0).abs() < 1e-12,
        "{grooved:?}"
    );
    // Exponential with P(c > 1) = 0.05: median ln 2 / -ln 0.05.
    let scatter = look.scatter.unwrap();
    assert!((scatter.upper - 1.0).abs() < 1e-12 && (scatter.median - 0.231_378_213_159_759).abs() < 1e-12);
    assert_eq!(look.state, PriorState::Clear, "{:?}", look.reasons);
}

#[test]
fn the_expected_rate_without_covariates_is_the_baseline() {
    let look = look(&bare());
    // The 2.5 % point of 20,000 draws of a log-normal with log sd 1.1748: its standard error on the
    // log scale is sqrt(0.025 * 0.975 / 20000) / (0.0584 / 1.1748), about 0.022.
    assert!(ln(look.expected_rate.lower / 0.5).abs() < 0.1, "{look:?}");
    assert!(ln(look.expected_rate.upper / 50.0).abs() < 0.1, "{look:?}");
    assert!(ln(look.expected_rate.median / 5.0).abs() < 0.05, "{look:?}");
}

#[test]
fn counts_from_earlier_data_are_negative_binomial() {
    // Rate ~ Gamma(2, 10,000 exposures), count at exposure 15,000: negative binomial of size 2 and
    // mean 3, P(count = k) = (k + 1) 0.4^2 0.6^k. Summed: F(0) = 0.16, F(1) = 0.352, F(2) = 0.525,
    // F(9) = 0.9698, F(10) = 0.9804. So the three quantiles are 0, 2 and 10.
    let mut spec = bare();
    spec.baseline = Baseline::Earlier {
        incidents: 2.0,
        exposure: 10_000.0,
        span: 0..0,
    };
    let look = look(&spec);
    assert_eq!(
        (look.count.lower, look.count.median, look.count.upper),
        (0.0, 2.0, 10.0)
    );
    assert!((look.typical_exposure - 15_000.0).abs() < 1e-9);
}

#[test]
fn a_provisional_range_wants_a_look() {
    let mut spec = crate::stand_in::spec();
    spec.covariates[1].plausible_ratio.standing = Standing::Provisional;
    let look = look(&spec);
    assert_eq!(look.state, PriorState::Look);
    assert!(
        look.reasons.len() == 1 && look.reasons[0].contains("provisional"),
        "{:?}",
        look.reasons
    );
}

#[test]
fn a_rate_that_could_be_anything_wants_a_look() {
    let mut spec = bare();
    let Baseline::PlausibleRate(range) = &mut spec.baseline else {
        unreachable!()
    };
    range.lo = 1e-3;
    range.hi = 1e3;
    assert!(look(&spec).reasons[0].contains("10,000"));
}

#[test]
fn more_incidents_than_chances_want_a_look() {
    let mut spec = bare();
    let Baseline::PlausibleRate(range) = &mut spec.baseline else {
        unreachable!()
    };
    // Up to two incidents for every chance.
    range.lo = 2_000.0;
    range.hi = 20_000.0;
    assert_eq!(look(&spec).state, PriorState::Clear);
    spec.exposure.as_mut().unwrap().chances = Chances::OneIncidentEach;
    let look = look(&spec);
    assert!(
        look.above_chances.unwrap() > 0.1 && look.reasons[0].contains("chances"),
        "{look:?}"
    );
}

#[test]
fn the_same_seed_gives_the_same_look() {
    assert_eq!(look(&crate::stand_in::spec()), look(&crate::stand_in::spec()));
    let mut other = crate::stand_in::spec();
    other.study.seed += 1;
    assert_ne!(look(&crate::stand_in::spec()).expected_rate, look(&other).expected_rate);
}

#[test]
fn a_row_that_stands_for_others_is_looked_at_as_often() {
    let design = ratewright::design::build(&crate::stand_in::spec(), &crate::stand_in::rows()).unwrap();
    let mut condensed = design.clone();
    condensed.stands_for = (0..design.counts.len()).map(|row| [1.0, 4.0, 2.0][row % 3]).collect();
    let mut written_out = condensed.clone();
    let rows = |values: &[f64]| -> Vec<f64> {
        let repeat = |row: usize| vec![values[row]; condensed.stands_for[row] as usize];
        (0..values.len()).flat_map(repeat).collect()
    };
    written_out.columns = condensed.columns.iter().map(|column| rows(column)).collect();
    written_out.exposure = rows(&condensed.exposure);
    written_out.counts = rows(&condensed.counts);
    written_out.stands_for = vec![1.0; written_out.counts.len()];
    let spec = crate::stand_in::spec();
    assert_eq!(
        ratewright::check::prior(&spec, &condensed),
        ratewright::check::prior(&spec, &written_out)
    );
}
