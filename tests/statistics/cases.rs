//! The reference cases: their specs, designs and check values.

use ratewright::design::{self, Design};
use ratewright::spec::{self, Spec};
use ratewright::table;
use serde_json::Value;
use std::path::{Path, PathBuf};

/// The cases with a posterior by a general-purpose sampler.
pub const CASES: [&str; 8] = [
    "ships.poisson",
    "ships.nb2",
    "insurance.poisson",
    "insurance.nb2",
    "quine.poisson",
    "quine.nb2",
    "clinic.poisson",
    "clinic.nb2",
];

/// A file of the reference.
pub fn file(name: &str) -> PathBuf {
    Path::new(env!("CARGO_MANIFEST_DIR")).join("tests/reference").join(name)
}

/// Spec and design of a case.
pub fn study(case: &str) -> (Spec, Design) {
    let spec = spec::read(&file(&format!("{case}.toml"))).unwrap();
    let data = &spec.data.file.value;
    let table = table::read_csv(data, &file(data)).unwrap();
    let design = design::build(&spec, &table).unwrap();
    (spec, design)
}

/// Check values of a case.
pub fn reference(case: &str) -> Value {
    serde_json::from_str(&std::fs::read_to_string(file(&format!("{case}.json"))).unwrap()).unwrap()
}

/// A number of the reference.
pub fn number(value: &Value) -> f64 {
    value.as_f64().unwrap_or_else(|| panic!("no number: {value}"))
}
