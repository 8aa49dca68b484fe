//! The JSON Schema of a spec, written from the list of keys.

use serde_json::{Map, Value, json};

use super::keys::{Bounds, DefaultValue, End, KeyInfo, Kind, LeftOut, TableInfo, Times};
use super::tables::{KEEP_ENDS, TABLES};

/// The value of `as` whose centre has to have a logarithm.
const LOG_NUMBER: &str = "log-number";

/// JSON Schema (draft 2020-12) of a spec, the TOML taken as JSON of the same shape; editors that
/// know it complete and check keys while a spec is written.
///
/// It holds all that concerns one value or the keys of one table. What holds between values (the
/// order of a range's ends, an answer that is a term, joints of covariates) only
/// [`parse`](super::parse) tells.
pub fn json_schema() -> Value {
    let properties: Map<String, Value> = TABLES.iter().map(|info| (info.name.to_string(), table(info))).collect();
    let required: Vec<&str> = TABLES
        .iter()
        .filter(|info| info.times == Times::Once)
        .map(|info| info.name)
        .collect();
    json!({
        "$schema": "https://json-schema.org/draft/2020-12/schema",
        "title": "Ratewright spec",
        "description": "One study: what is asked, which data answer it, and what is believed beforehand.",
        "type": "object",
        "properties": properties,
        "required": required,
        "additionalProperties": false,
    })
}

fn table(info: &TableInfo) -> Value {
    let one = one_table(info);
    match info.times {
        Times::Many => json!({
            "title": info.heading(),
            "type": "array",
            "items": one,
        }),
        Times::Once | Times::AtMostOnce | Times::Inline => one,
    }
}

fn one_table(info: &TableInfo) -> Value {
    let properties: Map<String, Value> = info
        .keys
        .iter()
        .map(|key| (key.name.to_string(), property(key)))
        .collect();
    let required: Vec<&str> = info
        .keys
        .iter()
        .filter(|key| key.left_out == LeftOut::Refused && key.only_with.is_empty())
        .map(|key| key.name)
        .collect();
    let mut schema = json!({
        "title": info.heading(),
        "description": info.meaning,
        "type": "object",
        "properties": properties,
        "required": required,
        "additionalProperties": false,
    });
    if !info.exactly_one_of.is_empty() {
        let choices: Vec<Value> = info
            .exactly_one_of
            .iter()
            .map(|name| json!({ "required": [name] }))
            .collect();
        schema["oneOf"] = Value::from(choices);
    }
    let conditions = conditions(info);
    if !conditions.is_empty() {
        schema["allOf"] = Value::from(conditions);
    }
    schema
}

/// For each value of the deciding key: which keys it needs, and which it does not go with.
fn conditions(info: &TableInfo) -> Vec<Value> {
    let Some(deciding) = info.decided_by else {
        return Vec::new();
    };
    let Some(Kind::Choice(choices, _)) = info.key(deciding).map(|key| key.kind) else {
        return Vec::new();
    };
    let one = |value: &str| {
        let depending = info.keys.iter().filter(|key| !key.only_with.is_empty());
        let (with, without): (Vec<&KeyInfo>, Vec<&KeyInfo>) = depending.partition(|key| key.only_with.contains(&value));
        let needed = with
            .iter()
            .filter(|key| key.left_out == LeftOut::Refused)
            .map(|key| key.name);
        let refused = without.iter().map(|key| (key.name.to_string(), json!(false)));
        // A centre of which the logarithm is taken is above 0.
        let narrowed = with
            .iter()
            .filter(|key| matches!(key.kind, Kind::Centre) && value == LOG_NUMBER)
            .map(|key| (key.name.to_string(), json!({ "exclusiveMinimum": 0.0 })));
        let properties: Map<String, Value> = refused.chain(narrowed).collect();
        json!({
            "if": { "properties": { deciding: { "const": value } }, "required": [deciding] },
            "then": { "required": needed.collect::<Vec<_>>(), "properties": properties },
        })
    };
    choices.iter().map(|choice| one(choice.value)).collect()
}

fn property(key: &KeyInfo) -> Value {
    let mut schema = value(&key.kind);
    schema["title"] = json!(key.name);
    schema["description"] = json!(key.meaning);
    if let LeftOut::Default(default) = key.left_out {
        schema["default"] = match default {
            DefaultValue::Whole(n) => json!(n),
            DefaultValue::Number(x) => json!(x),
            DefaultValue::Choice(text) => json!(text),
            DefaultValue::Switch(on) => json!(on),
        };
    }
    schema
}

fn value(kind: &Kind) -> Value {
    let texts = |at_least: usize| json!({ "type": "array", "items": text(), "minItems": at_least });
    let positive = || bounded(&Bounds::POSITIVE);
    match kind {
        Kind::Text => text(),
        Kind::Texts { at_least } => texts(*at_least),
        Kind::TwoTexts => json!({
            "type": "array", "items": text(), "minItems": 2, "maxItems": 2, "uniqueItems": true,
        }),
        Kind::Whole { from, to } => json!({ "type": "integer", "minimum": from, "maximum": to }),
        Kind::Number(bounds) => bounded(bounds),
        Kind::Choice(choices, _) => {
            let one = choices
                .iter()
                .map(|choice| json!({ "const": choice.value, "description": choice.meaning }));
            json!({ "oneOf": one.collect::<Vec<_>>() })
        }
        Kind::Switch => json!({ "type": "boolean" }),
        Kind::Range => json!({
            "type": "array", "items": positive(), "minItems": 2, "maxItems": 2, "uniqueItems": true,
        }),
        Kind::Centre => json!({ "oneOf": [{ "type": "number" }, { "const": "mean" }] }),
        Kind::Merge => json!({ "type": "object", "propertyNames": text(), "additionalProperties": texts(1) }),
        Kind::Keep => {
            let mut ends = one_table(&KEEP_ENDS);
            ends["minProperties"] = json!(1);
            json!({
                "type": "object",
                "propertyNames": text(),
                "additionalProperties": { "oneOf": [texts(1), ends] },
            })
        }
        Kind::Inline(info) => one_table(info),
    }
}

/// A text that is not blank.
fn text() -> Value {
    json!({ "type": "string", "pattern": "\\S" })
}

fn bounded(bounds: &Bounds) -> Value {
    let mut schema = json!({ "type": "number" });
    match bounds.lower {
        End::Unbounded => {}
        End::Excluded(end) => schema["exclusiveMinimum"] = json!(end),
        End::Included(end) => schema["minimum"] = json!(end),
    }
    match bounds.upper {
        End::Unbounded => {}
        End::Excluded(end) => schema["exclusiveMaximum"] = json!(end),
        End::Included(end) => schema["maximum"] = json!(end),
    }
    schema
}
