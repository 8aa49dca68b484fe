//! A stand-in for the slow part: the findings of an invented study, made by hand.
use ratewright::answer::{Answer, BaselineRate, RateRatio};
use ratewright::check::{UnitCheck, UnitState, UnitsCheck};
use ratewright::design::{Audit, Coding, ColumnCoding, CovariateCoding};
use ratewright::fit::Draws;
use ratewright::numeric::exp;
use ratewright::output::findings::*;
use ratewright::output::manifest::FileFact;
use ratewright::spec::*;
use ratewright::table::{Cells, Column, Table, TextCells};

pub fn findings() -> Findings {
    let coefficients = vec![
        coefficient("baseline", -6.417, 0.108),
        coefficient("decking=grooved", -0.2732, 0.109),
        coefficient("slope_deg", 0.0212, 0.041),
        coefficient("scatter", 0.4119, 0.043),
    ];
    let ratio = |k: usize, change: &str, prob_below_one: f64| RateRatio {
        term: coefficients[k].term.clone(),
        change: change.to_owned(),
        rate_ratio: exp(coefficients[k].median),
        lower: exp(coefficients[k].lower),
        upper: exp(coefficients[k].upper),
        prob_below_one,
    };
    let rate_ratios = vec![
        ratio(1, "grooved against plain", 0.9937),
        ratio(2, "for each 2 more in slope_deg", 0.302),
    ];
    Findings {
        layout: LAYOUT,
        ratewright: env!("CARGO_PKG_VERSION").to_owned(),
        audience: AUDIENCE.to_owned(),
        study: StudyFacts {
            title: "Grooved decking and falls at ferry landings".into(),
            question: "Do landings with grooved decking have fewer falls per boarding?".into(),
            answer_term: "decking=grooved".into(),
            family: "negative-binomial".into(),
            incidents_column: "falls".into(),
            unit_column: "landing".into(),
            exposure_column: Some("boardings".into()),
            per: 10_000.0,
            interval: 0.95,
            seed: 48_151,
            hide_counts_below: 5,
            show_zero: false,
        },
        data: Audit {
            rows_read: 8,
            rows_not_kept: 1,
            lines_dropped: vec![4],
            rows_used: 6,
            units: 6,
        },
        answer: Answer {
            sentence: "Where decking is grooved, the rate of falls is 24 % lower than where it is plain: rate ratio \
                       0.76 (95 % interval 0.61 to 0.94). The probability that it is lower is 99 %. The other \
                       columns of the model are held the same."
                .into(),
            term: "decking=grooved".into(),
            estimate: rate_ratios[0].rate_ratio,
            lower: rate_ratios[0].lower,
            upper: rate_ratios[0].upper,
            prob_below_one: Some(0.9937),
        },
        baseline_rate: BaselineRate {
            rate: 16.34,
            lower: 13.22,
            upper: 20.19,
            at: vec!["decking is plain".into(), "slope_deg is 8".into()],
        },
        units: UnitsCheck {
            units: vec![
                unit("North quay", 31.0, 22.4, (11.0, 37.0), 0.91, UnitState::Inside),
                unit("=Heron stairs", 58.0, 24.1, (12.0, 40.0), 0.9991, UnitState::Above),
                unit("Mill steps, upper", 6.0, 21.0, (10.0, 35.0), 0.0021, UnitState::Below),
                unit("Sandbar", 2.0, 14.7, (5.0, 27.0), 0.0004, UnitState::Below),
                unit("Old ferry", 0.0, 2.2, (0.0, 6.0), 0.07, UnitState::Inside),
                unit("Weir", 18.0, 17.3, (7.0, 30.0), 0.55, UnitState::Inside),
            ],
            outside: 3,
            outside_by_chance: 0.23,
            draws_used: 4000,
            worst_error_of_tail_probability: 0.006,
        },
        rate_ratios,
        coefficients,
        sampling: SamplingFinding {
            steps: "mixed".into(),
            chains: 4,
            warm_up: 600,
            draws: 24_000,
            accepted: 0.724,
            stopped: StopReason::PrecisionMet,
            precision_asked: 0.02,
            worst_error_of_mean: 0.0108,
            worst_error_of_interval_end: 0.0312,
            largest_r_hat: Some(1.0009),
            fewest_effective_draws: 9_812.4,
            fewest_effective_tail_draws: 7_540.9,
            reference: "normal with Laplace's shape, widened by 1.1".into(),
        },
        mode: ModeFinding {
            steps: 6,
            log_density: -231.25,
            scatter_mode: Some("inside".into()),
            furthest_move: 0.118,
            furthest_term: "scatter".into(),
        },
        notes: ["association", "units-in-sample"]
            .map(|code| Note {
                code: code.into(),
                text: format!("Text of the note {code}."),
            })
            .to_vec(),
    }
}

fn coefficient(term: &str, median: f64, sd: f64) -> CoefficientFinding {
    CoefficientFinding {
        term: term.to_owned(),
        median,
        lower: median - 1.96 * sd,
        upper: median + 1.96 * sd,
        mean: median + 0.01 * sd,
        sd,
        error_of_mean: 0.01 * sd,
        error_of_lower: 0.03 * sd,
        error_of_upper: 0.03 * sd,
        effective_draws: 9_812.4,
        effective_tail_draws: 7_540.9,
        split_r_hat: Some(1.0009),
        laplace_mean: median,
        laplace_sd: 0.98 * sd,
    }
}

fn unit(name: &str, observed: f64, expected: f64, ends: (f64, f64), tail: f64, state: UnitState) -> UnitCheck {
    UnitCheck {
        unit: name.to_owned(),
        rows: 1.0,
        exposure: 15_000.0,
        observed,
        expected,
        lower: ends.0,
        upper: ends.1,
        tail_probability: tail,
        state,
    }
}

pub fn draws() -> Draws {
    let parameters = ["baseline", "decking=grooved", "slope_deg", "scatter"];
    let values = (0..4)
        .map(|p| (0..40).map(|k| f64::from(p) + f64::from(k) / 64.0).collect())
        .collect();
    Draws {
        parameters: parameters.map(str::to_owned).to_vec(),
        chains: 4,
        per_chain: 10,
        values,
    }
}

pub fn coding() -> Coding {
    Coding {
        exposure_column: Some("boardings".into()),
        per: 10_000.0,
        covariates: vec![
            CovariateCoding {
                column: "decking".into(),
                coding: ColumnCoding::Category {
                    reference: "plain".into(),
                    levels: vec!["grooved".into()],
                    merge: vec![],
                },
            },
            CovariateCoding {
                column: "slope_deg".into(),
                coding: ColumnCoding::Number { centre: 8.0, step: 2.0 },
            },
        ],
        joints: vec![],
        terms: vec!["decking=grooved".into(), "slope_deg".into()],
    }
}

pub fn rows() -> Table {
    let text = |cells: [&str; 6]| {
        let mut all = TextCells::default();
        cells.iter().for_each(|cell| all.push(cell));
        Cells::Text(all)
    };
    let numbers = |cells: [f64; 6]| Cells::Numbers(cells.map(Some).to_vec());
    let units = [
        "North quay",
        "=Heron stairs",
        "Mill steps, upper",
        "Sandbar",
        "Old ferry",
        "Weir",
    ];
    let columns = [
        ("landing", text(units)),
        ("falls", numbers([31.0, 58.0, 6.0, 2.0, 0.0, 18.0])),
        ("boardings", numbers([15_000.0; 6])),
        (
            "decking",
            text(["plain", "plain", "grooved", "grooved", "grooved", "plain"]),
        ),
        ("slope_deg", numbers([8.0, 9.5, 6.0, 8.25, 10.0, 7.5])),
    ];
    Table {
        file: "landings.csv".into(),
        columns: columns
            .into_iter()
            .map(|(name, cells)| Column {
                name: name.to_owned(),
                cells,
            })
            .collect(),
        lines: vec![2, 3, 5, 6, 7, 9],
    }
}

pub fn data_fact() -> FileFact {
    FileFact {
        file: "landings.csv".into(),
        sha256: ratewright::output::manifest::sha256(b"the table"),
    }
}

pub fn spec() -> Spec {
    fn at<T>(value: T) -> At<T> {
        At { value, span: 0..0 }
    }
    let range = |lo, hi| PlausibleRange {
        lo,
        hi,
        span: 0..0,
        standing: Standing::Settled,
    };
    Spec {
        source: Source {
            file: "studies/landings.toml".into(),
            text: "# the spec, byte for byte\r\n".into(),
        },
        study: Study {
            title: "Grooved decking and falls at ferry landings".into(),
            question: "Do landings with grooved decking have fewer falls per boarding?".into(),
            answer: at("decking=grooved".into()),
            seed: 48_151,
        },
        data: Data {
            file: at("landings.csv".into()),
            unit: at("landing".into()),
            period: None,
            rows_with_gaps: RowsWithGaps::Drop,
            gap_marks: vec![],
            keep: vec![],
            stands_for: None,
        },
        incidents: Incidents {
            column: at("falls".into()),
        },
        exposure: Some(Exposure {
            column: at("boardings".into()),
            per: 10_000.0,
            chances: Chances::Many,
        }),
        family: Family::NegativeBinomial {
            scatter_up_to: 1.0,
            standing: Standing::Settled,
        },
        baseline: Baseline::PlausibleRate(range(0.5, 50.0)),
        covariates: vec![
            Covariate {
                column: at("decking".into()),
                kind: CovariateKind::Category {
                    reference: at("plain".into()),
                    merge: vec![],
                },
                plausible_ratio: range(0.33, 3.0),
            },
            Covariate {
                column: at("slope_deg".into()),
                kind: CovariateKind::Number {
                    centre: Centre::Value(8.0),
                    step: 2.0,
                },
                plausible_ratio: range(0.5, 2.0),
            },
        ],
        joints: vec![],
        sampling: Sampling {
            chains: 4,
            steps: Steps::Mixed,
            precision: 0.02,
            most_draws: 200_000,
        },
        report: Reporting {
            interval: 0.95,
            hide_counts_below: 5,
            zero_counts: ZeroCounts::Hidden,
        },
    }
}
