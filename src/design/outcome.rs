//! Counts, exposures and what each row stands for, every one of them checked.

use super::cell_rule::CellRule;
use super::fault::DesignFault;
use super::rows::{BadCells, Rows};
use super::types::LARGEST_COUNT;
use crate::spec::{Chances, Spec};

/// The numbers of the rows used that are no covariates.
pub(super) struct Outcome {
    pub counts: Vec<f64>,
    pub exposure: Vec<f64>,
    pub stands_for: Vec<f64>,
}

/// Reads them; what breaks a rule is told in `faults` and stands as NaN.
pub(super) fn read(spec: &Spec, rows: &Rows, faults: &mut Vec<DesignFault>) -> Outcome {
    let counts = numbers(rows, &spec.incidents.column.value, faults, |_, cell| count(cell));
    let exposure = match &spec.exposure {
        None => vec![1.0; rows.len()],
        Some(exposure) => numbers(rows, &exposure.column.value, faults, |at, cell| {
            let exposed = exposed(cell, counts[at])?;
            match exposure.chances {
                Chances::OneIncidentEach if counts[at] > exposed => Err(CellRule::MoreThanChances),
                _ => Ok(exposed),
            }
        }),
    };
    let stands_for = match &spec.data.stands_for {
        None => vec![1.0; rows.len()],
        Some(column) => numbers(rows, &column.value, faults, |_, cell| match count(cell) {
            Ok(rows) if rows >= 1.0 => Ok(rows),
            Err(CellRule::CountLargest) => Err(CellRule::StandsForLargest),
            _ => Err(CellRule::StandsFor),
        }),
    };
    Outcome {
        counts,
        exposure,
        stands_for,
    }
}

/// Reads a column by a rule of its own; a missing column, which has been told already, gives NaN.
pub(super) fn numbers(
    rows: &Rows,
    name: &str,
    faults: &mut Vec<DesignFault>,
    judge: impl Fn(usize, Option<f64>) -> Result<f64, CellRule>,
) -> Vec<f64> {
    let Some(column) = rows.table.column(name) else {
        return vec![f64::NAN; rows.len()];
    };
    let mut bad = BadCells::default();
    let mut read = Vec::with_capacity(rows.len());
    for at in 0..rows.len() {
        let number = judge(at, column.number(rows.rows[at])).unwrap_or_else(|rule| {
            bad.add(rule, rows.bad(at, column));
            f64::NAN
        });
        read.push(number);
    }
    bad.into_faults(faults);
    read
}

fn count(cell: Option<f64>) -> Result<f64, CellRule> {
    let count = cell.ok_or(CellRule::CountNumber)?;
    if !count.is_finite() {
        Err(CellRule::CountFinite)
    } else if count < 0.0 {
        Err(CellRule::CountNegative)
    } else if count > LARGEST_COUNT {
        Err(CellRule::CountLargest)
    } else if count.fract() != 0.0 {
        Err(CellRule::CountFraction)
    } else {
        // "-0" is a count of 0: the sign must not reach an output.
        Ok(count.abs())
    }
}

fn exposed(cell: Option<f64>, count: f64) -> Result<f64, CellRule> {
    let exposure = cell.ok_or(CellRule::ExposureNumber)?;
    if !exposure.is_finite() {
        Err(CellRule::ExposureFinite)
    } else if exposure < 0.0 {
        Err(CellRule::ExposureNegative)
    } else if exposure > 0.0 {
        Ok(exposure)
    } else if count > 0.0 {
        Err(CellRule::ExposureMissed)
    } else {
        Err(CellRule::ExposureZero)
    }
}
