//! One list of keys: the reader, the JSON Schema and `docs/spec.md` agree with it and so with each other.

use std::path::Path;

use ratewright::spec::{
    DefaultValue, EXAMPLE, KeyInfo, Kind, LeftOut, SpecFault, TABLES, TableInfo, Times, json_schema, parse, read,
    reference_markdown,
};
use serde_json::{Value, json};

/// Good specs that together hold every key of the list.
fn good_specs() -> Vec<Value> {
    let base = json!({
        "study": { "title": "t", "question": "q", "answer": "baseline", "seed": 1 },
        "data": {
            "file": "d.csv", "unit": "place", "period": "month", "rows_with_gaps": "drop", "gap_marks": ["NA"],
            "keep": { "season": ["summer"], "slope": { "from": 0, "to": 9.5 } }, "stands_for": "rows",
        },
        "incidents": { "column": "falls" },
        "exposure": { "column": "hours", "per": 1000, "one_incident_each_at_most": true },
        "family": { "kind": "negative-binomial", "scatter_up_to": 1.0, "provisional": true },
        "baseline": { "plausible_rate": [0.5, 20], "provisional": true },
        "covariate": [
            {
                "column": "decking", "as": "category", "reference": "plain", "merge": { "other": ["mesh"] },
                "plausible_ratio": [0.5, 2.0], "provisional": true,
            },
            { "column": "slope", "as": "number", "centre": "mean", "step": 2, "plausible_ratio": [0.5, 2.0] },
            { "column": "staff", "as": "log-number", "centre": 3.5, "plausible_ratio": [0.5, 2.0] },
        ],
        "joint": [{ "of": ["decking", "slope"], "plausible_ratio": [0.5, 2.0], "provisional": true }],
        "sampling": { "chains": 8, "steps": "walk", "precision": 0.05, "most_draws": 10000 },
        "report": { "interval": 0.9, "hide_counts_below": 0, "show_zero": true },
    });
    let mut poisson = base.clone();
    poisson["family"] = json!({ "kind": "poisson" });
    poisson["baseline"] = json!({ "earlier": { "incidents": 2.5, "exposure": 100, "at_reference": true } });
    vec![base, poisson]
}

fn as_toml(spec: &Value) -> String {
    toml::to_string(spec).expect("TOML can say it")
}

fn accepted(spec: &Value) -> bool {
    parse("spec.toml", &as_toml(spec)).is_ok()
}

fn validator() -> jsonschema::Validator {
    jsonschema::draft202012::new(&json_schema()).expect("a schema")
}

/// JSON pointers to every table of this kind that the spec holds.
fn pointers(spec: &Value, info: &TableInfo) -> Vec<String> {
    let top = format!("/{}", info.name);
    match spec.pointer(&top) {
        Some(Value::Array(tables)) => (0..tables.len()).map(|i| format!("{top}/{i}")).collect(),
        Some(_) => vec![top],
        None => Vec::new(),
    }
}

/// Every key of the list where it stands in a good spec: the spec, the pointer of its table, the key.
fn every_key() -> Vec<(Value, String, &'static KeyInfo)> {
    let mut found = Vec::new();
    for spec in good_specs() {
        for info in TABLES {
            for pointer in pointers(&spec, info) {
                for key in info.keys {
                    let place = format!("{pointer}/{}", key.name);
                    if spec.pointer(&place).is_none() {
                        continue;
                    }
                    found.push((spec.clone(), pointer.clone(), key));
                    if let Kind::Inline(inner) = key.kind {
                        found.extend(inner.keys.iter().map(|key| (spec.clone(), place.clone(), key)));
                    }
                }
            }
        }
    }
    found
}

fn with(spec: &Value, table: &str, key: &str, value: Value) -> Value {
    let mut changed = spec.clone();
    changed.pointer_mut(table).expect("the table stands")[key] = value;
    changed
}

fn without(spec: &Value, table: &str, key: &str) -> Value {
    let mut changed = spec.clone();
    changed
        .pointer_mut(table)
        .and_then(Value::as_object_mut)
        .expect("the table stands")
        .remove(key);
    changed
}

#[test]
fn the_good_specs_hold_every_key_and_are_accepted_by_reader_and_schema() {
    let validator = validator();
    for spec in good_specs() {
        parse("spec.toml", &as_toml(&spec)).expect("good");
        assert!(
            validator.is_valid(&spec),
            "{:?}",
            validator.iter_errors(&spec).collect::<Vec<_>>()
        );
    }
    let example: Value = toml::from_str(EXAMPLE).expect("TOML");
    assert!(
        validator.is_valid(&example),
        "{:?}",
        validator.iter_errors(&example).collect::<Vec<_>>()
    );
    let seen = every_key();
    for info in TABLES {
        for key in info.keys {
            assert!(
                seen.iter().any(|(_, _, known)| std::ptr::eq(*known, key)),
                "{} of {}",
                key.name,
                info.name
            );
        }
    }
}

#[test]
fn reader_and_schema_refuse_the_same_numbers() {
    let validator = validator();
    let good = &good_specs()[0];
    for (table, key, refused, taken) in [
        ("/covariate/2", "centre", json!(0), json!(0.001)),
        ("/covariate/2", "centre", json!(-3.5), json!("mean")),
        ("/covariate/1", "centre", json!("median"), json!(-3.5)),
        ("/covariate/0", "plausible_ratio", json!([0, 2.0]), json!([0.1, 2.0])),
        ("/joint/0", "plausible_ratio", json!([-1.0, 2.0]), json!([0.1, 2])),
        ("/baseline", "plausible_rate", json!([-2.0, -1.0]), json!([1e-9, 1])),
        ("/report", "interval", json!(0.49), json!(0.5)),
        ("/report", "interval", json!(0.9991), json!(0.999)),
        ("/data", "period", json!(""), json!("month")),
    ] {
        let (bad, fine) = (with(good, table, key, refused), with(good, table, key, taken));
        assert!(!validator.is_valid(&bad) && !accepted(&bad), "{bad}");
        assert!(validator.is_valid(&fine) && accepted(&fine), "{fine}");
    }
}

#[test]
fn every_key_of_the_list_is_read() {
    // A value of a type that no key takes is noticed only by a reader that looks at the key.
    let validator = validator();
    for (spec, table, key) in every_key() {
        let broken = with(&spec, &table, key.name, json!([[1]]));
        let error = parse("spec.toml", &as_toml(&broken)).expect_err(key.name);
        let place = error.source.text.find("[[1]]").expect("it stands");
        let told = |span: std::ops::Range<usize>| span.start >= place && span.end <= place + "[[1]]".len();
        assert!(
            error.faults.iter().filter_map(SpecFault::span).any(told),
            "{table} {}: {error}",
            key.name
        );
        assert!(
            !validator.is_valid(&broken),
            "the schema accepts [[1]] for {table} {}",
            key.name
        );
    }
}

#[test]
fn no_key_beside_the_list_is_accepted() {
    let validator = validator();
    for spec in good_specs() {
        for info in TABLES {
            for table in pointers(&spec, info) {
                let more = with(&spec, &table, "zz", json!(1));
                let error = parse("spec.toml", &as_toml(&more)).expect_err("zz is no key");
                assert_eq!(error.faults.len(), 1, "{error}");
                assert!(matches!(&error.faults[0], SpecFault::UnknownKey { key, .. } if key.value == "zz"));
                assert!(!validator.is_valid(&more), "{table}");
                for planned in info.not_yet {
                    let more = with(&spec, &table, planned.name, json!(1));
                    let error = parse("spec.toml", &as_toml(&more)).expect_err(planned.name);
                    assert!(matches!(error.faults.as_slice(), [SpecFault::NotYet { .. }]), "{error}");
                }
            }
        }
    }
}

#[test]
fn what_may_be_left_out_and_what_not_is_as_listed() {
    let validator = validator();
    for (spec, table, key) in every_key() {
        let less = without(&spec, &table, key.name);
        // The two priors of the baseline stand for each other: one of them must stand.
        let needed = key.left_out == LeftOut::Refused || ["plausible_rate", "earlier"].contains(&key.name);
        assert_eq!(accepted(&less), !needed, "{table} without {}", key.name);
        assert_eq!(
            validator.is_valid(&less),
            !needed,
            "{table} without {}, by the schema",
            key.name
        );
    }
    for info in TABLES {
        let less = without(&good_specs()[0], "", info.name);
        // Joints need the covariates that they name.
        let needed = info.times == Times::Once || info.name == "covariate";
        assert_eq!(accepted(&less), !needed, "without {}", info.name);
        assert_eq!(
            validator.is_valid(&less),
            info.times != Times::Once,
            "without {}, by the schema",
            info.name
        );
    }
}

#[test]
fn bounds_choices_and_defaults_are_as_listed() {
    let validator = validator();
    let mut tried = 0;
    for (spec, table, key) in every_key() {
        let mut try_value = |value: Value, good: bool| {
            let changed = with(&spec, &table, key.name, value.clone());
            assert_eq!(accepted(&changed), good, "{table} {} = {value}", key.name);
            assert_eq!(
                validator.is_valid(&changed),
                good,
                "{table} {} = {value}, by the schema",
                key.name
            );
            tried += 1;
        };
        match key.kind {
            Kind::Whole { from, to } => {
                try_value(json!(from), true);
                try_value(json!(to), true);
                try_value(json!(from - 1), false);
                if to < i64::MAX {
                    try_value(json!(to + 1), false);
                }
                try_value(json!(from as f64 + 0.5), false);
            }
            Kind::Number(bounds) => {
                for x in [-1.0, 0.0, 0.0005, 0.001, 0.3, 0.5, 0.6, 1.0, 1e9] {
                    try_value(json!(x), bounds.hold(x));
                }
            }
            Kind::Choice(choices, not_yet) => {
                for planned in not_yet {
                    try_value(json!(planned.name), false);
                }
                try_value(json!("zz"), false);
                // Other keys depend on the deciding ones; the rest take each of their values.
                if !["as", "kind"].contains(&key.name) {
                    for choice in choices {
                        try_value(json!(choice.value), true);
                    }
                }
            }
            Kind::Text => try_value(json!(" "), false),
            Kind::Range => {
                for bad in [
                    json!([1.0]),
                    json!([0.0, 1.0]),
                    json!([2.0, 2.0]),
                    json!([1.0, 2.0, 3.0]),
                ] {
                    try_value(bad, false);
                }
            }
            _ => {}
        }
        if let LeftOut::Default(default) = key.left_out {
            let value = match default {
                DefaultValue::Whole(n) => json!(n),
                DefaultValue::Number(x) => json!(x),
                DefaultValue::Choice(text) => json!(text),
                DefaultValue::Switch(on) => json!(on),
            };
            let mut stated = parse("s", &as_toml(&with(&spec, &table, key.name, value))).expect("its default");
            let mut silent = parse("s", &as_toml(&without(&spec, &table, key.name))).expect("its default");
            // The texts differ, and with them the places; values must not.
            stated.source.text.clear();
            silent.source.text.clear();
            assert_eq!(
                no_places(&format!("{stated:?}")),
                no_places(&format!("{silent:?}")),
                "{}",
                key.name
            );
        }
    }
    assert!(tried > 100, "only {tried} values tried");
}

/// The debug text of a spec without the places of its values.
fn no_places(debug: &str) -> String {
    let mut out = String::new();
    for (i, part) in debug.split("span: ").enumerate() {
        let rest = if i == 0 {
            part
        } else {
            part.trim_start_matches(|c: char| c.is_ascii_digit() || c == '.')
        };
        out.push_str(rest);
    }
    out
}

#[test]
fn keys_of_another_kind_are_refused_by_reader_and_schema() {
    let validator = validator();
    let base = &good_specs()[0];
    for (table, key, value) in [
        ("/covariate/0", "centre", json!(1)),
        ("/covariate/0", "step", json!(1)),
        ("/covariate/1", "reference", json!("plain")),
        ("/covariate/1", "merge", json!({ "a": ["b"] })),
        ("/covariate/2", "step", json!(1)),
    ] {
        let more = with(base, table, key, value);
        let error = parse("spec.toml", &as_toml(&more)).expect_err(key);
        assert!(
            matches!(error.faults.as_slice(), [SpecFault::Misplaced { .. }]),
            "{error}"
        );
        assert!(!validator.is_valid(&more), "{table} {key}");
    }
}

#[test]
fn every_example_of_the_list_is_a_value_of_its_key() {
    for info in TABLES {
        for key in info.keys {
            let line = format!("{} = {}", key.name, key.example);
            let value: Value = toml::from_str(&line).expect(&line);
            let tables = every_key();
            let (spec, table, _) = tables
                .iter()
                .find(|(_, _, known)| std::ptr::eq(*known, key))
                .expect("stands");
            let changed = with(spec, table, key.name, value[key.name].clone());
            let told = parse("spec.toml", &as_toml(&changed)).err().map(|error| error.faults);
            // The examples are of one study, the specs here of another: relations may break, values not.
            let relation = |fault: &SpecFault| {
                matches!(
                    fault,
                    SpecFault::BadJoint { .. } | SpecFault::NoSuchAnswer { .. } | SpecFault::DuplicateTerm { .. }
                )
            };
            assert!(told.iter().flatten().all(relation), "{line}: {told:?}");
        }
    }
}

#[test]
fn the_schema_refuses_bad_files_where_one_table_tells() {
    let validator = validator();
    let folder = Path::new(env!("CARGO_MANIFEST_DIR")).join("tests/bad_spec");
    // Told by relations between values, which a schema cannot say.
    let only_by_relation = [
        "bad-joint",
        "bad-merge",
        "bad-range",
        "counts-reused",
        "duplicate-term",
        "earlier-refused",
        "no-such-answer",
        "period-is-unit",
    ];
    let mut refused = 0;
    for entry in std::fs::read_dir(folder).expect("the folder") {
        let path = entry.expect("readable").path();
        let Some(text) = std::fs::read(&path)
            .ok()
            .and_then(|bytes| String::from_utf8(bytes).ok())
        else {
            continue;
        };
        let Ok(spec) = toml::from_str::<Value>(&text) else {
            continue;
        };
        let error = read(&path).expect_err("bad");
        if error
            .faults
            .iter()
            .any(|fault| !only_by_relation.contains(&fault.code()))
        {
            assert!(!validator.is_valid(&spec), "{}", path.display());
            refused += 1;
        }
    }
    assert!(refused >= 12, "only {refused}");
}

#[test]
fn the_reference_in_docs_is_current() {
    let path = Path::new(env!("CARGO_MANIFEST_DIR")).join("docs/spec.md");
    let current = reference_markdown();
    if std::env::var_os("RATEWRIGHT_WRITE_DOCS").is_some() {
        std::fs::write(&path, &current).expect("docs can be written");
    }
    let stands = std::fs::read_to_string(&path).expect("docs/spec.md stands");
    assert!(
        stands == current,
        "docs/spec.md is not what the list of keys says; run the tests with RATEWRIGHT_WRITE_DOCS=1 to write it"
    );
    for info in TABLES {
        assert!(stands.contains(&format!("## `{}`", info.heading())));
    }
}
