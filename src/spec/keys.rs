//! What a spec may contain: the shape of the one list of tables and keys.
//!
//! The list itself is [`TABLES`](super::TABLES). The reader takes kinds, bounds and defaults from it, the JSON
//! Schema and `docs/spec.md` are written from it; so a key cannot be read and left undocumented,
//! or documented and never read.

/// A table of the spec.
#[derive(Debug, Clone, Copy)]
pub struct TableInfo {
    /// Its name, as in `study`.
    pub name: &'static str,
    /// How often it may stand.
    pub times: Times,
    /// What it is for, in one sentence.
    pub meaning: &'static str,
    /// Its keys, in the order of the docs.
    pub keys: &'static [KeyInfo],
    /// The key whose value decides which other keys are allowed (see [`KeyInfo::only_with`]).
    pub decided_by: Option<&'static str>,
    /// Exactly one of these keys must stand; empty where there is no such choice.
    pub exactly_one_of: &'static [&'static str],
    /// Keys that are planned and that this version refuses by name.
    pub not_yet: &'static [NotYet],
}

/// How often a table may stand in a spec.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Times {
    /// Exactly once: `[study]`.
    Once,
    /// Once or not at all: `[sampling]`.
    AtMostOnce,
    /// Any number of times: `[[covariate]]`.
    Many,
    /// As the value of a key: `earlier = { … }`.
    Inline,
}

/// A key of a table.
#[derive(Debug, Clone, Copy)]
pub struct KeyInfo {
    /// Its name, as in `seed`.
    pub name: &'static str,
    /// What its value may be.
    pub kind: Kind,
    /// What holds when it is left out.
    pub left_out: LeftOut,
    /// What it means, in one sentence.
    pub meaning: &'static str,
    /// A value as it stands in a spec, in TOML.
    pub example: &'static str,
    /// Only with these values of [`TableInfo::decided_by`]; empty means always.
    pub only_with: &'static [&'static str],
}

/// What holds when a key is left out.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum LeftOut {
    /// It may not be.
    Refused,
    /// This value holds.
    Default(DefaultValue),
    /// What that means, in words.
    Means(&'static str),
}

/// The value that holds when a key is left out.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum DefaultValue {
    /// A whole number.
    Whole(i64),
    /// A number.
    Number(f64),
    /// One of the values of a [`Kind::Choice`].
    Choice(&'static str),
    /// `true` or `false`.
    Switch(bool),
}

/// What the value of a key may be.
#[derive(Debug, Clone, Copy)]
pub enum Kind {
    /// A text that is not blank.
    Text,
    /// A list of texts, none blank, at least `at_least` of them.
    Texts {
        /// The fewest texts.
        at_least: usize,
    },
    /// Two texts.
    TwoTexts,
    /// A whole number within these ends, both included.
    Whole {
        /// The smallest.
        from: i64,
        /// The largest.
        to: i64,
    },
    /// A finite number within these bounds.
    Number(Bounds),
    /// One of these values; the second list is planned and refused by name.
    Choice(&'static [Choice], &'static [NotYet]),
    /// `true` or `false`.
    Switch,
    /// Two numbers above 0, the smaller first.
    Range,
    /// A number, or `"mean"`.
    Centre,
    /// A table of level names, each with the list of levels that it takes in.
    Merge,
    /// A table of columns, each with a list of levels or `{ from = , to = }`.
    Keep,
    /// A table written in place.
    Inline(&'static TableInfo),
}

/// One value of a [`Kind::Choice`].
#[derive(Debug, Clone, Copy)]
pub struct Choice {
    /// As it stands in the spec, without the quotes.
    pub value: &'static str,
    /// What it means, to follow the value and a colon.
    pub meaning: &'static str,
}

/// Something planned that this version does not know yet.
#[derive(Debug, Clone, Copy)]
pub struct NotYet {
    /// The key, table or value.
    pub name: &'static str,
    /// What it will say, as a noun phrase.
    pub what: &'static str,
}

/// The interval that a number must lie in.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Bounds {
    /// Lower end.
    pub lower: End,
    /// Upper end.
    pub upper: End,
}

/// An end of [`Bounds`].
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum End {
    /// No limit on this side.
    Unbounded,
    /// The limit itself is outside.
    Excluded(f64),
    /// The limit itself is inside.
    Included(f64),
}

impl Bounds {
    /// Above 0.
    pub const POSITIVE: Bounds = Bounds {
        lower: End::Excluded(0.0),
        upper: End::Unbounded,
    };

    /// Any finite number.
    pub const NONE: Bounds = Bounds {
        lower: End::Unbounded,
        upper: End::Unbounded,
    };

    /// Whether `x` is finite and lies within.
    pub fn hold(&self, x: f64) -> bool {
        let above = match self.lower {
            End::Unbounded => true,
            End::Excluded(end) => x > end,
            End::Included(end) => x >= end,
        };
        let below = match self.upper {
            End::Unbounded => true,
            End::Excluded(end) => x < end,
            End::Included(end) => x <= end,
        };
        x.is_finite() && above && below
    }

    /// In words: `a finite number above 0`, `a number from 0.001 to 0.5`.
    pub fn in_words(&self) -> String {
        if let (End::Included(from), End::Included(to)) = (self.lower, self.upper) {
            return format!("a number from {from} to {to}");
        }
        let lower = match self.lower {
            End::Unbounded => None,
            End::Excluded(end) => Some(format!("above {end}")),
            End::Included(end) => Some(format!("from {end} on")),
        };
        let upper = match self.upper {
            End::Unbounded => None,
            End::Excluded(end) => Some(format!("below {end}")),
            End::Included(end) => Some(format!("up to {end}")),
        };
        // Infinity is above 0 too, so where an end is open the words must shut it out.
        let number = if lower.is_some() && upper.is_some() {
            "a number"
        } else {
            "a finite number"
        };
        let ends: Vec<String> = lower.into_iter().chain(upper).collect();
        format!("{number} {}", ends.join(" and ")).trim_end().to_string()
    }
}

impl TableInfo {
    /// The key of this name.
    pub fn key(&self, name: &str) -> Option<&'static KeyInfo> {
        self.keys.iter().find(|key| key.name == name)
    }

    /// As it stands in a spec: `[study]`, `[[covariate]]`; the key in backticks for a table written in place.
    pub fn heading(&self) -> String {
        match self.times {
            Times::Once | Times::AtMostOnce => format!("[{}]", self.name),
            Times::Many => format!("[[{}]]", self.name),
            Times::Inline => format!("`{}`", self.name),
        }
    }
}

impl Kind {
    /// What the value may be, in words: `a whole number from 4 to 64`.
    pub fn in_words(&self) -> String {
        match self {
            Kind::Text => "a text in quotes".into(),
            Kind::Texts { at_least: 0 } => "a list of texts in quotes".into(),
            Kind::Texts { at_least } => format!("a list of at least {at_least} texts in quotes"),
            Kind::TwoTexts => "a list of two texts in quotes".into(),
            Kind::Whole { from, to } => format!("a whole number from {} to {}", grouped(*from), grouped(*to)),
            Kind::Number(bounds) => bounds.in_words(),
            Kind::Choice(choices, _) => one_of(&choices.iter().map(|choice| choice.value).collect::<Vec<_>>()),
            Kind::Switch => "true or false".into(),
            Kind::Range => "two numbers above 0, the smaller first".into(),
            Kind::Centre => "a finite number, or \"mean\"".into(),
            Kind::Merge => "a table of new level names, each with a list of levels".into(),
            Kind::Keep => "a table of columns, each with a list of levels or { from = …, to = … }".into(),
            Kind::Inline(info) => {
                let keys: Vec<String> = info.keys.iter().map(|key| format!("{} = …", key.name)).collect();
                format!("{{ {} }}", keys.join(", "))
            }
        }
    }
}

/// Values in quotes, as an enumeration: `"poisson" or "negative-binomial"`.
pub(super) fn one_of(values: &[&str]) -> String {
    let quoted: Vec<String> = values.iter().map(|value| format!("\"{value}\"")).collect();
    match quoted.split_last() {
        Some((last, [])) => last.clone(),
        Some((last, others)) => format!("{} or {last}", others.join(", ")),
        None => String::new(),
    }
}

/// A whole number with its thousands set apart by commas.
pub(super) fn grouped(n: i64) -> String {
    let digits = n.unsigned_abs().to_string();
    let mut out = String::from(if n < 0 { "-" } else { "" });
    for (i, digit) in digits.chars().enumerate() {
        if i > 0 && (digits.len() - i).is_multiple_of(3) {
            out.push(',');
        }
        out.push(digit);
    }
    out
}
