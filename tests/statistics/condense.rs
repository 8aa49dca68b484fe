//! Rows taken together for the likelihood: which are, in what order, and that the posterior does
//! not notice.

use crate::cases::study;
use crate::designs::design;
use proptest::prelude::*;
use ratewright::design::{Alike, Design, LikelihoodRows, condense};
use ratewright::fit::{self, Machine, Unwatched};
use ratewright::model::{BaselinePrior, Model, NormalPrior, ScatterPrior};
use ratewright::numeric::{Purpose, Stream, exp, ln, ln_1p};

const BOTH: [Alike; 2] = [Alike::Pattern, Alike::PatternAndExposure];

/// Twelve rows of four patterns and two exposures that cross them.
fn twelve() -> Design {
    let a = vec![1.0, 0.0, 1.0, 0.0, 1.0, 0.0, 1.0, 0.0, 1.0, 0.0, 1.0, 0.0];
    let b = vec![5.0, 5.0, 5.0, 5.0, 7.0, 7.0, 7.0, 7.0, 5.0, 5.0, 7.0, 7.0];
    let exposure = vec![2.0, 2.0, 2.0, 6.0, 2.0, 2.0, 6.0, 2.0, 2.0, 2.0, 2.0, 2.0];
    design(vec![a, b], exposure, (0..12).map(f64::from).collect())
}

#[test]
fn rows_of_a_pattern_merge_in_order_of_first_appearance() {
    let mut design = twelve();
    design.stands_for[2] = 3.0;
    let rows = condense(&design, Alike::Pattern);
    assert_eq!(*rows.columns, [vec![1.0, 0.0, 1.0, 0.0], vec![5.0, 5.0, 7.0, 7.0]]);
    // Rows 0, 2 (three of it) and 8; 1, 3 and 9; 4, 6 and 10; 5, 7 and 11.
    assert_eq!(rows.counts, [14.0, 13.0, 20.0, 23.0]);
    assert_eq!(*rows.weights, [5.0, 3.0, 3.0, 3.0]);
    let mean_exposures = [2.0, 10.0 / 3.0, 10.0 / 3.0, 2.0].map(ln);
    assert_eq!(*rows.log_exposure, mean_exposures);
}

#[test]
fn the_negative_binomial_keeps_exposures_apart() {
    let mut design = twelve();
    design.stands_for[2] = 3.0;
    let rows = condense(&design, Alike::PatternAndExposure);
    assert_eq!(
        *rows.columns,
        [vec![1.0, 0.0, 0.0, 1.0, 0.0, 1.0], vec![5.0, 5.0, 5.0, 7.0, 7.0, 7.0]]
    );
    assert_eq!(*rows.log_exposure, [2.0, 2.0, 6.0, 2.0, 2.0, 6.0].map(ln));
    assert_eq!(rows.counts, [14.0, 10.0, 3.0, 14.0, 23.0, 6.0]);
    assert_eq!(*rows.weights, [5.0, 2.0, 1.0, 2.0, 3.0, 1.0]);
}

#[test]
fn without_a_covariate_all_rows_are_one() {
    let mut design = design(vec![], vec![4.0; 40], vec![3.0; 40]);
    design.stands_for = vec![2.0; 40];
    for alike in BOTH {
        let rows = condense(&design, alike);
        assert_eq!(rows.rows(), 1);
        assert_eq!((rows.counts[0], rows.weights[0]), (240.0, 80.0));
        assert_eq!(rows.log_exposure[0], ln(4.0));
    }
}

#[test]
fn minus_zero_is_zero() {
    let zeros = |first: f64| (0..20).map(|row| if row % 2 == 0 { first } else { 0.0 }).collect();
    let mut design = design(vec![zeros(-0.0)], vec![1.0; 20], vec![1.0; 20]);
    design.log_exposure = zeros(-0.0);
    for alike in BOTH {
        assert_eq!(condense(&design, alike).rows(), 1);
    }
}

#[test]
fn the_last_bit_of_a_value_keeps_rows_apart() {
    let next = f64::from_bits(0.3_f64.to_bits() + 1);
    let column = (0..40).map(|row| if row < 20 { 0.3 } else { next }).collect();
    let design = design(vec![column], vec![1.0; 40], vec![1.0; 40]);
    assert_eq!(condense(&design, Alike::Pattern).rows(), 2);
}

#[test]
fn columns_are_not_mistaken_for_one_another() {
    // The same values in another column: (1, 2, 0), (2, 1, 0), (0, 1, 2), and each thrice.
    let column = |values: [f64; 3]| (0..9).map(|row| values[row % 3]).collect();
    let columns = vec![
        column([1.0, 2.0, 0.0]),
        column([2.0, 1.0, 1.0]),
        column([0.0, 0.0, 2.0]),
    ];
    let design = design(columns, vec![1.0; 9], vec![1.0; 9]);
    assert_eq!(condense(&design, Alike::PatternAndExposure).rows(), 3);
}

#[test]
fn rows_merge_where_one_in_ten_goes_and_stay_where_fewer_do() {
    let with_repeats = |repeats: usize| {
        let column = (0..60).map(|row: usize| row.min(59 - repeats) as f64).collect();
        design(vec![column], vec![1.5; 60], vec![2.0; 60])
    };
    for alike in BOTH {
        assert_eq!(condense(&with_repeats(6), alike).rows(), 54);
        let design = with_repeats(5);
        assert_eq!(condense(&design, alike), LikelihoodRows::of(&design));
    }
}

#[test]
fn a_design_that_does_not_condense_gives_its_own_rows() {
    let mut design = design(
        vec![(0..30).map(f64::from).collect()],
        (1..=30).map(f64::from).collect(),
        vec![2.0; 30],
    );
    design.stands_for = (0..30).map(|row| 1.0 + f64::from(row % 3)).collect();
    for alike in BOTH {
        let rows = condense(&design, alike);
        assert!(matches!(rows.columns, std::borrow::Cow::Borrowed(_)));
        assert_eq!(*rows.columns, design.columns);
        assert_eq!(*rows.log_exposure, design.log_exposure);
        assert_eq!(*rows.weights, design.stands_for);
        assert_eq!(rows.counts[..3], [2.0, 4.0, 6.0]);
    }
}

/// The model of this family on these rows of a design, with priors that are not the matter here.
fn model_on(design: &Design, rows: &LikelihoodRows, alike: Alike) -> Model {
    let baseline = BaselinePrior::Range(NormalPrior { mean: 0.3, sd: 1.5 });
    let terms = vec![NormalPrior { mean: 0.1, sd: 0.7 }; design.terms.len()];
    let scatter = match alike {
        Alike::Pattern => None,
        Alike::PatternAndExposure => Some(ScatterPrior { rate: 3.0 }),
    };
    Model::on_rows(design, rows, baseline, terms, scatter)
}

/// What value, gradient and Hessian sum up over the rows, all of it taken as positive: the scale of
/// their rounding. The Hessian is square, row-major.
struct Scale {
    value: f64,
    gradient: Vec<f64>,
    hessian: Vec<f64>,
}

/// The scale at a point; row by row, from the original rows.
fn scale(design: &Design, alike: Alike, point: &[f64]) -> Scale {
    let d = point.len();
    let size = design.columns.len() + 1;
    let c = match alike {
        Alike::Pattern => 0.0,
        Alike::PatternAndExposure => point[d - 1].abs(),
    };
    let a = c * c;
    let mut scale = Scale {
        value: 0.0,
        gradient: vec![0.0; d],
        hessian: vec![0.0; d * d],
    };
    for row in 0..design.counts.len() {
        let (y, w, offset) = (design.counts[row], design.stands_for[row], design.log_exposure[row]);
        let x: Vec<f64> = std::iter::once(1.0)
            .chain(design.columns.iter().map(|column| column[row]))
            .collect();
        let parts: Vec<f64> = x.iter().zip(point).map(|(x, b)| x * b).collect();
        let m = exp(offset + parts.iter().sum::<f64>());
        let share = 1.0 / (1.0 + a * m);
        let of_mean = if a > 1e-40 { (y + 1.0 / a) * ln_1p(a * m) } else { m };
        let closed = offset.abs() + parts.iter().map(|part| part.abs()).sum::<f64>() + ln(y + 1.0);
        scale.value += w * (of_mean + y * closed);
        for i in 0..size {
            scale.gradient[i] += w * x[i].abs() * (y + m) * share;
            for j in 0..size {
                scale.hessian[i * d + j] += w * (x[i] * x[j]).abs() * m * (1.0 + a * y) * share * share;
            }
        }
        if size < d {
            // Bounds of h and of its derivative, at small and at large a m.
            let (z, l) = (a * m, ln_1p(a * m));
            let h = (l / (z * z)).min(0.5);
            let slope = (3.0 * l / (z * z * z)).min(2.0 / 3.0);
            let by_a = w * (m * m * h + y * m * share);
            scale.gradient[size] += 2.0 * c * by_a;
            scale.hessian[d * d - 1] += 2.0 * by_a + 4.0 * a * w * (m * m * m * slope + y * m * m * share * share);
            for i in 0..size {
                let mixed = 2.0 * c * w * x[i].abs() * (y + m) * m * share * share;
                scale.hessian[i * d + size] += mixed;
                scale.hessian[size * d + i] += mixed;
            }
        }
    }
    scale
}

/// How far log density, gradient and Hessian on these rows are from those on the original rows, in
/// units of what they sum up: the worst entry.
fn worst(design: &Design, rows: &LikelihoodRows, alike: Alike, point: &[f64]) -> f64 {
    let original = model_on(design, &LikelihoodRows::of(design), alike);
    let condensed = model_on(design, rows, alike);
    let (here, there) = (
        original.derivatives(point, 1).unwrap(),
        condensed.derivatives(point, 1).unwrap(),
    );
    let scale = scale(design, alike, point);
    let off = |a: f64, b: f64, scale: f64| if a == b { 0.0 } else { (a - b).abs() / scale };
    let values = off(original.log_density(point), condensed.log_density(point), scale.value).max(off(
        here.value,
        there.value,
        scale.value,
    ));
    let entries = here
        .gradient
        .iter()
        .chain(&here.hessian)
        .zip(there.gradient.iter().chain(&there.hessian));
    let scales = scale.gradient.iter().chain(&scale.hessian);
    entries
        .zip(scales)
        .map(|((a, b), scale)| off(*a, *b, *scale))
        .fold(values, f64::max)
}

/// What rounding may do: exp turns the error of a predictor (near 12, half a unit in its last place:
/// 1e-15) into a relative error of the mean, and a sum of 250 rows adds as much again. The largest
/// of 800 random cases was 3.3e-15.
const ROUNDING: f64 = 2e-14;

/// One row: a level of each of three columns, an exposure, rows that it stands for, a count.
fn a_row() -> impl Strategy<Value = ([usize; 4], f64, f64)> {
    let many = prop_oneof![(1..5u32).prop_map(f64::from), Just(1e6)];
    let count = prop_oneof![(0..40u32).prop_map(f64::from), (0..1_000_000u32).prop_map(f64::from)];
    ((0..2usize, 0..3usize, 0..2usize, 0..3usize), many, count).prop_map(|((a, b, c, e), w, y)| ([a, b, c, e], w, y))
}

/// A design of such rows: at most eight patterns and three exposures, so that 60 rows condense.
fn of_levels(rows: &[([usize; 4], f64, f64)]) -> Design {
    let levels: [&[f64]; 3] = [&[0.0, 1.0], &[0.0, -0.0, 1.0], &[-1.3, 0.4]];
    let column = |k: usize| rows.iter().map(|(places, _, _)| levels[k][places[k]]).collect();
    let exposure = rows
        .iter()
        .map(|(places, _, _)| [0.2, 3.7, 41_000.0][places[3]])
        .collect();
    let mut made = design(
        (0..3).map(column).collect(),
        exposure,
        rows.iter().map(|(_, _, y)| *y).collect(),
    );
    made.stands_for = rows.iter().map(|(_, w, _)| *w).collect();
    made
}

proptest! {
    #![proptest_config(ProptestConfig { cases: 400, failure_persistence: None, ..ProptestConfig::default() })]

    #[test]
    fn the_log_posterior_is_that_of_the_original_rows(
        rows in proptest::collection::vec(a_row(), 60..250),
        coefficients in proptest::array::uniform4(-2.0..2.0f64),
        scatter in prop_oneof![Just(0.0), Just(1e-25), Just(1e-9), -0.01..0.01f64, -3.0..3.0f64],
    ) {
        let design = of_levels(&rows);
        for alike in BOTH {
            let mut point = coefficients.to_vec();
            if alike == Alike::PatternAndExposure {
                point.push(scatter);
            }
            let rows = condense(&design, alike);
            prop_assert!(rows.rows() <= 24);
            let worst = worst(&design, &rows, alike, &point);
            prop_assert!(worst < ROUNDING, "{alike:?}: {worst}");
        }
    }
}

/// A simulated table of two categories and a number of five values, exposures of four values and
/// weights of three, with overdispersed counts.
fn simulated(rows: usize, seed: u64) -> Design {
    let mut stream = Stream::new(seed, Purpose::Simulation, 0);
    let mut one_of = |choices: usize| (stream.uniform() * choices as f64) as usize;
    let places: Vec<[usize; 5]> = (0..rows)
        .map(|_| [one_of(2), one_of(3), one_of(5), one_of(4), one_of(3)])
        .collect();
    let column = |value: &dyn Fn(&[usize; 5]) -> f64| -> Vec<f64> { places.iter().map(value).collect() };
    let columns = vec![
        column(&|place| f64::from(place[0] == 1)),
        column(&|place| f64::from(place[1] == 1)),
        column(&|place| f64::from(place[1] == 2)),
        column(&|place| (place[2] as f64 - 2.0) / 2.0),
    ];
    let exposure = column(&|place| [0.5, 1.0, 1.7, 4.0][place[3]]);
    let counts = (0..rows)
        .map(|row| {
            let predictor = 0.6 - 0.4 * columns[0][row] + 0.3 * columns[2][row] + 0.2 * columns[3][row];
            let own_factor = stream.gamma(3.0) / 3.0;
            stream.poisson(exposure[row] * exp(predictor) * own_factor)
        })
        .collect();
    let stands_for = column(&|place| [1.0, 2.0, 7.0][place[4]]);
    let mut made = design(columns, exposure, counts);
    made.stands_for = stands_for;
    made
}

#[test]
fn a_planted_error_shows() {
    let design = simulated(300, 1);
    let point = [0.5, -0.3, 0.1, 0.2, 0.1, 0.8];
    let mut each_once = design.clone();
    each_once.stands_for = vec![1.0; 300];
    for alike in BOTH {
        let off = |rows: &LikelihoodRows| worst(&design, rows, alike, &point[..5 + usize::from(alike == BOTH[1])]);
        let right = condense(&design, alike);
        assert!(off(&right) < ROUNDING);
        let unweighted = condense(&each_once, alike);

        let mut wrong = right.clone();
        wrong.counts = unweighted.counts;
        assert!(off(&wrong) > 1e-3, "counts added up without what each row stands for");

        let mut wrong = right.clone();
        wrong.weights = unweighted.weights;
        assert!(off(&wrong) > 1e-3, "as many rows as were merged, not as they stand for");

        let mut wrong = right.clone();
        wrong.columns.to_mut()[0].rotate_left(1);
        assert!(off(&wrong) > 1e-3, "the pattern of another group");

        match alike {
            Alike::Pattern => {
                let mut wrong = right.clone();
                wrong.log_exposure = unweighted.log_exposure;
                assert!(
                    off(&wrong) > 1e-3,
                    "exposures averaged without what each row stands for"
                );
            }
            Alike::PatternAndExposure => {
                let wrong = condense(&design, Alike::Pattern);
                assert!(off(&wrong) > 1e-3, "the exposure left out of the key");
            }
        }
    }
}

#[test]
fn a_whole_fit_is_that_of_the_original_rows_and_the_same_on_every_run() {
    for alike in BOTH {
        let family = match alike {
            Alike::Pattern => "poisson",
            Alike::PatternAndExposure => "nb2",
        };
        // School absences of 146 children: no exposure, every covariate a category.
        let (spec, quine) = study(&format!("quine.{family}"));
        for design in [quine, simulated(400, 2)] {
            let rows = condense(&design, alike);
            assert!(2 * rows.rows() < design.counts.len());
            let fitted = |rows: &LikelihoodRows| {
                fit::run(&model_on(&design, rows, alike), &spec, Machine::default(), &Unwatched).unwrap()
            };
            let (original, condensed) = (fitted(&LikelihoodRows::of(&design)), fitted(&rows));
            for k in 0..original.mode.point.len() {
                // Newton ends at the limit of rounding (1e-14 here), the quadrature over the scatter
                // at a few times that.
                let moved = (original.mode.point[k] - condensed.mode.point[k]).abs();
                assert!(moved < 1e-11, "{family}, mode of {k}: {moved}");
                let wider = original.laplace.sd(k) / condensed.laplace.sd(k) - 1.0;
                assert!(wider.abs() < 1e-11, "{family}, sd of {k}: {wider}");
                // The same proposals; a decision may fall otherwise by rounding, one in 10^12 of them.
                let (a, b) = (&original.assessments[k], &condensed.assessments[k]);
                assert!((a.mean - b.mean).abs() < a.error_of_mean, "{family}, mean of {k}");
            }
            let again = fitted(&condense(&design, alike));
            assert_eq!(bits(&again.draws.values), bits(&condensed.draws.values));
        }
    }
}

fn bits(draws: &[Vec<f64>]) -> Vec<u64> {
    draws.iter().flatten().map(|value| value.to_bits()).collect()
}
