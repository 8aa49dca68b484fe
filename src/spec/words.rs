//! Each fault in words: what is wrong, what stands beside the place, what to do.

use super::fault::{AnswerFault, EarlierFault, Encoding, JointFault, KeyHint, MergeFault, RangeFault, SpecFault};
use super::keys::{grouped, one_of};
use super::read::MOST_BYTES;

/// One fault in words.
pub(super) struct Told {
    /// What is wrong, when it is the only one of its kind.
    pub message: String,
    /// What to write beside the place.
    pub label: String,
    /// What to do.
    pub help: String,
}

impl SpecFault {
    /// The fault in words.
    pub(super) fn told(&self) -> Told {
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
            SpecFault::TooLarge => told(
                format!(
                    "the spec is larger than {} bytes, as no spec is",
                    grouped(MOST_BYTES as i64)
                ),
                String::new(),
                "Name the spec, not the table: the table is named within the spec, by `file` in [data].",
            ),
            SpecFault::IsTable => told(
                "a table was named in place of the spec".into(),
                String::new(),
                "Name the spec, a TOML file that names the table by `file` in [data]; `ratewright draft TABLE --into \
                 SPEC` writes one to begin with.",
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
                "Leave it out for now: a part that was passed over in silence would mislead.",
            ),
            SpecFault::Misplaced {
                table,
                key,
                decided_by,
                decided,
                goes_with,
            } => told(
                format!(
                    "`{}` in {table} does not go with {decided_by} = \"{decided}\"",
                    key.value
                ),
                format!("goes only with {decided_by} = {}", one_of(goes_with)),
                "Remove the key, or choose the kind that it goes with.",
            ),
            SpecFault::MissingTable { table } => told(
                format!("the table {table} is missing"),
                String::new(),
                "Add what is missing; docs/spec.md says what each table holds.",
            ),
            SpecFault::MissingKey {
                table, key, example, ..
            } => told(
                format!("`{key}` is missing in {table}"),
                format!("`{key}` is missing, as in {example}"),
                "Add what is missing; docs/spec.md says what each key means.",
            ),
            SpecFault::WrongType { key, wanted, found, .. } => told(
                format!("{key} is {found}, where something else is needed"),
                format!("{found}; write {wanted}"),
                "Write the value as it is said beside the mark; docs/spec.md has examples of every key.",
            ),
            SpecFault::NotAChoice {
                key,
                value,
                choices,
                nearest,
            } => told(
                format!("\"{}\" is no value of {key}", value.value),
                match nearest {
                    Some(near) => format!("did you mean \"{near}\"?"),
                    None => format!("write {}", one_of(choices)),
                },
                "Write one of the values that docs/spec.md lists for the key.",
            ),
            SpecFault::OutOfBounds { key, value, wanted } => told(
                format!("{} is out of bounds for {key}", value.value),
                format!("write {wanted}"),
                "Write a number within the bounds said beside the mark.",
            ),
            SpecFault::BadRange { key, why, .. } => bad_range(key, why),
            SpecFault::Blank { key, .. } => told(
                format!("{key} is empty"),
                "empty".into(),
                "Write what is meant, or remove the key where it may be left out.",
            ),
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
            SpecFault::PeriodIsUnit { column, .. } => told(
                format!("`period` in [data] names `{column}`, the column of the units"),
                "this column names the units".into(),
                "Name the column that orders the rows of a unit, or leave `period` out.",
            ),
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
        RangeFault::TooNarrow { lo, hi } => (
            "is too narrow",
            format!("from {lo} to {hi} only"),
            "Let the ends differ by 0.01 % at least: a narrower range leaves nothing to learn.",
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
        EarlierFault::Provisional => (
            "earlier data cannot be provisional: they were seen",
            "marked as provisional",
        ),
    };
    Told {
        message: message.into(),
        label: label.into(),
        help: "Write what the earlier data suggest as a range instead, plausible_rate = [low, high] per `per`; widen \
               it where they were seen in other conditions or are in doubt."
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
