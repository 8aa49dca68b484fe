//! What is no error and should be known before a fit. It looks at no outcome.

use super::condition::Scaled;
use super::rows::{choose, labels};
use super::types::{ColumnCoding, Design};
use crate::spec::{Baseline, CovariateKind, Family, Merge, Spec, Standing};
use crate::table::Table;
use std::collections::HashMap;
use std::fmt;

/// A level in fewer rows than this is sparse.
pub const FEW_LEVEL_ROWS: usize = 5;
/// A condition number above this is told (Belsley, Kuh & Welsch 1980, section 3.2, from memory).
pub const HIGH_CONDITION: f64 = 30.0;
/// A leverage above this is told: the row weighs more in its own fit than all others together
/// (Huber 1981, Robust Statistics, section 7.2, from memory: avoid values above 0.5).
pub const HIGH_LEVERAGE: f64 = 0.5;
/// A largest exposure above this many times the smallest is told.
pub const WIDE_EXPOSURE: f64 = 1e6;
/// How many lines or names a remark lists before it only counts.
const LISTED: usize = 10;

/// Something about a study's rows and ranges that is no error.
#[derive(Debug, Clone, PartialEq)]
pub enum Remark {
    /// A level that few rows have.
    SparseLevel {
        /// The column.
        column: String,
        /// The level.
        level: String,
        /// Its rows.
        rows: usize,
    },
    /// A merged level that bears the name of a level of the file, which the merge does not list.
    MergedIntoLevel {
        /// The column.
        column: String,
        /// That level.
        level: String,
        /// The levels that are taken into it.
        taken: Vec<String>,
    },
    /// Terms that come close to determining one another.
    NearCollinear {
        /// The condition number of the scaled columns.
        condition: f64,
        /// The terms involved.
        terms: Vec<String>,
    },
    /// A number whose centre lies outside its values, so that the baseline is an extrapolation.
    FarCentre {
        /// The column.
        column: String,
        /// The centre.
        centre: f64,
        /// The smallest value.
        least: f64,
        /// The largest value.
        greatest: f64,
    },
    /// Rows that outweigh all others in their own fit.
    Leverage {
        /// Their lines.
        lines: Vec<u64>,
    },
    /// Units with several rows of one period.
    RepeatedPeriods {
        /// Unit and period of each, with the lines of its rows.
        repeated: Vec<(String, String, Vec<u64>)>,
    },
    /// Exposures of very different size.
    WideExposure {
        /// The smallest, with its line.
        least: (f64, u64),
        /// The largest, with its line.
        greatest: (f64, u64),
    },
    /// Ranges that are still provisional.
    Provisional {
        /// The parts of the spec that hold them.
        parts: Vec<String>,
    },
}

/// The remarks on a study whose design stands, in the order of [`Remark`]'s variants.
pub fn remarks(spec: &Spec, table: &Table, design: &Design) -> Vec<Remark> {
    let mut remarks = Vec::new();
    sparse_levels(design, &mut remarks);
    merged_into_levels(spec, design, &mut remarks);
    let scaled = Scaled::new(&design.columns, design.counts.len());
    if let Some(scaled) = &scaled {
        near_collinear(design, scaled, &mut remarks);
    }
    // The study has been built, so that choosing its rows again finds no fault.
    let rows = choose(spec, table, &mut Vec::new()).used.rows;
    far_centres(design, table, &rows, &mut remarks);
    if let Some(scaled) = &scaled {
        leverage(design, scaled, &mut remarks);
    }
    repeated_periods(spec, table, &rows, &mut remarks);
    wide_exposure(design, &mut remarks);
    provisional(spec, &mut remarks);
    remarks
}

fn sparse_levels(design: &Design, remarks: &mut Vec<Remark>) {
    let mut next = design.columns.iter();
    for covariate in &design.coding.covariates {
        let ColumnCoding::Category { reference, levels, .. } = &covariate.coding else {
            next.next();
            continue;
        };
        let rows: Vec<usize> = next
            .by_ref()
            .take(levels.len())
            .map(|column| column.iter().filter(|&&is| is > 0.0).count())
            .collect();
        let of_reference = design.counts.len() - rows.iter().sum::<usize>();
        let all = std::iter::once((reference, of_reference)).chain(levels.iter().zip(rows));
        remarks.extend(
            all.filter(|(_, rows)| *rows < FEW_LEVEL_ROWS)
                .map(|(level, rows)| Remark::SparseLevel {
                    column: covariate.column.clone(),
                    level: level.clone(),
                    rows,
                }),
        );
    }
}

fn merged_into_levels(spec: &Spec, design: &Design, remarks: &mut Vec<Remark>) {
    for (covariate, coded) in spec.covariates.iter().zip(&design.coding.covariates) {
        let (CovariateKind::Category { merge: asked, .. }, ColumnCoding::Category { merge, .. }) =
            (&covariate.kind, &coded.coding)
        else {
            continue;
        };
        for Merge { into, levels } in asked {
            let listed = levels.iter().any(|level| level.value == into.value);
            let in_file = merge.iter().any(|(from, _)| *from == into.value);
            if in_file && !listed {
                remarks.push(Remark::MergedIntoLevel {
                    column: coded.column.clone(),
                    level: into.value.clone(),
                    taken: levels.iter().map(|level| level.value.clone()).collect(),
                });
            }
        }
    }
}

fn near_collinear(design: &Design, scaled: &Scaled, remarks: &mut Vec<Remark>) {
    let condition = scaled.number();
    if condition > HIGH_CONDITION {
        let name = |column: usize| match column {
            0 => "baseline".to_owned(),
            term => design.terms[term - 1].name.clone(),
        };
        remarks.push(Remark::NearCollinear {
            condition,
            terms: scaled.involved().into_iter().map(name).collect(),
        });
    }
}

fn far_centres(design: &Design, table: &Table, rows: &[usize], remarks: &mut Vec<Remark>) {
    for covariate in &design.coding.covariates {
        let (ColumnCoding::Number { centre, .. } | ColumnCoding::LogNumber { centre }) = covariate.coding else {
            continue;
        };
        let Some(column) = table.column(&covariate.column) else {
            continue;
        };
        let numbers = || rows.iter().filter_map(|&row| column.number(row));
        let least = numbers().fold(f64::INFINITY, f64::min);
        let greatest = numbers().fold(f64::NEG_INFINITY, f64::max);
        if centre < least || centre > greatest {
            remarks.push(Remark::FarCentre {
                column: covariate.column.clone(),
                centre,
                least,
                greatest,
            });
        }
    }
}

fn leverage(design: &Design, scaled: &Scaled, remarks: &mut Vec<Remark>) {
    let leverage = scaled.leverage();
    let high = leverage
        .iter()
        .zip(&design.lines)
        .filter(|(leverage, _)| **leverage > HIGH_LEVERAGE);
    let lines: Vec<u64> = high.map(|(_, &line)| line).collect();
    if !lines.is_empty() {
        remarks.push(Remark::Leverage { lines });
    }
}

fn repeated_periods(spec: &Spec, table: &Table, rows: &[usize], remarks: &mut Vec<Remark>) {
    let Some(period) = spec.data.period.as_ref().and_then(|period| table.column(&period.value)) else {
        return;
    };
    let Some(unit) = table.column(&spec.data.unit.value) else {
        return;
    };
    let (unit_of, units) = labels(unit, rows.iter().copied());
    let (period_of, periods) = labels(period, rows.iter().copied());
    let mut places: HashMap<(usize, usize), usize> = HashMap::new();
    let mut lines: Vec<((usize, usize), Vec<u64>)> = Vec::new();
    for (at, &row) in rows.iter().enumerate() {
        let key = (unit_of[at], period_of[at]);
        let place = *places.entry(key).or_insert(lines.len());
        if place == lines.len() {
            lines.push((key, Vec::new()));
        }
        lines[place].1.push(table.lines[row]);
    }
    let repeated: Vec<(String, String, Vec<u64>)> = lines
        .into_iter()
        .filter(|(_, lines)| lines.len() > 1)
        .map(|((unit, period), lines)| (units[unit].clone(), periods[period].clone(), lines))
        .collect();
    if !repeated.is_empty() {
        remarks.push(Remark::RepeatedPeriods { repeated });
    }
}

fn wide_exposure(design: &Design, remarks: &mut Vec<Remark>) {
    let all = || design.exposure.iter().copied().zip(design.lines.iter().copied());
    let least = all().min_by(|a, b| a.0.total_cmp(&b.0));
    let greatest = all().max_by(|a, b| a.0.total_cmp(&b.0));
    if let (Some(least), Some(greatest)) = (least, greatest)
        && greatest.0 / least.0 > WIDE_EXPOSURE
    {
        remarks.push(Remark::WideExposure { least, greatest });
    }
}

fn provisional(spec: &Spec, remarks: &mut Vec<Remark>) {
    let mut parts = Vec::new();
    if let Family::NegativeBinomial {
        standing: Standing::Provisional,
        ..
    } = spec.family
    {
        parts.push("[family]".to_owned());
    }
    if let Baseline::PlausibleRate(range) = &spec.baseline
        && range.standing == Standing::Provisional
    {
        parts.push("[baseline]".to_owned());
    }
    let provisional = spec
        .covariates
        .iter()
        .filter(|covariate| covariate.plausible_ratio.standing == Standing::Provisional);
    parts.extend(provisional.map(|covariate| covariate.column.value.clone()));
    let provisional = spec
        .joints
        .iter()
        .filter(|joint| joint.plausible_ratio.standing == Standing::Provisional);
    parts.extend(provisional.map(|joint| format!("{} with {}", joint.of[0].value, joint.of[1].value)));
    if !parts.is_empty() {
        remarks.push(Remark::Provisional { parts });
    }
}

impl Remark {
    /// Stable, short, kebab-case.
    pub fn code(&self) -> &'static str {
        match self {
            Remark::SparseLevel { .. } => "sparse-level",
            Remark::MergedIntoLevel { .. } => "merged-into-level",
            Remark::NearCollinear { .. } => "near-collinear",
            Remark::FarCentre { .. } => "far-centre",
            Remark::Leverage { .. } => "leverage",
            Remark::RepeatedPeriods { .. } => "repeated-period",
            Remark::WideExposure { .. } => "wide-exposure",
            Remark::Provisional { .. } => "provisional",
        }
    }
}

impl fmt::Display for Remark {
    /// What is so, and what it means, in a sentence or two.
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self {
            Remark::SparseLevel { column, level, rows } => write!(
                f,
                "{} `{column}` \"{level}\": its rate ratio will rest largely on its plausible range; consider `merge`.",
                if *rows == 1 {
                    "Only 1 row has".to_owned()
                } else {
                    format!("Only {rows} rows have")
                }
            ),
            Remark::MergedIntoLevel { column, level, taken } => write!(
                f,
                "`merge` takes {} of `{column}` into \"{level}\", which is itself a level of the file: they can no \
                 longer be told apart. If that is meant, list \"{level}\" among its levels too; if not, choose a name \
                 that no level has.",
                first_ones(taken)
            ),
            Remark::NearCollinear { condition, terms } => write!(
                f,
                "The rows can hardly tell {} apart (condition number {condition:.0}; above {HIGH_CONDITION} is high): \
                 their intervals will be wide. A centre within the values, or leaving one out, helps.",
                first_ones(terms)
            ),
            Remark::FarCentre {
                column,
                centre,
                least,
                greatest,
            } => write!(
                f,
                "The centre of `{column}`, {centre}, lies outside its values, {least} to {greatest}: the baseline is \
                 then a rate that no row comes near. Choose a centre within the values."
            ),
            Remark::Leverage { lines } => write!(
                f,
                "{} more weight in {} own fit than all other rows together (leverage above {HIGH_LEVERAGE}): {}. \
                 Check the covariates there.",
                if lines.len() == 1 {
                    "1 row has".to_owned()
                } else {
                    format!("{} rows have", lines.len())
                },
                if lines.len() == 1 { "its" } else { "their" },
                lines_told(lines)
            ),
            Remark::RepeatedPeriods { repeated } => {
                let told = |(unit, period, lines): &(String, String, Vec<u64>)| {
                    format!("{unit}, {period} ({})", lines_told(lines))
                };
                let told: Vec<String> = repeated.iter().take(LISTED).map(told).collect();
                let rest = repeated.len() - told.len();
                write!(f, "Some units have several rows of one period: {}", told.join("; "))?;
                if rest > 0 {
                    write!(f, "; and {rest} more")?;
                }
                write!(f, ". Check that no row was entered twice.")
            }
            Remark::WideExposure { least, greatest } => write!(
                f,
                "Exposure reaches from {} (line {}) to {} (line {}), more than a millionfold: check its units.",
                least.0, least.1, greatest.0, greatest.1
            ),
            Remark::Provisional { parts } => write!(
                f,
                "Provisional plausible ranges stand in {}: narrow each to what is believed before the data are seen, \
                 then take `provisional` out.",
                first_ones(parts)
            ),
        }
    }
}

fn first_ones(names: &[String]) -> String {
    let told: Vec<String> = names.iter().take(LISTED).map(|name| format!("`{name}`")).collect();
    match names.len() - told.len() {
        0 => told.join(", "),
        rest => format!("{} and {rest} more", told.join(", ")),
    }
}

fn lines_told(lines: &[u64]) -> String {
    let told: Vec<String> = lines.iter().take(LISTED).map(u64::to_string).collect();
    let word = if lines.len() == 1 { "line" } else { "lines" };
    match lines.len() - told.len() {
        0 => format!("{word} {}", told.join(", ")),
        rest => format!("{word} {} and {rest} more", told.join(", ")),
    }
}
