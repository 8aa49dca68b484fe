//! JSON files of a run: two spaces deep, in the order of their types, one line break at the end.

use crate::output::OutputError;
use serde::Serialize;
use serde_json::Value;

/// The text of a JSON file.
///
/// # Errors
/// [`OutputError::NotFinite`] where a figure is infinite or undefined: JSON would turn it into
/// `null`, which a reader takes for a value that nobody asked for.
pub fn text(file: &'static str, content: &impl Serialize) -> Result<String, OutputError> {
    let value = serde_json::to_value(content).map_err(|_| OutputError::NotFinite {
        file,
        place: "an unknown place".to_owned(),
    })?;
    if let Some(place) = first_null(&value) {
        return Err(OutputError::NotFinite { file, place });
    }
    // `{:#}` is serde_json's pretty form and cannot fail.
    Ok(format!("{value:#}\n"))
}

/// JSON pointer of the first `null`; what is absent has no key at all.
fn first_null(value: &Value) -> Option<String> {
    let below = |key: &str, value: &Value| {
        let key = key.replace('~', "~0").replace('/', "~1");
        first_null(value).map(|rest| format!("/{key}{rest}"))
    };
    match value {
        Value::Null => Some(String::new()),
        Value::Array(items) => items
            .iter()
            .enumerate()
            .find_map(|(k, item)| below(&k.to_string(), item)),
        Value::Object(items) => items.iter().find_map(|(key, item)| below(key, item)),
        _ => None,
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_figure_that_is_not_finite_is_named() {
        let content = serde_json::json!({ "a/b": [1.0, f64::NAN] });
        let error = text("findings.json", &content).unwrap_err();
        assert!(error.to_string().contains("/a~1b/1"), "{error}");
    }

    #[test]
    fn numbers_read_back_to_the_same_bits() {
        let content = [0.1, 1e-300, 1.0 / 3.0, 5e-324];
        let text = text("findings.json", &content).unwrap();
        let back: [f64; 4] = serde_json::from_str(&text).unwrap();
        assert_eq!(back.map(f64::to_bits), content.map(f64::to_bits));
    }
}
