//! From faults to diagnostics: all of one kind become one [`Diagnostic`].

use super::fault::{SpecError, SpecFault};
use super::words::Told;
use crate::diagnostic::{Diagnostic, Place};

impl SpecError {
    /// The problems in words: all of one kind together, in the order in which the first of each
    /// kind stands in the text.
    pub fn diagnostics(&self) -> Vec<Diagnostic> {
        let mut codes: Vec<&'static str> = Vec::new();
        for fault in &self.faults {
            if !codes.contains(&fault.code()) {
                codes.push(fault.code());
            }
        }
        codes.into_iter().map(|code| self.diagnostic(code)).collect()
    }

    fn diagnostic(&self, code: &'static str) -> Diagnostic {
        let faults: Vec<&SpecFault> = self.faults.iter().filter(|fault| fault.code() == code).collect();
        let told: Vec<Told> = faults.iter().map(|fault| fault.told()).collect();
        let mut helps: Vec<&str> = Vec::new();
        for one in &told {
            if !helps.contains(&one.help.as_str()) {
                helps.push(&one.help);
            }
        }
        let message = match told.as_slice() {
            [one] => one.message.clone(),
            _ => format!("{} {}", told.len(), plural(code)) + &self.missing_tables(code),
        };
        let mut places = Vec::new();
        for (fault, one) in faults.iter().zip(&told) {
            places.extend(self.places(fault, &one.label));
        }
        // Faults without a place of their own share the file as a whole.
        places.dedup();
        Diagnostic::new(code, message, places, helps.join(" "))
    }

    /// The names of tables that are missing: they have no place to stand beside.
    fn missing_tables(&self, code: &str) -> String {
        let missing = self
            .faults
            .iter()
            .filter(|fault| fault.code() == code)
            .filter_map(|fault| match fault {
                SpecFault::MissingTable { table } => Some(table.as_str()),
                _ => None,
            });
        let names = missing.collect::<Vec<_>>().join(", ");
        if names.is_empty() { names } else { format!(": {names}") }
    }

    fn places(&self, fault: &SpecFault, label: &str) -> Vec<Place> {
        let place = |span, label: &str| Place::Spec {
            file: self.source.file.clone(),
            span,
            label: label.to_string(),
        };
        let Some(span) = fault.span() else {
            return vec![Place::File {
                file: self.source.file.clone(),
            }];
        };
        let first = match fault {
            SpecFault::DuplicateTerm { first: Some(first), .. } => Some(place(first.clone(), "it stands here first")),
            SpecFault::TwoBaselines { range, .. } => Some(place(range.clone(), "a range")),
            _ => None,
        };
        first.into_iter().chain([place(span, label)]).collect()
    }
}

/// Several faults of one kind, to follow their number.
fn plural(code: &str) -> &'static str {
    match code {
        "not-toml" => "places are not valid TOML",
        "unknown-key" => "keys or tables are not known",
        "not-known-yet" => "parts are planned, but this version does not know them yet",
        "misplaced-key" => "keys do not go with the kind that was chosen",
        "missing-table" => "tables are missing",
        "missing-key" => "keys are missing",
        "wrong-type" => "values are of the wrong type",
        "not-a-choice" => "values are none of those allowed",
        "out-of-bounds" => "numbers are out of bounds",
        "bad-range" => "ranges cannot be used",
        "blank-value" => "values are empty",
        "duplicate-term" => "terms would exist twice",
        "counts-reused" => "keys name the column of the counts again",
        "bad-joint" => "joints cannot be made",
        "bad-merge" => "merges cannot be made",
        _ => "problems of one kind",
    }
}

impl SpecFault {
    /// The stable code of this kind of fault.
    pub fn code(&self) -> &'static str {
        match self {
            SpecFault::Unreadable { .. } => "spec-unreadable",
            SpecFault::TooLarge => "spec-too-large",
            SpecFault::IsTable => "table-for-spec",
            SpecFault::Empty => "spec-empty",
            SpecFault::NotUtf8 { .. } => "spec-not-utf-8",
            SpecFault::Syntax { .. } => "not-toml",
            SpecFault::UnknownKey { .. } => "unknown-key",
            SpecFault::NotYet { .. } => "not-known-yet",
            SpecFault::Misplaced { .. } => "misplaced-key",
            SpecFault::MissingTable { .. } => "missing-table",
            SpecFault::MissingKey { .. } => "missing-key",
            SpecFault::WrongType { .. } => "wrong-type",
            SpecFault::NotAChoice { .. } => "not-a-choice",
            SpecFault::OutOfBounds { .. } => "out-of-bounds",
            SpecFault::BadRange { .. } => "bad-range",
            SpecFault::Blank { .. } => "blank-value",
            SpecFault::DuplicateTerm { .. } => "duplicate-term",
            SpecFault::CountsReused { .. } => "counts-reused",
            SpecFault::PeriodIsUnit { .. } => "period-is-unit",
            SpecFault::BadJoint { .. } => "bad-joint",
            SpecFault::BadMerge { .. } => "bad-merge",
            SpecFault::TwoBaselines { .. } => "two-baselines",
            SpecFault::EarlierRefused { .. } => "earlier-refused",
            SpecFault::NoSuchAnswer { .. } => "no-such-answer",
        }
    }
}
