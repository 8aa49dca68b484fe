//! What the priors imply before any outcome is looked at: rates, ratios, and counts.
//!
//! A prior is believed or not in the evaluator's own units, so it is told in them. The rates and
//! counts are simulated: each time every parameter is drawn from its prior, a row is picked for its
//! covariates, and a count is drawn at the median exposure. The counts of the file are not used.

use crate::design::{Design, Term};
use crate::fit::quantile_of_sorted;
use crate::numeric::{Purpose, Stream, exp, ln};
use crate::spec::{Baseline, Chances, NORMAL_975, Spec, Standing};
use serde::Serialize;

/// How often the study is simulated from its priors.
pub const SIMULATIONS: usize = 20_000;
/// An expected rate whose central 95 % spans more than this factor is called too wide.
pub const WIDEST_RATE: f64 = 1e4;
/// With one incident a chance at most: the share of simulated counts above their exposure that is
/// still passed over.
pub const MOST_ABOVE_CHANCES: f64 = 0.01;
/// Means above this are held there: no count of a file comes near.
const LARGEST_MEAN: f64 = 1e12;
/// Below this scatter the gamma factor is 1 to the last digit that matters for a count.
const NO_SCATTER: f64 = 1e-6;

/// A central 95 % range with its middle.
#[derive(Debug, Clone, Copy, PartialEq, Serialize)]
pub struct PriorRange {
    /// The 2.5 % point.
    pub lower: f64,
    /// The median.
    pub median: f64,
    /// The 97.5 % point.
    pub upper: f64,
}

/// What the priors say of one rate ratio.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct PriorRatio {
    /// The term.
    pub term: String,
    /// The change that the ratio stands for, in words.
    pub change: String,
    /// Its range.
    pub ratio: PriorRange,
}

/// What the prior says of the scatter.
#[derive(Debug, Clone, Copy, PartialEq, Serialize)]
pub struct PriorScatter {
    /// Its median.
    pub median: f64,
    /// The value that it exceeds with probability 0.05.
    pub upper: f64,
}

/// How the priors look.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize)]
#[serde(rename_all = "kebab-case")]
pub enum PriorState {
    /// Nothing to say against them.
    Clear,
    /// Something to look at first; see the reasons.
    Look,
}

/// What all priors together imply.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct PriorLook {
    /// Rate at the baseline, per `per` units of exposure.
    pub baseline_rate: PriorRange,
    /// Each rate ratio.
    pub rate_ratios: Vec<PriorRatio>,
    /// The scatter, under the negative binomial.
    #[serde(skip_serializing_if = "Option::is_none")]
    pub scatter: Option<PriorScatter>,
    /// Expected rate of a row of the file, per `per` units of exposure.
    pub expected_rate: PriorRange,
    /// Exposure of a typical row: the median.
    pub typical_exposure: f64,
    /// Count of a row with that exposure.
    pub count: PriorRange,
    /// With one incident a chance at most: share of simulated counts above their exposure.
    #[serde(skip_serializing_if = "Option::is_none")]
    pub above_chances: Option<f64>,
    /// How they look.
    pub state: PriorState,
    /// Why they want a look.
    pub reasons: Vec<String>,
}

/// What the priors of `spec` imply for the rows of `design`.
pub fn prior(spec: &Spec, design: &Design) -> PriorLook {
    let per = design.coding.per;
    let mut simulated = simulate(spec, design);
    let expected_rate = range_of(&mut simulated.rates, per);
    let count = range_of(&mut simulated.counts, 1.0);
    let mut look = PriorLook {
        baseline_rate: baseline_rate(spec, per, &mut simulated.baselines),
        rate_ratios: design.terms.iter().map(ratio).collect(),
        scatter: spec.family.scatter_rate().map(|rate| PriorScatter {
            median: -ln(0.5) / rate,
            upper: -ln(0.05) / rate,
        }),
        expected_rate,
        typical_exposure: simulated.exposure,
        count,
        above_chances: simulated.above_chances,
        state: PriorState::Clear,
        reasons: Vec::new(),
    };
    look.reasons = reasons(spec, &look);
    if !look.reasons.is_empty() {
        look.state = PriorState::Look;
    }
    look
}

fn reasons(spec: &Spec, look: &PriorLook) -> Vec<String> {
    let mut reasons = Vec::new();
    if look.expected_rate.upper > WIDEST_RATE * look.expected_rate.lower {
        reasons.push(
            "The expected rate's 95 % range spans more than a factor of 10,000: rates that far apart are not all \
             plausible; narrow the ranges."
                .to_owned(),
        );
    }
    if look.above_chances.is_some_and(|share| share > MOST_ABOVE_CHANCES) {
        reasons.push(
            "The priors allow more incidents than there are chances for them in over one simulated row of a hundred; \
             narrow the ranges."
                .to_owned(),
        );
    }
    if is_provisional(spec) {
        reasons.push(
            "A range is still provisional: put what you hold plausible in its place, then take `provisional = true` \
             away."
                .to_owned(),
        );
    }
    reasons
}

/// Whether any range of the spec is still as `draft` wrote it.
pub fn is_provisional(spec: &Spec) -> bool {
    let baseline = match &spec.baseline {
        Baseline::PlausibleRate(range) => range.standing,
        Baseline::Earlier { .. } => Standing::Settled,
    };
    let ratios = spec
        .covariates
        .iter()
        .map(|covariate| covariate.plausible_ratio.standing);
    let joints = spec.joints.iter().map(|joint| joint.plausible_ratio.standing);
    [baseline, spec.family.standing()]
        .into_iter()
        .chain(ratios)
        .chain(joints)
        .any(|standing| standing == Standing::Provisional)
}

/// What the simulations gave, one entry for each.
struct Simulated {
    /// Baseline rates per unit of raw exposure.
    baselines: Vec<f64>,
    /// Expected rates of rows per unit of raw exposure.
    rates: Vec<f64>,
    counts: Vec<f64>,
    exposure: f64,
    above_chances: Option<f64>,
}

/// The rows as they would stand if each were written out as often as it stands for others.
struct WrittenOut {
    /// For each row, the number of rows up to its last.
    ends: Vec<u64>,
}

impl WrittenOut {
    fn new(design: &Design) -> Self {
        let mut end = 0;
        let ends = design.stands_for.iter().map(|weight| {
            end += *weight as u64;
            end
        });
        WrittenOut { ends: ends.collect() }
    }

    /// How many there are.
    fn rows(&self) -> u64 {
        self.ends.last().copied().unwrap_or(0)
    }

    /// The row of the design behind the one at this place, from 0.
    fn row(&self, place: u64) -> usize {
        self.ends.partition_point(|end| *end <= place)
    }

    /// The exposure in the middle of them, from below.
    fn median_exposure(&self, design: &Design) -> f64 {
        let mut rows: Vec<usize> = (0..self.ends.len()).collect();
        rows.sort_by(|a, b| design.exposure[*a].total_cmp(&design.exposure[*b]));
        let mut reached = 0.0;
        let half = 0.5 * self.rows() as f64;
        rows.into_iter()
            .find(|row| {
                reached += design.stands_for[*row];
                reached >= half
            })
            .map_or(1.0, |row| design.exposure[row])
    }
}

fn simulate(spec: &Spec, design: &Design) -> Simulated {
    let mut stream = Stream::new(spec.study.seed, Purpose::Prior, 0);
    let written_out = WrittenOut::new(design);
    let exposure = written_out.median_exposure(design);
    let scatter_rate = spec.family.scatter_rate();
    let mut baselines = Vec::with_capacity(SIMULATIONS);
    let mut rates = Vec::with_capacity(SIMULATIONS);
    let mut counts = Vec::with_capacity(SIMULATIONS);
    let log_baseline = LogBaseline::of(spec, design.coding.per);
    for _ in 0..SIMULATIONS {
        let baseline = log_baseline.draw(&mut stream);
        let row = written_out.row(stream.below(written_out.rows()));
        let mut predictor = baseline;
        for (term, column) in design.terms.iter().zip(&design.columns) {
            let coefficient = term.prior_mean + term.prior_sd * stream.normal();
            predictor += coefficient * column.get(row).copied().unwrap_or(0.0);
        }
        let factor = scatter_rate.map_or(1.0, |rate| draw_factor(-ln(stream.uniform()) / rate, &mut stream));
        let rate = exp(predictor);
        baselines.push(exp(baseline));
        rates.push(rate);
        counts.push(stream.poisson((rate * exposure * factor).min(LARGEST_MEAN)));
    }
    let above_chances = spec
        .exposure
        .as_ref()
        .filter(|column| column.chances == Chances::OneIncidentEach)
        .map(|_| counts.iter().filter(|&&count| count > exposure).count() as f64 / SIMULATIONS as f64);
    Simulated {
        baselines,
        rates,
        counts,
        exposure,
        above_chances,
    }
}

/// The prior of the baseline: log rate per unit of raw exposure.
enum LogBaseline {
    Normal { mean: f64, sd: f64 },
    LogGamma { incidents: f64, log_exposure: f64 },
}

impl LogBaseline {
    fn of(spec: &Spec, per: f64) -> LogBaseline {
        match &spec.baseline {
            Baseline::PlausibleRate(range) => LogBaseline::Normal {
                mean: range.log_mean() - ln(per),
                sd: range.log_sd(),
            },
            Baseline::Earlier {
                incidents, exposure, ..
            } => LogBaseline::LogGamma {
                incidents: *incidents,
                log_exposure: ln(*exposure),
            },
        }
    }

    fn draw(&self, stream: &mut Stream) -> f64 {
        match self {
            LogBaseline::Normal { mean, sd } => mean + sd * stream.normal(),
            LogBaseline::LogGamma {
                incidents,
                log_exposure,
            } => stream.ln_gamma(*incidents) - log_exposure,
        }
    }
}

/// The gamma factor of mean 1 by which a row's true rate differs from its expected one.
fn draw_factor(scatter: f64, stream: &mut Stream) -> f64 {
    if scatter < NO_SCATTER {
        return 1.0;
    }
    let variance = scatter * scatter;
    stream.gamma(1.0 / variance) * variance
}

/// The baseline's range: exact where it is stated, from the draws where it comes from earlier data.
fn baseline_rate(spec: &Spec, per: f64, drawn: &mut [f64]) -> PriorRange {
    match &spec.baseline {
        Baseline::PlausibleRate(range) => PriorRange {
            lower: range.lo,
            median: exp(range.log_mean()),
            upper: range.hi,
        },
        Baseline::Earlier { .. } => range_of(drawn, per),
    }
}

fn ratio(term: &Term) -> PriorRatio {
    PriorRatio {
        term: term.name.clone(),
        change: term.change.clone(),
        ratio: PriorRange {
            lower: exp(term.prior_mean - NORMAL_975 * term.prior_sd),
            median: exp(term.prior_mean),
            upper: exp(term.prior_mean + NORMAL_975 * term.prior_sd),
        },
    }
}

fn range_of(values: &mut [f64], factor: f64) -> PriorRange {
    values.sort_unstable_by(f64::total_cmp);
    PriorRange {
        lower: factor * quantile_of_sorted(values, 0.025),
        median: factor * quantile_of_sorted(values, 0.5),
        upper: factor * quantile_of_sorted(values, 0.975),
    }
}
