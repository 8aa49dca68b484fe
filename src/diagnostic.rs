//! What is wrong with something that a person handed in: what, where, and what to do next.
//!
//! Every folder has its own typed faults with the facts in fields; each fault turns into one
//! [`Diagnostic`], and `output` decides how a diagnostic looks on a terminal or in JSON.

use std::ops::Range;

/// One problem, complete: a stable code, the message, every place, and the next step.
#[derive(Debug, Clone, PartialEq)]
pub struct Diagnostic {
    /// Stable, short, kebab-case; each code has an entry in `docs/problems.md`.
    pub code: &'static str,
    /// What is wrong, in one sentence, without the place.
    pub message: String,
    /// Where: all places of one kind of problem together, in the order of the file.
    pub places: Vec<Place>,
    /// How many places there are in all, when `places` holds only the first ones.
    pub places_in_all: usize,
    /// What to do next, in one sentence.
    pub help: String,
}

/// Where a problem is.
#[derive(Debug, Clone, PartialEq)]
pub enum Place {
    /// A file as a whole.
    File {
        /// The file as the person named it.
        file: String,
    },
    /// Characters of the spec, as a byte range into its text.
    Spec {
        /// The spec file as the person named it.
        file: String,
        /// Byte range into the text.
        span: Range<usize>,
        /// What is at this place, shown beside the marked characters; may be empty.
        label: String,
    },
    /// A cell, a row or a column of a table.
    Cell {
        /// The data file as the person named it.
        file: String,
        /// Line of the file, counted from 1, where it is known.
        line: Option<u64>,
        /// Column name, where one is at fault.
        column: Option<String>,
        /// The value found there, where one is at fault.
        value: Option<String>,
    },
}

/// How many places of one kind are listed before the rest is only counted.
pub const PLACES_SHOWN: usize = 10;

impl Diagnostic {
    /// A diagnostic with its places cut to the first [`PLACES_SHOWN`], the count kept.
    pub fn new(code: &'static str, message: impl Into<String>, places: Vec<Place>, help: impl Into<String>) -> Self {
        let places_in_all = places.len();
        let mut places = places;
        places.truncate(PLACES_SHOWN);
        Diagnostic {
            code,
            message: message.into(),
            places,
            places_in_all,
            help: help.into(),
        }
    }
}

/// The messages alone, on one line, for an error's `Display`.
pub fn one_line(diagnostics: &[Diagnostic]) -> String {
    let messages: Vec<&str> = diagnostics
        .iter()
        .map(|diagnostic| diagnostic.message.as_str())
        .collect();
    messages.join("; ")
}

/// The candidate that is spelt most like `word`, if one is near enough to be meant; the first of
/// equals.
///
/// Near enough is a Jaro-Winkler similarity of at least 0.85: `setp` and `step` are 0.93 alike,
/// `hide_below` and `hide_counts_below` 0.88, but `colour` and `column`, no slip of the hand, 0.84.
pub fn nearest<'c>(word: &str, candidates: impl IntoIterator<Item = &'c str>) -> Option<&'c str> {
    let lowered = word.to_lowercase();
    let mut best: Option<(&str, f64)> = None;
    for candidate in candidates {
        let likeness = strsim::jaro_winkler(&lowered, &candidate.to_lowercase());
        if likeness >= 0.85 && best.is_none_or(|(_, so_far)| likeness > so_far) {
            best = Some((candidate, likeness));
        }
    }
    best.map(|(candidate, _)| candidate)
}

#[cfg(test)]
mod tests {
    use super::nearest;

    #[test]
    fn a_slip_of_the_hand_is_recognised_and_another_word_is_not() {
        let names = ["decking", "slope_deg", "falls"];
        assert_eq!(nearest("Decking", names), Some("decking"));
        assert_eq!(nearest("slope-deg", names), Some("slope_deg"));
        assert_eq!(nearest("flals", names), Some("falls"));
        assert_eq!(nearest("boardings", names), None);
    }
}
