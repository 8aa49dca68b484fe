//! Short ways to write an entry of the list.

use crate::spec::keys::{Choice, DefaultValue, KeyInfo, Kind, LeftOut, NotYet, TableInfo, Times};

/// A key that may not be left out.
pub(super) const fn required(name: &'static str, kind: Kind, example: &'static str, meaning: &'static str) -> KeyInfo {
    KeyInfo {
        name,
        kind,
        left_out: LeftOut::Refused,
        meaning,
        example,
        only_with: &[],
    }
}

/// A key that may be left out, which then `means` something.
pub(super) const fn optional(
    name: &'static str,
    kind: Kind,
    example: &'static str,
    means: &'static str,
    meaning: &'static str,
) -> KeyInfo {
    KeyInfo {
        left_out: LeftOut::Means(means),
        ..required(name, kind, example, meaning)
    }
}

/// A key with a default.
pub(super) const fn defaulted(
    name: &'static str,
    kind: Kind,
    example: &'static str,
    default: DefaultValue,
    meaning: &'static str,
) -> KeyInfo {
    KeyInfo {
        left_out: LeftOut::Default(default),
        ..required(name, kind, example, meaning)
    }
}

/// The same key, allowed only with these values of the deciding key.
pub(super) const fn only_with(values: &'static [&'static str], key: KeyInfo) -> KeyInfo {
    KeyInfo {
        only_with: values,
        ..key
    }
}

/// A table without a deciding key, a choice of keys, or anything planned.
pub(super) const fn table(
    name: &'static str,
    times: Times,
    keys: &'static [KeyInfo],
    meaning: &'static str,
) -> TableInfo {
    TableInfo {
        name,
        times,
        meaning,
        keys,
        decided_by: None,
        exactly_one_of: &[],
        not_yet: &[],
    }
}

/// One value of a choice.
pub(super) const fn choice(value: &'static str, meaning: &'static str) -> Choice {
    Choice { value, meaning }
}

/// Something planned.
pub(super) const fn not_yet(name: &'static str, what: &'static str) -> NotYet {
    NotYet { name, what }
}
