//! Reads the values of one table by the list of keys, and collects what is wrong with them.

use std::ops::Range;

use toml::Spanned;
use toml::de::{DeArray, DeTable, DeValue};

use super::fault::{KeyHint, RangeFault, SpecFault};
use super::keys::{Bounds, DefaultValue, KeyInfo, Kind, LeftOut, TableInfo};
use super::study::At;
use super::values::{check_ends, key_hint, plain_number, type_in_words};
use crate::diagnostic::nearest;

/// The faults found so far.
pub(super) type Faults = Vec<SpecFault>;

/// One table of the spec with the keys that it may hold.
///
/// A getter returns `None` where the value is absent or at fault; whatever the list of keys calls
/// a fault has then been pushed. So a caller reads all its keys first and only then gives up.
pub(super) struct Fields<'a> {
    /// What the table may hold.
    pub info: &'static TableInfo,
    /// Place of the table's heading.
    pub span: Range<usize>,
    table: &'a DeTable<'a>,
    source: &'a str,
}

impl<'a> Fields<'a> {
    /// Opens a table and tells its unknown keys.
    pub fn open(
        info: &'static TableInfo,
        table: &'a DeTable<'a>,
        span: Range<usize>,
        source: &'a str,
        faults: &mut Faults,
    ) -> Self {
        for key in table.keys() {
            let name = key.get_ref().as_ref();
            if info.key(name).is_some() {
                continue;
            }
            if let Some(planned) = info.not_yet.iter().find(|planned| planned.name == name) {
                faults.push(SpecFault::NotYet {
                    part: format!("`{name}` in {}", info.heading()),
                    what: planned.what,
                    span: key.span(),
                });
            } else {
                faults.push(SpecFault::UnknownKey {
                    table: Some(info.heading()),
                    key: At {
                        value: name.to_string(),
                        span: key.span(),
                    },
                    hint: key_hint(info, name),
                });
            }
        }
        Fields {
            info,
            span,
            table,
            source,
        }
    }

    /// Tells keys that do not go with the value of the deciding key.
    pub fn tell_misplaced(&self, decided: &str, faults: &mut Faults) {
        let Some(deciding) = self.info.decided_by else { return };
        for key in self.table.keys() {
            if let Some(info) = self.info.key(key.get_ref())
                && !info.only_with.is_empty()
                && !info.only_with.contains(&decided)
            {
                faults.push(SpecFault::Misplaced {
                    table: self.info.heading(),
                    key: At {
                        value: info.name.to_string(),
                        span: key.span(),
                    },
                    decided_by: deciding,
                    decided: decided.to_string(),
                    goes_with: info.only_with,
                });
            }
        }
    }

    /// Whether the key stands in the table, whatever its value.
    pub fn has(&self, name: &str) -> bool {
        self.table.contains_key(name)
    }

    /// The key's value, unjudged.
    pub fn raw(&self, name: &str) -> Option<&'a Spanned<DeValue<'a>>> {
        self.table.get(name)
    }

    /// The whole text of the spec.
    pub fn source(&self) -> &'a str {
        self.source
    }

    /// Place of the key's value.
    pub fn place(&self, name: &str) -> Option<Range<usize>> {
        self.table.get(name).map(Spanned::span)
    }

    /// The value of a key with what the list says of it; tells a missing one that is required.
    pub fn value(&self, name: &str, faults: &mut Faults) -> Option<(&'static KeyInfo, &'a Spanned<DeValue<'a>>)> {
        let info = self.info.key(name)?;
        match self.table.get(name) {
            Some(value) => Some((info, value)),
            None => {
                // A key that stands misspelt has been told already.
                if info.left_out == LeftOut::Refused && !self.misspelt(name) {
                    faults.push(SpecFault::MissingKey {
                        table: self.info.heading(),
                        key: name.to_string(),
                        example: format!("{name} = {}", info.example),
                        span: self.span.clone(),
                    });
                }
                None
            }
        }
    }

    /// A text that is not blank.
    pub fn text(&self, name: &str, faults: &mut Faults) -> Option<At<String>> {
        let (info, value) = self.value(name, faults)?;
        self.text_of(&self.title(name), &info.kind.in_words(), value, faults)
    }

    /// A list of texts.
    pub fn texts(&self, name: &str, faults: &mut Faults) -> Option<Vec<At<String>>> {
        let (info, value) = self.value(name, faults)?;
        let at_least = if let Kind::Texts { at_least } = info.kind {
            at_least
        } else {
            0
        };
        self.texts_of(&self.title(name), &info.kind.in_words(), at_least, value, faults)
    }

    /// `true` or `false`.
    pub fn switch(&self, name: &str, faults: &mut Faults) -> Option<bool> {
        let Some((info, value)) = self.value(name, faults) else {
            return match self.default(name) {
                Some(DefaultValue::Switch(on)) => Some(on),
                _ => None,
            };
        };
        match value.get_ref() {
            DeValue::Boolean(on) => Some(*on),
            _ => self.wrong_type(&self.title(name), &info.kind.in_words(), value, faults),
        }
    }

    /// A whole number within its bounds.
    pub fn whole(&self, name: &str, faults: &mut Faults) -> Option<i64> {
        let Some((info, value)) = self.value(name, faults) else {
            return match self.default(name) {
                Some(DefaultValue::Whole(n)) => Some(n),
                _ => None,
            };
        };
        let DeValue::Integer(integer) = value.get_ref() else {
            return self.wrong_type(&self.title(name), &info.kind.in_words(), value, faults);
        };
        // A whole number that not even 64 bits hold is out of bounds like any other.
        let n = i64::from_str_radix(integer.as_str(), integer.radix()).ok();
        match (n, info.kind) {
            (Some(n), Kind::Whole { from, to }) if (from..=to).contains(&n) => Some(n),
            _ => {
                faults.push(SpecFault::OutOfBounds {
                    key: self.title(name),
                    value: self.as_written(value.span()),
                    wanted: info.kind.in_words(),
                });
                None
            }
        }
    }

    /// A finite number within its bounds.
    pub fn number(&self, name: &str, faults: &mut Faults) -> Option<f64> {
        let Some((info, value)) = self.value(name, faults) else {
            return match self.default(name) {
                Some(DefaultValue::Number(x)) => Some(x),
                _ => None,
            };
        };
        let bounds = if let Kind::Number(bounds) = info.kind {
            bounds
        } else {
            Bounds::POSITIVE
        };
        self.number_of(&self.title(name), &info.kind.in_words(), bounds, value, faults)
    }

    /// One of the values of a choice.
    pub fn choice(&self, name: &str, faults: &mut Faults) -> Option<&'static str> {
        let Some((info, value)) = self.value(name, faults) else {
            return match self.default(name) {
                Some(DefaultValue::Choice(value)) => Some(value),
                _ => None,
            };
        };
        let DeValue::String(text) = value.get_ref() else {
            return self.wrong_type(&self.title(name), &info.kind.in_words(), value, faults);
        };
        let Kind::Choice(choices, not_yet) = info.kind else {
            return None;
        };
        if let Some(choice) = choices.iter().find(|choice| choice.value == text.as_ref()) {
            return Some(choice.value);
        }
        if let Some(planned) = not_yet.iter().find(|planned| planned.name == text.as_ref()) {
            faults.push(SpecFault::NotYet {
                part: format!("`{name} = \"{}\"` in {}", planned.name, self.info.heading()),
                what: planned.what,
                span: value.span(),
            });
            return None;
        }
        let choices: Vec<&'static str> = choices.iter().map(|choice| choice.value).collect();
        faults.push(SpecFault::NotAChoice {
            key: self.title(name),
            value: At {
                value: text.to_string(),
                span: value.span(),
            },
            nearest: nearest(text, choices.iter().copied()),
            choices,
        });
        None
    }

    /// Both ends of a range: above 0, the smaller first.
    pub fn range(&self, name: &str, faults: &mut Faults) -> Option<At<[f64; 2]>> {
        let (info, value) = self.value(name, faults)?;
        let DeValue::Array(array) = value.get_ref() else {
            return self.wrong_type(&self.title(name), &info.kind.in_words(), value, faults);
        };
        match self.ends(&self.title(name), &info.kind.in_words(), array, faults)? {
            Ok([lo, hi]) => Some(At {
                value: [lo, hi],
                span: value.span(),
            }),
            Err(why) => {
                faults.push(SpecFault::BadRange {
                    key: self.title(name),
                    why,
                    span: value.span(),
                });
                None
            }
        }
    }

    /// The two ends of a range, or what is wrong with them; `None` where a wrong type was told.
    fn ends(
        &self,
        key: &str,
        wanted: &str,
        array: &DeArray<'_>,
        faults: &mut Faults,
    ) -> Option<Result<[f64; 2], RangeFault>> {
        let values: Vec<&Spanned<DeValue<'_>>> = array.iter().collect();
        let [first, second] = values.as_slice() else {
            return Some(Err(RangeFault::NotTwo { ends: values.len() }));
        };
        let mut ends = [0.0; 2];
        for (end, value) in ends.iter_mut().zip([first, second]) {
            match plain_number(value.get_ref()) {
                Some(x) if x.is_finite() => *end = x,
                Some(_) => {
                    let end = self.as_written(value.span()).value;
                    return Some(Err(RangeFault::NotFinite { end }));
                }
                None => return self.wrong_type(key, wanted, value, faults),
            }
        }
        Some(check_ends(ends))
    }

    /// A table written in place, or the value's type told.
    pub fn inline(&self, name: &str, faults: &mut Faults) -> Option<(Range<usize>, &'a DeTable<'a>)> {
        let (info, value) = self.value(name, faults)?;
        match value.get_ref() {
            DeValue::Table(table) => Some((value.span(), table)),
            _ => self.wrong_type(&self.title(name), &info.kind.in_words(), value, faults),
        }
    }

    /// Opens a table written in place.
    pub fn open_inline(&self, info: &'static TableInfo, name: &str, faults: &mut Faults) -> Option<Fields<'a>> {
        let (span, table) = self.inline(name, faults)?;
        Some(Fields::open(info, table, span, self.source, faults))
    }

    /// A text that is not blank, from any value.
    pub fn text_of(
        &self,
        key: &str,
        wanted: &str,
        value: &Spanned<DeValue<'_>>,
        faults: &mut Faults,
    ) -> Option<At<String>> {
        match value.get_ref() {
            DeValue::String(text) if text.trim().is_empty() => {
                faults.push(SpecFault::Blank {
                    key: key.to_string(),
                    span: value.span(),
                });
                None
            }
            DeValue::String(text) => Some(At {
                value: text.to_string(),
                span: value.span(),
            }),
            _ => self.wrong_type(key, wanted, value, faults),
        }
    }

    /// A list of at least so many texts, from any value.
    pub fn texts_of(
        &self,
        key: &str,
        wanted: &str,
        at_least: usize,
        value: &Spanned<DeValue<'_>>,
        faults: &mut Faults,
    ) -> Option<Vec<At<String>>> {
        let DeValue::Array(array) = value.get_ref() else {
            return self.wrong_type(key, wanted, value, faults);
        };
        if array.len() < at_least {
            faults.push(SpecFault::Blank {
                key: key.to_string(),
                span: value.span(),
            });
            return None;
        }
        let texts: Vec<Option<At<String>>> = array
            .iter()
            .map(|item| self.text_of(key, wanted, item, faults))
            .collect();
        texts.into_iter().collect()
    }

    /// A finite number within bounds, from any value.
    pub fn number_of(
        &self,
        key: &str,
        wanted: &str,
        bounds: Bounds,
        value: &Spanned<DeValue<'_>>,
        faults: &mut Faults,
    ) -> Option<f64> {
        match plain_number(value.get_ref()) {
            Some(x) if bounds.hold(x) => Some(x),
            Some(_) => {
                faults.push(SpecFault::OutOfBounds {
                    key: key.to_string(),
                    value: self.as_written(value.span()),
                    wanted: wanted.to_string(),
                });
                None
            }
            None => self.wrong_type(key, wanted, value, faults),
        }
    }

    /// Tells a wrong type.
    pub fn wrong_type<T>(
        &self,
        key: &str,
        wanted: &str,
        value: &Spanned<DeValue<'_>>,
        faults: &mut Faults,
    ) -> Option<T> {
        faults.push(SpecFault::WrongType {
            key: key.to_string(),
            wanted: wanted.to_string(),
            found: type_in_words(value.get_ref()),
            span: value.span(),
        });
        None
    }

    /// The key with its table, as messages name it: `seed in [study]`.
    pub fn title(&self, name: &str) -> String {
        format!("`{name}` in {}", self.info.heading())
    }

    /// A value as the spec has it.
    pub fn as_written(&self, span: Range<usize>) -> At<String> {
        At {
            value: self.source.get(span.clone()).unwrap_or_default().to_string(),
            span,
        }
    }

    /// Whether an unknown key of this table is spelt like the known key `name`.
    fn misspelt(&self, name: &str) -> bool {
        let unknown = self
            .table
            .keys()
            .map(|key| key.get_ref().as_ref())
            .filter(|key| self.info.key(key).is_none());
        unknown
            .map(|key| key_hint(self.info, key))
            .any(|hint| matches!(hint, KeyHint::Nearest(near) if near == name))
    }

    fn default(&self, name: &str) -> Option<DefaultValue> {
        // A key that stands but is at fault has no default: its fault has been told.
        match self.info.key(name)?.left_out {
            LeftOut::Default(default) if !self.has(name) => Some(default),
            _ => None,
        }
    }
}
