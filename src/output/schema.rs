//! The JSON Schema of `findings.json`, made from the types themselves.

use crate::output::findings::Findings;
use serde_json::Value;

/// JSON Schema (draft 2020-12) of `findings.json`.
pub fn findings_schema() -> Value {
    let mut schema = schemars::schema_for!(Findings).to_value();
    if let Some(entries) = schema.as_object_mut() {
        // A reader looks for these at the top of the file.
        for key in ["description", "title", "$schema"] {
            if let Some(value) = entries.shift_remove(key) {
                entries.shift_insert(0, key.to_owned(), value);
            }
        }
    }
    schema
}
