//! Simulated problems of stated size and difficulty.
//!
//! Priors: coefficients Normal(0, 1), baseline about the crude rate with sd 1.5 on the log scale, scatter
//! exponential with rate 3. Each problem comes as negative binomial and, on Poisson data of the same size, as
//! Poisson. [`simulate`](super::simulate) says how the rows come about.

use super::simulate::simulate;
use ratewright::design::{ColumnCoding, Design};
use ratewright::model::Model;
use ratewright::numeric::{exp, ln};
use ratewright::spec::{self, NORMAL_975, Spec, SpecError};
use std::fmt::Write;

/// A problem's size and truth.
#[derive(Debug, Clone, Copy)]
pub struct Problem {
    /// One letter.
    pub name: &'static str,
    /// Rows.
    pub rows: usize,
    /// What the terms are.
    pub columns: Columns,
    /// Expected count of a row at exposure 1 and centred columns.
    pub base: f64,
    /// True scatter of the negative-binomial data; 0 gives Poisson data.
    pub scatter: f64,
    /// The exposures.
    pub exposures: Exposures,
}

/// What the terms of a problem are.
#[derive(Debug, Clone, Copy)]
pub enum Columns {
    /// So many numbers.
    Numbers(usize),
    /// Categories of so many levels each, the reference included.
    Categories(&'static [usize]),
}

/// The exposures of a problem.
#[derive(Debug, Clone, Copy)]
pub enum Exposures {
    /// Each row its own; standard deviation of their logs.
    OfEachRow(f64),
    /// One of so many different ones.
    OneOf(u64),
}

/// The family that a problem is simulated from and fitted with.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Family {
    /// Scatter beyond Poisson's.
    NegativeBinomial,
    /// None, in data and model.
    Poisson,
}

impl Family {
    /// Both.
    pub const BOTH: [Family; 2] = [Family::NegativeBinomial, Family::Poisson];

    /// Its name in tables.
    pub fn name(self) -> &'static str {
        match self {
            Family::NegativeBinomial => "NB2",
            Family::Poisson => "Poisson",
        }
    }
}

/// 500 rows, 8 terms: a small study.
pub const S: Problem = Problem {
    name: "S",
    rows: 500,
    columns: Columns::Numbers(8),
    base: 3.0,
    scatter: 0.6,
    exposures: Exposures::OfEachRow(0.5),
};
/// 60 rows, 12 terms, few incidents: the posterior is skewed.
pub const D: Problem = Problem {
    name: "D",
    rows: 60,
    columns: Columns::Numbers(12),
    base: 0.6,
    scatter: 1.2,
    exposures: Exposures::OfEachRow(0.3),
};
/// 2,000 rows, 8 terms, Poisson data: the scatter's posterior lies against 0.
pub const Z: Problem = Problem {
    name: "Z",
    rows: 2_000,
    columns: Columns::Numbers(8),
    base: 4.0,
    scatter: 0.0,
    exposures: Exposures::OfEachRow(0.5),
};
/// 10,000 rows, 20 terms.
pub const M: Problem = Problem {
    name: "M",
    rows: 10_000,
    columns: Columns::Numbers(20),
    base: 4.0,
    scatter: 0.6,
    exposures: Exposures::OfEachRow(0.5),
};
/// 100,000 rows, 20 terms.
pub const L: Problem = Problem {
    name: "L",
    rows: 100_000,
    ..M
};
/// 100,000 rows of three categories and twelve exposures: few patterns, many rows of each.
pub const C: Problem = Problem {
    name: "C",
    rows: 100_000,
    columns: Columns::Categories(&[4, 6, 10]),
    base: 4.0,
    scatter: 0.6,
    exposures: Exposures::OneOf(12),
};

impl Problem {
    /// Number of terms.
    pub fn terms(&self) -> usize {
        match self.columns {
            Columns::Numbers(terms) => terms,
            Columns::Categories(levels) => levels.iter().map(|levels| levels - 1).sum(),
        }
    }

    /// The same with another number of rows.
    pub fn with_rows(self, rows: usize) -> Problem {
        Problem { rows, ..self }
    }
}

/// A simulated study, ready to be fitted.
pub struct Study {
    /// Its rows.
    pub design: Design,
    /// Its spec.
    pub spec: Spec,
    /// Both together.
    pub model: Model,
}

/// How a study is sampled, as `[sampling]` has it.
#[derive(Debug, Clone, Copy)]
pub struct Sampling {
    /// `steps`
    pub steps: &'static str,
    /// `chains`
    pub chains: usize,
    /// `precision`
    pub precision: f64,
    /// `most_draws`
    pub most_draws: usize,
}

impl Default for Sampling {
    /// What the program does unless it is told otherwise.
    fn default() -> Sampling {
        Sampling {
            steps: "mixed",
            chains: 4,
            precision: 0.02,
            most_draws: 200_000,
        }
    }
}

impl Sampling {
    /// Exactly so many kept draws, and a finest precision that no fit of so few can meet.
    pub fn of_draws(draws: usize) -> Sampling {
        Sampling {
            precision: 0.001,
            most_draws: draws,
            ..Sampling::default()
        }
    }
}

/// Simulates a study from a seed.
///
/// # Errors
/// The spec was refused: this file and `spec` disagree.
pub fn study(problem: &Problem, family: Family, seed: u64, sampling: Sampling) -> Result<Study, SpecError> {
    let design = simulate(problem, family, seed);
    let spec = spec::parse(problem.name, &spec_text(&design, "none.csv", family, seed, sampling))?;
    let model = Model::new(&spec, &design);
    Ok(Study { design, spec, model })
}

/// The spec of a problem; `file` is where its table would lie.
pub fn spec_text(design: &Design, file: &str, family: Family, seed: u64, sampling: Sampling) -> String {
    let incidents: f64 = design.counts.iter().sum();
    let exposure: f64 = design.exposure.iter().sum();
    let crude = incidents / exposure;
    let range = |middle: f64, sd: f64| {
        let reach = exp(sd * NORMAL_975);
        format!("[{:?}, {:?}]", middle / reach, middle * reach)
    };
    let family = match family {
        Family::Poisson => "kind = \"poisson\"".to_owned(),
        Family::NegativeBinomial => format!("kind = \"negative-binomial\"\nscatter_up_to = {:?}", -ln(0.05) / 3.0),
    };
    let Sampling {
        steps,
        chains,
        precision,
        most_draws,
    } = sampling;
    let mut text = format!(
        "[study]\ntitle = \"A simulated study\"\nquestion = \"How fast?\"\nanswer = \"{}\"\nseed = {seed}\n\
         [data]\nfile = \"{file}\"\nunit = \"unit\"\n[incidents]\ncolumn = \"count\"\n\
         [exposure]\ncolumn = \"exposure\"\n[family]\n{family}\n\
         [baseline]\nplausible_rate = {}\n\
         [sampling]\nchains = {chains}\nsteps = \"{steps}\"\nprecision = {precision:?}\nmost_draws = {most_draws}\n",
        design.terms[0].name,
        range(crude, 1.5),
    );
    for covariate in &design.coding.covariates {
        let kind = match &covariate.coding {
            ColumnCoding::Category { reference, .. } => format!("as = \"category\"\nreference = \"{reference}\""),
            _ => "as = \"number\"\ncentre = 0.0\nstep = 1.0".to_owned(),
        };
        // Writing into a string cannot fail.
        let _ = write!(
            text,
            "[[covariate]]\ncolumn = \"{}\"\n{kind}\nplausible_ratio = {}\n",
            covariate.column,
            range(1.0, 1.0)
        );
    }
    text
}
