//! What each term stands for, read off the coding: the sentence builder's grammar.

use crate::answer::number::as_written;
use crate::design::{Coding, ColumnCoding, CovariateCoding};

/// A change in one column.
#[derive(Debug, Clone, PartialEq)]
pub enum Part {
    /// One level of a category against the reference.
    Level {
        /// The column.
        column: String,
        /// The level.
        level: String,
        /// What it is compared with.
        reference: String,
    },
    /// A number that is larger by a step.
    Step {
        /// The column.
        column: String,
        /// The step.
        step: f64,
        /// Where the baseline sits.
        centre: f64,
    },
    /// A number that is twice as large.
    Doubling {
        /// The column.
        column: String,
        /// Where the baseline sits.
        centre: f64,
    },
}

/// What a term stands for.
#[derive(Debug, Clone, PartialEq)]
pub enum Meaning {
    /// A change in one column.
    Alone {
        /// The change.
        part: Part,
        /// Columns that share a joint term with it: its rate ratio holds where they are at their
        /// centre or reference.
        while_at: Vec<String>,
    },
    /// How the rate ratio of one change differs with another.
    Joint(Part, Part),
}

/// The terms of a coding by name, with what each stands for.
pub fn meanings(coding: &Coding) -> Vec<(String, Meaning)> {
    let mut all = Vec::new();
    for (place, covariate) in coding.covariates.iter().enumerate() {
        let while_at: Vec<String> = coding
            .joints
            .iter()
            .filter_map(|&[a, b]| match (a == place, b == place) {
                (true, _) => coding.covariates.get(b),
                (_, true) => coding.covariates.get(a),
                _ => None,
            })
            .map(at_baseline)
            .collect();
        for (name, part) in parts(covariate) {
            let while_at = while_at.clone();
            all.push((name, Meaning::Alone { part, while_at }));
        }
    }
    for &[a, b] in &coding.joints {
        let (Some(a), Some(b)) = (coding.covariates.get(a), coding.covariates.get(b)) else {
            continue;
        };
        for (name_a, part_a) in parts(a) {
            for (name_b, part_b) in parts(b) {
                all.push((
                    format!("{name_a} with {name_b}"),
                    Meaning::Joint(part_a.clone(), part_b),
                ));
            }
        }
    }
    all
}

/// Where the baseline sits in one column: `decking is plain`, `slope_deg is 8`.
pub fn at_baseline(covariate: &CovariateCoding) -> String {
    match &covariate.coding {
        ColumnCoding::Category { reference, .. } => format!("{} is {reference}", covariate.column),
        ColumnCoding::Number { centre, .. } | ColumnCoding::LogNumber { centre } => {
            format!("{} is {}", covariate.column, rounded_centre(*centre))
        }
    }
}

/// A centre as written, unless it is a mean with a long tail of digits: then four digits of it.
fn rounded_centre(centre: f64) -> String {
    let plain = as_written(centre);
    if plain.len() <= 8 {
        return plain;
    }
    // Through the exponent form, which rounds to significant digits.
    format!("{centre:.3e}").parse().map_or(plain, as_written)
}

/// The terms of one covariate by name.
fn parts(covariate: &CovariateCoding) -> Vec<(String, Part)> {
    let column = &covariate.column;
    match &covariate.coding {
        ColumnCoding::Category { reference, levels, .. } => levels
            .iter()
            .map(|level| {
                let part = Part::Level {
                    column: column.clone(),
                    level: level.clone(),
                    reference: reference.clone(),
                };
                (format!("{column}={level}"), part)
            })
            .collect(),
        &ColumnCoding::Number { centre, step } => {
            let column = column.clone();
            vec![(column.clone(), Part::Step { column, step, centre })]
        }
        &ColumnCoding::LogNumber { centre } => {
            let column = column.clone();
            vec![(column.clone(), Part::Doubling { column, centre })]
        }
    }
}

impl Part {
    /// As the circumstance of a sentence: `where decking is grooved`, `for each 2 more in slope_deg`.
    pub fn circumstance(&self) -> String {
        match self {
            Part::Level { column, level, .. } => format!("where {column} is {level}"),
            Part::Step { column, step, .. } => format!("for each {} more in {column}", as_written(*step)),
            Part::Doubling { column, .. } => format!("for each doubling of {column}"),
        }
    }

    /// What it is compared with, when that has to be said: ` than where it is plain`.
    pub fn compared_with(&self) -> String {
        match self {
            Part::Level { reference, .. } => format!(" than where it is {reference}"),
            Part::Step { .. } | Part::Doubling { .. } => String::new(),
        }
    }

    /// As what a rate ratio is for: `decking grooved against plain`, `each 2 more in slope_deg`.
    pub fn as_change(&self) -> String {
        match self {
            Part::Level {
                column,
                level,
                reference,
            } => format!("{column} {level} against {reference}"),
            Part::Step { column, step, .. } => format!("each {} more in {column}", as_written(*step)),
            Part::Doubling { column, .. } => format!("each doubling of {column}"),
        }
    }
}
