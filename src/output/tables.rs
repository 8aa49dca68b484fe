//! The CSV tables of a run, for spreadsheets and statistics programs.
//!
//! UTF-8, comma, a header line, one line break (`\n`) after each line. Numbers stand in their
//! shortest form that reads back to the same 64-bit value; what is absent is an empty cell.

use crate::check::UnitState;
use crate::output::OutputError;
use crate::output::findings::Findings;
use crate::output::shown::{Audience, Observed};

/// `coefficients.csv`: every parameter, on the log scale but for the scatter.
pub fn coefficients(findings: &Findings) -> Result<String, OutputError> {
    let mut table = Sheet::new(
        "coefficients.csv",
        &[
            "term",
            "median",
            "lower",
            "upper",
            "mean",
            "sd",
            "error_of_mean",
            "error_of_lower",
            "error_of_upper",
            "effective_draws",
            "effective_tail_draws",
            "split_r_hat",
            "laplace_mean",
            "laplace_sd",
            "stopped",
        ],
    );
    for c in &findings.coefficients {
        table.row(&[
            Cell::Text(&c.term),
            Cell::Number(c.median),
            Cell::Number(c.lower),
            Cell::Number(c.upper),
            Cell::Number(c.mean),
            Cell::Number(c.sd),
            Cell::Number(c.error_of_mean),
            Cell::Number(c.error_of_lower),
            Cell::Number(c.error_of_upper),
            Cell::Number(c.effective_draws),
            Cell::Number(c.effective_tail_draws),
            c.split_r_hat.map_or(Cell::Absent, Cell::Number),
            Cell::Number(c.laplace_mean),
            Cell::Number(c.laplace_sd),
            Cell::Text(findings.sampling.stopped.word()),
        ])?;
    }
    Ok(table.text)
}

/// `rate_ratios.csv`: every term but the baseline.
pub fn rate_ratios(findings: &Findings) -> Result<String, OutputError> {
    let mut table = Sheet::new(
        "rate_ratios.csv",
        &[
            "term",
            "change",
            "rate_ratio",
            "lower",
            "upper",
            "prob_below_one",
            "stopped",
        ],
    );
    for r in &findings.rate_ratios {
        table.row(&[
            Cell::Text(&r.term),
            Cell::Text(&r.change),
            Cell::Number(r.rate_ratio),
            Cell::Number(r.lower),
            Cell::Number(r.upper),
            Cell::Number(r.prob_below_one),
            Cell::Text(findings.sampling.stopped.word()),
        ])?;
    }
    Ok(table.text)
}

/// `units.csv`: the predictive check of every unit, small counts as `audience` may see them.
pub fn units(findings: &Findings, audience: Audience) -> Result<String, OutputError> {
    let mut table = Sheet::new(
        "units.csv",
        &[
            "unit",
            "rows",
            "exposure",
            "observed_from",
            "observed_to",
            "expected",
            "lower",
            "upper",
            "tail_probability",
            "state",
        ],
    );
    let units = &findings.units.units;
    for (u, shown) in units.iter().zip(audience.observed(units)) {
        let ends = |from: f64, to: f64| (Cell::Number(from), Cell::Number(to));
        let ((from, to), tail, state) = match shown {
            Observed::Count(count) => (
                ends(count, count),
                Cell::Number(u.tail_probability),
                state_word(u.state),
            ),
            Observed::Hidden { from, to } => (ends(from as f64, to as f64), Cell::Absent, "hidden"),
            Observed::HiddenToo => ((Cell::Absent, Cell::Absent), Cell::Absent, "hidden"),
        };
        table.row(&[
            Cell::Text(&u.unit),
            Cell::Number(u.rows),
            Cell::Number(u.exposure),
            from,
            to,
            Cell::Number(u.expected),
            Cell::Number(u.lower),
            Cell::Number(u.upper),
            tail,
            Cell::Text(state),
        ])?;
    }
    Ok(table.text)
}

/// A unit's state as files spell it.
pub fn state_word(state: UnitState) -> &'static str {
    match state {
        UnitState::Inside => "inside",
        UnitState::Below => "below",
        UnitState::Above => "above",
    }
}

/// A number in its shortest form that reads back to the same value.
///
/// Far from 1 the plain form would be hundreds of digits long; there the exponent form stands.
pub fn number(value: f64) -> String {
    let size = value.abs();
    if size != 0.0 && !(1e-5..1e16).contains(&size) {
        format!("{value:e}")
    } else {
        // Minus nothing is nothing.
        format!("{}", value + 0.0)
    }
}

/// Text that no spreadsheet runs as a formula.
///
/// A cell that begins with one of `= + - @`, a tab or a carriage return is a formula to a
/// spreadsheet, and a unit may be named anything. An apostrophe in front makes it text there; a
/// program that reads the table takes it off again.
pub fn harmless(text: &str) -> String {
    if text.starts_with(['=', '+', '-', '@', '\t', '\r']) {
        format!("'{text}")
    } else {
        text.to_owned()
    }
}

/// Text without control characters other than tabs and line breaks, which a quoted cell may hold: the
/// others are written out (`\u{1b}`), since a table is often looked at in a terminal.
fn without_controls(text: &str) -> String {
    let mut out = String::with_capacity(text.len());
    for c in text.chars() {
        if c.is_control() && !matches!(c, '\t' | '\n' | '\r') {
            out.extend(c.escape_unicode());
        } else {
            out.push(c);
        }
    }
    out
}

/// One cell.
enum Cell<'a> {
    /// Text.
    Text(&'a str),
    /// A finite number.
    Number(f64),
    /// Nothing.
    Absent,
}

/// A CSV file in the making.
struct Sheet<'a> {
    file: &'static str,
    header: &'a [&'static str],
    text: String,
}

impl<'a> Sheet<'a> {
    fn new(file: &'static str, header: &'a [&'static str]) -> Sheet<'a> {
        let mut text = header.join(",");
        text.push('\n');
        Sheet { file, header, text }
    }

    fn row(&mut self, cells: &[Cell]) -> Result<(), OutputError> {
        for (place, cell) in cells.iter().enumerate() {
            if place > 0 {
                self.text.push(',');
            }
            match cell {
                Cell::Absent => {}
                Cell::Text(text) => self.text.push_str(&quoted(&harmless(&without_controls(text)))),
                Cell::Number(value) if value.is_finite() => self.text.push_str(&number(*value)),
                Cell::Number(_) => {
                    return Err(OutputError::NotFinite {
                        file: self.file,
                        place: self
                            .header
                            .get(place)
                            .map_or_else(String::new, |name| format!("column {name}")),
                    });
                }
            }
        }
        self.text.push('\n');
        Ok(())
    }
}

/// In quotation marks where the comma form needs them (RFC 4180), and where a spreadsheet of another
/// country would end the cell: what follows a semicolon might then be run as a formula.
fn quoted(text: &str) -> String {
    if text.contains([',', ';', '"', '\n', '\r', '\t']) {
        format!("\"{}\"", text.replace('"', "\"\""))
    } else {
        text.to_owned()
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn formulas_become_text_and_numbers_do_not() {
        assert_eq!(harmless("=1+1"), "'=1+1");
        assert_eq!(harmless("@here"), "'@here");
        assert_eq!(harmless("\tx"), "'\tx");
        assert_eq!(harmless("a=b"), "a=b");
        assert_eq!(number(-1.5), "-1.5");
    }

    #[test]
    fn controls_are_written_out_but_for_tabs_and_line_breaks() {
        assert_eq!(without_controls("a\u{1b}[2J\u{9b}b\u{0}"), "a\\u{1b}[2J\\u{9b}b\\u{0}");
        assert_eq!(quoted(&without_controls("a\tb\r\n")), "\"a\tb\r\n\"");
    }

    #[test]
    fn cells_are_quoted_where_they_must_be() {
        assert_eq!(quoted("a,b"), "\"a,b\"");
        assert_eq!(quoted("say \"x\""), "\"say \"\"x\"\"\"");
        assert_eq!(quoted("plain"), "plain");
    }

    #[test]
    fn every_number_reads_back() {
        for value in [0.1, -0.1, 1e-300, 123_456_789.25, 1e16, 5e-324, f64::MAX, 1.0 / 3.0] {
            assert_eq!(number(value).parse::<f64>().unwrap().to_bits(), value.to_bits());
        }
        assert_eq!(number(-0.0), "0");
        assert_eq!(number(160.0), "160");
    }
}
