//! The reference of the spec, `docs/spec.md`, written from the list of keys.

use std::fmt::Write as _;

use super::keys::{DefaultValue, KeyInfo, Kind, LeftOut, TableInfo, Times, grouped};
use super::tables::{KEEP_ENDS, TABLES, TABLES_NOT_YET};

/// A whole spec, for the docs and to start from.
pub const EXAMPLE: &str = include_str!("example.toml");

const OPENING: &str = "\
# The spec

One study is one spec file, in [TOML](https://toml.io), and the table that it names. Every prior stands in the spec:
there are no hidden defaults for what is believed. Unknown keys are errors, and all problems of a spec are told
together, each with its line and column (see [problems.md](problems.md)).

This page is written by the program from the same list by which it reads a spec.

## An example
";

const RANGES: &str = "\
A **plausible range** `[lo, hi]` is the central 95 % of a log-normal prior, in your own units: a rate, or a rate ratio.
On the log scale it is a normal with mean (ln lo + ln hi)/2 and standard deviation (ln hi - ln lo)/(2 × 1.959964).
`scatter_up_to` sets an exponential prior with rate -ln(0.05)/`scatter_up_to`, so that the scatter exceeds it with
probability 0.05.
";

/// The whole of `docs/spec.md`.
pub fn reference_markdown() -> String {
    let mut out = String::from(OPENING);
    let _ = write!(out, "\n```toml\n{EXAMPLE}```\n\n{RANGES}\n## Tables\n\n");
    for info in TABLES {
        let times = match info.times {
            Times::Once => "must stand",
            Times::AtMostOnce => "may stand",
            Times::Many | Times::Inline => "may stand any number of times",
        };
        let _ = writeln!(
            out,
            "- [`{}`](#{}) {times}. {}",
            info.heading(),
            info.name,
            info.meaning
        );
    }
    for info in TABLES {
        push_table(&mut out, info);
    }
    push_not_yet(&mut out);
    out
}

fn push_table(out: &mut String, info: &TableInfo) {
    let _ = writeln!(
        out,
        "\n<a id=\"{}\"></a>\n\n## `{}`\n\n{}",
        info.name,
        info.heading(),
        info.meaning
    );
    if !info.exactly_one_of.is_empty() {
        let names: Vec<String> = info.exactly_one_of.iter().map(|name| format!("`{name}`")).collect();
        let _ = writeln!(out, "Exactly one of {} must stand.", names.join(" and "));
    }
    for key in info.keys {
        let _ = writeln!(out, "\n### `{}`", key.name);
        if let (Some(deciding), false) = (info.decided_by, key.only_with.is_empty()) {
            let values: Vec<String> = key
                .only_with
                .iter()
                .map(|value| format!("`{deciding} = \"{value}\"`"))
                .collect();
            let _ = writeln!(out, "\nOnly with {}.", values.join(" or "));
        }
        push_value(out, key);
        match key.kind {
            Kind::Keep => push_inline(out, &KEEP_ENDS),
            Kind::Inline(inner) => push_inline(out, inner),
            _ => {}
        }
    }
}

/// The keys of a table that is written in place, after the key that holds it.
fn push_inline(out: &mut String, info: &TableInfo) {
    for key in info.keys {
        let _ = writeln!(out, "\n#### `{}` in {}", key.name, info.heading());
        push_value(out, key);
    }
}

fn push_value(out: &mut String, key: &KeyInfo) {
    let _ = writeln!(out, "\n{}\n", key.meaning);
    if let Kind::Choice(choices, _) = key.kind {
        for choice in choices {
            let _ = writeln!(out, "- `\"{}\"`: {}", choice.value, choice.meaning);
        }
    } else {
        let _ = writeln!(out, "- Value: {}", key.kind.in_words());
    }
    let _ = writeln!(out, "- Left out: {}", left_out(&key.left_out));
    let _ = writeln!(out, "- Example: `{} = {}`", key.name, key.example);
}

fn left_out(left_out: &LeftOut) -> String {
    match left_out {
        LeftOut::Refused => "an error".into(),
        LeftOut::Means(words) => (*words).into(),
        LeftOut::Default(DefaultValue::Whole(n)) => grouped(*n),
        LeftOut::Default(DefaultValue::Number(x)) => x.to_string(),
        LeftOut::Default(DefaultValue::Choice(value)) => format!("`\"{value}\"`"),
        LeftOut::Default(DefaultValue::Switch(on)) => format!("`{on}`"),
    }
}

fn push_not_yet(out: &mut String) {
    out.push_str(
        "\n## Not known yet\n\nThese are planned. A spec that holds one of them is refused by name, since a part that was \
         passed over in silence\nwould mislead.\n\n",
    );
    for table in TABLES_NOT_YET {
        let _ = writeln!(out, "- the table `{}`: {}", table.name, table.what);
    }
    for info in TABLES {
        for key in info.not_yet {
            let _ = writeln!(out, "- `{}` in `{}`: {}", key.name, info.heading(), key.what);
        }
        for key in info.keys {
            let Kind::Choice(_, not_yet) = key.kind else { continue };
            for value in not_yet {
                let _ = writeln!(
                    out,
                    "- `{} = \"{}\"` in `{}`: {}",
                    key.name,
                    value.name,
                    info.heading(),
                    value.what
                );
            }
        }
    }
    out.push_str("- dates under `keep` in `[data]`: rows kept by date\n");
}
