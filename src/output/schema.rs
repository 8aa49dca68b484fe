//! The JSON Schema of `findings.json`, made from the types themselves.

use crate::output::findings::Findings;
use serde_json::Value;

/// JSON Schema (draft 2020-12) of `findings.json`.
pub fn findings_schema() -> Value {
    schemars::schema_for!(Findings).to_value()
}
