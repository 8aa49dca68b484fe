//! Single values: numbers and types as TOML has them, ends of ranges, and names that are spelt alike.

use crate::diagnostic::nearest;
use toml::de::{DeInteger, DeValue};

use super::fault::{KeyHint, RangeFault};
use super::keys::TableInfo;
use super::tables::TABLES;

/// The least ratio of the ends of a plausible range. Below it the prior's precision (1.5e9 here)
/// swamps what the data say in double precision, down to a standard deviation that rounds to 0.
pub const NARROWEST: f64 = 1.0001;

/// Whether two finite ends make a range of positive numbers.
pub(super) fn check_ends([lo, hi]: [f64; 2]) -> Result<[f64; 2], RangeFault> {
    if lo <= 0.0 || hi <= 0.0 {
        Err(RangeFault::NotPositive {
            end: if lo <= 0.0 { lo } else { hi },
        })
    } else if lo > hi {
        Err(RangeFault::Reversed { lo, hi })
    } else if lo == hi {
        Err(RangeFault::Empty { at: lo })
    } else if hi < lo * NARROWEST {
        Err(RangeFault::TooNarrow { lo, hi })
    } else {
        Ok([lo, hi])
    }
}

/// A number, whole or not; infinite where it is too large for a float.
pub(super) fn plain_number(value: &DeValue<'_>) -> Option<f64> {
    match value {
        DeValue::Integer(integer) => Some(float_of(integer)),
        DeValue::Float(float) => float.as_str().parse().ok(),
        _ => None,
    }
}

fn float_of(integer: &DeInteger<'_>) -> f64 {
    if integer.radix() == 10 {
        // Through the decimal reader, so that whole numbers beyond 64 bits are read too.
        integer.as_str().parse().unwrap_or(f64::NAN)
    } else {
        i64::from_str_radix(integer.as_str(), integer.radix()).map_or(f64::INFINITY, |n| n as f64)
    }
}

/// The type of a value, in words.
pub(super) fn type_in_words(value: &DeValue<'_>) -> &'static str {
    match value {
        DeValue::String(_) => "a text",
        DeValue::Integer(_) => "a whole number",
        DeValue::Float(_) => "a number",
        DeValue::Boolean(_) => "true or false",
        DeValue::Datetime(_) => "a date",
        DeValue::Array(_) => "a list",
        DeValue::Table(_) => "a table",
    }
}

/// What an unknown key may have been meant for.
pub(super) fn key_hint(info: &TableInfo, name: &str) -> KeyHint {
    // The exact name of a key of another table says more than a likeness: `per` is not `period`.
    if let Some(table) = TABLES.iter().find(|table| table.key(name).is_some()) {
        return KeyHint::BelongsTo(table.heading());
    }
    match nearest(name, info.keys.iter().map(|key| key.name)) {
        Some(near) => KeyHint::Nearest(near),
        None => KeyHint::Nothing,
    }
}
