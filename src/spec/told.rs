//! Faults in words: all of one kind become one [`Diagnostic`].

use super::fault::{
    AnswerFault, EarlierFault, Encoding, JointFault, KeyHint, MergeFault, RangeFault, SpecError, SpecFault,
};
use super::keys::one_of;
use crate::diagnostic::{Diagnostic, Place};

/// One fault in words.
struct Told {
    /// What is wrong, when it is the only one of its kind.
    message: String,
    /// What to write beside the place.
    label: String,
    /// What to do.
    help: String,
}

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
            _ => format!("{} {}", told.len(), plural(code)),
        };
        let mut places = Vec::new();
        for (fault, one) in faults.iter().zip(&told) {
            places.extend(self.places(fault, &one.label));
        }
        Diagnostic::new(code, message, places, helps.join(" "))
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
            SpecFault::BadJoint { .. } => "bad-joint",
            SpecFault::BadMerge { .. } => "bad-merge",
            SpecFault::TwoBaselines { .. } => "two-baselines",
            SpecFault::EarlierRefused { .. } => "earlier-refused",
            SpecFault::NoSuchAnswer { .. } => "no-such-answer",
        }
    }

    fn told(&self) -> Told {
        let told = |message: String, label: String, help: &str| Told {
            message,
            label,
            help: help.to_string(),
        };
        match self {
            SpecFault::Unreadable { reason } => told(
                format!("the spec cannot be read: {reason}"),
                String::new(),
                "Check the path and that you may read the file.",
            ),
            SpecFault::Empty => told(
                "the spec is empty".into(),
                String::new(),
                "Start from what `ratewright draft DATA` writes for your table.",
            ),
            SpecFault::NotUtf8 {
                line,
                offset,
                looks_like,
            } => told(
                match looks_like {
                    Encoding::Utf16 => "the spec is not UTF-8: it looks like UTF-16".into(),
                    Encoding::Other => {
                        format!(
                            "the spec is not UTF-8: the first bad byte is in line {line} (byte {offset} of the file)"
                        )
                    }
                },
                String::new(),
                "Save the file as UTF-8: most editors offer the encoding when saving.",
            ),
            SpecFault::Syntax { what, .. } => told(
                "the spec is not valid TOML".into(),
                what.clone(),
                "Correct the marked place; texts stand in quotes, lists in [ ], one `key = value` a line.",
            ),
            SpecFault::UnknownKey { table, key, hint } => unknown_key(table.as_deref(), &key.value, hint),
            SpecFault::NotYet { part, what, .. } => told(
                format!("this version does not know {part} yet"),
                format!("{what}: not known yet"),
                "Leave it out: nothing that a spec says may be passed over in silence.",
            ),
            SpecFault::Misplaced {
                table,
                key,
                decided,
                goes_with,
            } => told(
                format!("`{}` in {table} does not go with `{decided}`", key.value),
                format!("goes with {}", one_of(goes_with)),
                "Remove the key, or choose the kind that it goes with.",
            ),
            SpecFault::MissingTable { table, meaning } => Told {
                message: format!("the table {table} is missing"),
                label: String::new(),
                help: format!("Add {table}: {meaning}"),
            },
            SpecFault::MissingKey {
                table, key, example, ..
            } => Told {
                message: format!("`{key}` is missing in {table}"),
                label: format!("`{key}` is missing"),
                help: format!("Add it to {table}, for example: {example}"),
            },
            SpecFault::WrongType { key, wanted, found, .. } => Told {
                message: format!("{key} is {found}"),
                label: format!("{found}"),
                help: format!("Write {wanted} for {key}."),
            },
            SpecFault::NotAChoice {
                key,
                value,
                choices,
                nearest,
            } => Told {
                message: format!("\"{}\" is no value of {key}", value.value),
                label: nearest.map_or_else(|| "not known".into(), |near| format!("did you mean \"{near}\"?")),
                help: format!("Write {} for {key}.", one_of(choices)),
            },
            SpecFault::OutOfBounds { key, value, wanted } => Told {
                message: format!("{} is out of bounds for {key}", value.value),
                label: "out of bounds".into(),
                help: format!("Write {wanted} for {key}."),
            },
            SpecFault::BadRange { key, why, .. } => bad_range(key, why),
            SpecFault::Blank { key, .. } => Told {
                message: format!("{key} is empty"),
                label: "empty".into(),
                help: format!("Write something for {key}, or remove the key if it may be left out."),
            },
            SpecFault::DuplicateTerm { term, first: None, .. } => Told {
                message: format!("`{term}` is the name of a parameter that every fit may have"),
                label: "this name is taken".into(),
                help: format!("Rename the column in the data: no term may be called `{term}`."),
            },
            SpecFault::DuplicateTerm { term, .. } => Told {
                message: format!("`{term}` stands in the model twice"),
                label: "and here again".into(),
                help: "Remove one: a column is one covariate, and two covariates make one joint.".into(),
            },
            SpecFault::CountsReused { column, key, .. } => Told {
                message: format!("{key} names `{column}`, the column of the counts"),
                label: "this column holds the counts".into(),
                help: "Name another column, or remove the entry: counts cannot explain themselves.".into(),
            },
            SpecFault::BadJoint { why, .. } => bad_joint(why),
            SpecFault::BadMerge { column, why, .. } => bad_merge(column, why),
            SpecFault::TwoBaselines { .. } => told(
                "[baseline] has both a plausible rate and earlier data".into(),
                "and earlier data".into(),
                "Keep one of `plausible_rate` and `earlier`: one prior cannot come of both.",
            ),
            SpecFault::EarlierRefused { why, .. } => earlier_refused(*why),
            SpecFault::NoSuchAnswer { answer, why, terms } => no_such_answer(&answer.value, why, terms),
        }
    }
}

fn unknown_key(table: Option<&str>, key: &str, hint: &KeyHint) -> Told {
    let place = table.unwrap_or("a spec");
    Told {
        message: match table {
            Some(table) => format!("{table} has no key `{key}`"),
            None => format!("a spec has no table `{key}`"),
        },
        label: match hint {
            KeyHint::Nearest(near) => format!("did you mean `{near}`?"),
            KeyHint::BelongsTo(other) => format!("this key belongs to {other}"),
            KeyHint::Nothing => format!("not known in {place}"),
        },
        help: "Correct or remove it; docs/spec.md lists every table and key.".into(),
    }
}

fn bad_range(key: &str, why: &RangeFault) -> Told {
    let (what, label, help) = match why {
        RangeFault::NotTwo { ends } => (
            "has not two ends",
            format!("{ends} {}", if *ends == 1 { "number" } else { "numbers" }),
            "Write two numbers above 0, the smaller first, as in [0.5, 2.0].",
        ),
        RangeFault::NotFinite { end } => (
            "has an end that is not finite",
            format!("{end} is not finite, or too large"),
            "Write two finite numbers above 0, the smaller first, as in [0.5, 2.0].",
        ),
        RangeFault::NotPositive { end } => (
            "has an end that is not above 0",
            format!("{end} is not above 0"),
            "Write numbers above 0: rates and rate ratios are, and a ratio of 1 means no difference.",
        ),
        RangeFault::Reversed { lo, hi } => (
            "is reversed",
            format!("{lo} is above {hi}"),
            "Write the smaller number first.",
        ),
        RangeFault::Empty { at } => (
            "is empty",
            format!("both ends are {at}"),
            "Let the ends differ: a range of one value leaves nothing to learn.",
        ),
        RangeFault::NoEnds => (
            "has no ends",
            "neither `from` nor `to`".into(),
            "Write `from`, `to` or both, as in { from = 2, to = 10 }.",
        ),
    };
    Told {
        message: format!("the range {key} {what}"),
        label,
        help: help.into(),
    }
}

fn bad_joint(why: &JointFault) -> Told {
    match why {
        JointFault::NotTwo { columns } => Told {
            message: format!("a joint is of two covariates, not of {columns}"),
            label: format!("{columns} {}", if *columns == 1 { "column" } else { "columns" }),
            help: "Write two columns, as in of = [\"decking\", \"slope_deg\"].".into(),
        },
        JointFault::SameTwice { column } => Told {
            message: format!("a joint is of two different covariates, not of `{column}` twice"),
            label: "one column twice".into(),
            help: "Name two different covariates.".into(),
        },
        JointFault::NoCovariate { column, nearest } => Told {
            message: format!("the joint names `{column}`, which is no covariate"),
            label: match nearest {
                Some(near) => format!("did you mean `{near}`?"),
                None => "no [[covariate]] has this column".into(),
            },
            help: "Name columns of two [[covariate]] tables of this spec; add the covariate if it is missing.".into(),
        },
    }
}

fn bad_merge(column: &str, why: &MergeFault) -> Told {
    match why {
        MergeFault::TakenTwice { level } => Told {
            message: format!("the level \"{level}\" of `{column}` is merged twice"),
            label: "merged before".into(),
            help: "List each level once.".into(),
        },
        MergeFault::NewLevelTaken { into } => Told {
            message: format!("the merged level \"{into}\" of `{column}` is itself taken away by another merge"),
            label: "taken away by another merge".into(),
            help: "Give the merged level another name, or list all levels in one merge.".into(),
        },
        MergeFault::ReferenceTaken { reference, into } => Told {
            message: format!("the reference \"{reference}\" of `{column}` is merged into \"{into}\""),
            label: format!("merged into \"{into}\""),
            help: format!("Write reference = \"{into}\", or take \"{reference}\" out of the merge."),
        },
    }
}

fn earlier_refused(why: EarlierFault) -> Told {
    let (message, label) = match why {
        EarlierFault::NotPoisson => (
            "earlier data go with kind = \"poisson\" only",
            "the family is not Poisson",
        ),
        EarlierFault::NotAtReference => (
            "earlier data must have been seen at the reference",
            "not at the reference",
        ),
    };
    Told {
        message: message.into(),
        label: label.into(),
        help: "Write what the earlier data suggest as a range instead, plausible_rate = [low, high] per `per`; widen \
               it where they were seen in other conditions."
            .into(),
    }
}

fn no_such_answer(answer: &str, why: &AnswerFault, terms: &[String]) -> Told {
    let quoted: Vec<String> = terms.iter().map(|term| format!("`{term}`")).collect();
    let known = format!("The terms of this spec are {}", quoted.join(", "));
    let levels = if terms.iter().any(|term| term.contains("=LEVEL")) {
        " (LEVEL stands for a level other than the reference)"
    } else {
        ""
    };
    let (message, label) = match why {
        AnswerFault::Unknown { nearest } => (
            format!("`answer` names `{answer}`, which is no term of this spec"),
            match nearest {
                Some(near) => format!("did you mean `{near}`?"),
                None => "no such term".into(),
            },
        ),
        AnswerFault::IsReference { level } => (
            format!("`answer` names `{answer}`, but \"{level}\" is the reference"),
            "the reference has no term".into(),
        ),
        AnswerFault::MergedAway { level, into } => (
            format!("`answer` names `{answer}`, but \"{level}\" is merged into \"{into}\""),
            format!("merged into \"{into}\""),
        ),
    };
    Told {
        message,
        label,
        help: format!("{known}{levels}; write one of them."),
    }
}
