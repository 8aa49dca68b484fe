//! The shipped JSON Schema of the findings is current, and findings obey it.
#![allow(missing_docs)]

use ratewright::output::{findings_schema, json};
use std::path::Path;

fn shipped() -> String {
    std::fs::read_to_string(Path::new(env!("CARGO_MANIFEST_DIR")).join("docs/findings.schema.json")).unwrap_or_default()
}

/// Set REWRITE_DOCS=1 to bring the file up to date.
#[test]
fn the_shipped_schema_is_the_one_of_the_types() {
    let current = json::text("findings.schema.json", &findings_schema()).unwrap();
    if std::env::var_os("REWRITE_DOCS").is_some() {
        let path = Path::new(env!("CARGO_MANIFEST_DIR")).join("docs/findings.schema.json");
        std::fs::write(path, &current).unwrap();
    }
    assert!(
        shipped() == current,
        "docs/findings.schema.json is out of date: run this test with REWRITE_DOCS=1"
    );
}

#[test]
fn findings_obey_the_shipped_schema_and_broken_ones_do_not() {
    let schema = serde_json::from_str(&shipped()).unwrap();
    let validator = jsonschema::validator_for(&schema).unwrap();
    let findings = json::text("findings.json", &crate::stand_in::findings()).unwrap();
    let whole: serde_json::Value = serde_json::from_str(&findings).unwrap();
    assert!(validator.is_valid(&whole), "{:?}", validator.iter_errors(&whole).next());

    let mut lacking = whole.clone();
    lacking["answer"].as_object_mut().unwrap().remove("sentence");
    assert!(!validator.is_valid(&lacking));
    let mut extra = whole.clone();
    extra["units"]["units"][0]["name"] = "x".into();
    assert!(!validator.is_valid(&extra));
    let mut wrong = whole;
    wrong["sampling"]["stopped"] = "tired".into();
    assert!(!validator.is_valid(&wrong));
}

#[test]
fn findings_read_back_as_they_were() {
    let text = json::text("findings.json", &crate::stand_in::findings()).unwrap();
    let back: ratewright::output::findings::Findings = serde_json::from_str(&text).unwrap();
    assert_eq!(back, crate::stand_in::findings());
}
