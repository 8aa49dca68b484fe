//! Finds the first place at which two files of the same name differ.

use crate::output::{OutputError, parquet};
use serde_json::Value;
use std::path::Path;

/// The first difference of two files.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Difference {
    /// Where: a JSON pointer, a line and column, or a column and row; empty when only the bytes differ.
    pub place: String,
    /// What the first file has there; `None` for nothing at all.
    pub first: Option<String>,
    /// What the second file has there; `None` for nothing at all.
    pub second: Option<String>,
}

/// The first difference of `file` in two folders; `None` when the bytes are the same.
///
/// # Errors
/// A file cannot be read.
pub fn first_difference(first: &Path, second: &Path, file: &str) -> Result<Option<Difference>, OutputError> {
    let read = |folder: &Path| {
        let path = folder.join(file);
        std::fs::read(&path).map_err(OutputError::read(&path))
    };
    let (a, b) = (read(first)?, read(second)?);
    let (first_size, second_size) = (a.len(), b.len());
    if a == b {
        return Ok(None);
    }
    let found = match Path::new(file).extension().and_then(|extension| extension.to_str()) {
        Some("json") => of_json(&a, &b),
        Some("csv") => of_csv(&a, &b),
        Some("parquet") => match (
            parquet::read_all(&first.join(file)),
            parquet::read_all(&second.join(file)),
        ) {
            (Ok(a), Ok(b)) => of_columns(&a, &b),
            // A file that was emptied, cut or written over is no Parquet any more.
            (a, b) => Some(Difference {
                place: "the file as a whole".to_owned(),
                first: Some(as_a_whole(a.ok(), first_size)),
                second: Some(as_a_whole(b.ok(), second_size)),
            }),
        },
        _ => of_lines(&a, &b),
    };
    Ok(Some(found.unwrap_or(Difference {
        place: String::new(),
        first: None,
        second: None,
    })))
}

/// What can be said of a Parquet file of `size` bytes that is not compared cell by cell.
fn as_a_whole(columns: Option<Vec<parquet::Compared>>, size: usize) -> String {
    match columns {
        None if size == 0 => "it is empty, and cannot be read as Parquet".to_owned(),
        None => format!("its {size} bytes cannot be read as Parquet"),
        Some(columns) => format!(
            "{} columns of {} rows",
            columns.len(),
            columns.first().map_or(0, |column| column.cells.len())
        ),
    }
}

/// The first difference of two JSON values, in the order of the first.
pub fn of_values(a: &Value, b: &Value) -> Option<Difference> {
    let here = |place: String, first: Option<&Value>, second: Option<&Value>| {
        let text = |value: Option<&Value>| value.map(short);
        Some(Difference {
            place,
            first: text(first),
            second: text(second),
        })
    };
    let below = |key: &str, a: Option<&Value>, b: Option<&Value>| {
        let key = format!("/{}", key.replace('~', "~0").replace('/', "~1"));
        match (a, b) {
            (Some(a), Some(b)) => of_values(a, b).map(|found| Difference {
                place: format!("{key}{}", found.place),
                ..found
            }),
            (None, None) => None,
            _ => here(key, a, b),
        }
    };
    match (a, b) {
        (Value::Object(a), Value::Object(b)) => a
            .iter()
            .find_map(|(key, value)| below(key, Some(value), b.get(key)))
            .or_else(|| b.iter().find_map(|(key, value)| below(key, a.get(key), Some(value)))),
        (Value::Array(a), Value::Array(b)) => {
            (0..a.len().max(b.len())).find_map(|k| below(&k.to_string(), a.get(k), b.get(k)))
        }
        _ if a == b => None,
        _ => here(String::new(), Some(a), Some(b)),
    }
}

/// A value on one line, cut where it is long.
fn short(value: &Value) -> String {
    const LONGEST: usize = 120;
    let text = value.to_string();
    if text.chars().count() <= LONGEST {
        return text;
    }
    let cut: String = text.chars().take(LONGEST).collect();
    format!("{cut}…")
}

fn of_json(a: &[u8], b: &[u8]) -> Option<Difference> {
    match (serde_json::from_slice(a), serde_json::from_slice(b)) {
        (Ok(a), Ok(b)) => of_values(&a, &b),
        _ => None,
    }
    // Values may agree where the spelling differs.
    .or_else(|| of_lines(a, b))
}

fn of_csv(a: &[u8], b: &[u8]) -> Option<Difference> {
    let read = |bytes: &[u8]| -> Option<Vec<Vec<String>>> {
        csv::ReaderBuilder::new()
            .has_headers(false)
            .flexible(true)
            .from_reader(bytes)
            .into_records()
            .map(|record| record.ok().map(|record| record.iter().map(str::to_owned).collect()))
            .collect()
    };
    let (a_rows, b_rows) = (read(a)?, read(b)?);
    let header = a_rows.first().cloned().unwrap_or_default();
    for row in 0..a_rows.len().max(b_rows.len()) {
        let (first, second) = (a_rows.get(row), b_rows.get(row));
        let cells = first.map_or(0, Vec::len).max(second.map_or(0, Vec::len));
        for column in 0..cells {
            let first = first.and_then(|cells| cells.get(column));
            let second = second.and_then(|cells| cells.get(column));
            if first != second {
                let name = header.get(column).map_or_else(String::new, Clone::clone);
                return Some(Difference {
                    place: format!("line {}, column {name}", row + 1),
                    first: first.cloned(),
                    second: second.cloned(),
                });
            }
        }
    }
    of_lines(a, b)
}

fn of_columns(a: &[parquet::Compared], b: &[parquet::Compared]) -> Option<Difference> {
    for place in 0..a.len().max(b.len()) {
        let (first, second) = (a.get(place), b.get(place));
        let names = [first, second].map(|column| column.map(|column| column.name.clone()));
        if names[0] != names[1] {
            let [first, second] = names;
            return Some(Difference {
                place: format!("name of column {}", place + 1),
                first,
                second,
            });
        }
        let (Some(first), Some(second)) = (first, second) else {
            continue;
        };
        for row in 0..first.cells.len().max(second.cells.len()) {
            let cells = [first, second].map(|column| column.cells.get(row).cloned());
            if cells[0] != cells[1] {
                let [before, after] = cells;
                return Some(Difference {
                    place: format!("column {}, row {}", first.name, row + 1),
                    first: before,
                    second: after,
                });
            }
        }
    }
    None
}

fn of_lines(a: &[u8], b: &[u8]) -> Option<Difference> {
    let (a, b) = (String::from_utf8_lossy(a), String::from_utf8_lossy(b));
    let (mut first, mut second) = (a.split('\n'), b.split('\n'));
    let mut line = 0;
    loop {
        line += 1;
        match (first.next(), second.next()) {
            (None, None) => return None,
            (a, b) if a == b => {}
            (a, b) => {
                return Some(Difference {
                    place: format!("line {line}"),
                    first: a.map(str::to_owned),
                    second: b.map(str::to_owned),
                });
            }
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn difference(place: &str, first: Option<&str>, second: Option<&str>) -> Option<Difference> {
        Some(Difference {
            place: place.to_owned(),
            first: first.map(str::to_owned),
            second: second.map(str::to_owned),
        })
    }

    #[test]
    fn a_json_difference_is_a_pointer() {
        let found = of_json(br#"{"a/b":[1,{"c":0.5}]}"#, br#"{"a/b":[1,{"c":0.25}]}"#);
        assert_eq!(found, difference("/a~1b/1/c", Some("0.5"), Some("0.25")));
        let found = of_json(br#"{"a":1}"#, br#"{"a":1,"b":2}"#);
        assert_eq!(found, difference("/b", None, Some("2")));
        let found = of_json(br#"{"a":1}"#, br#"{"a": 1}"#);
        assert_eq!(found, difference("line 1", Some(r#"{"a":1}"#), Some(r#"{"a": 1}"#)));
    }

    #[test]
    fn a_csv_difference_is_a_line_and_a_column() {
        let found = of_csv(b"unit,rows\nA,1\nB,2\n", b"unit,rows\nA,1\nB,3\n");
        assert_eq!(found, difference("line 3, column rows", Some("2"), Some("3")));
        let found = of_csv(b"unit,rows\nA,1\n", b"unit,rows\n");
        assert_eq!(found, difference("line 2, column unit", Some("A"), None));
    }

    #[test]
    fn a_parquet_difference_is_a_column_and_a_row() {
        let column = |name: &str, cells: &[&str]| parquet::Compared {
            name: name.to_owned(),
            cells: cells.iter().map(|&cell| cell.to_owned()).collect(),
        };
        let found = of_columns(&[column("a", &["1", "2"])], &[column("a", &["1", "3"])]);
        assert_eq!(found, difference("column a, row 2", Some("2"), Some("3")));
        let found = of_columns(&[column("a", &["1"])], &[column("b", &["1"])]);
        assert_eq!(found, difference("name of column 1", Some("a"), Some("b")));
    }

    #[test]
    fn a_text_difference_is_a_line() {
        assert_eq!(
            of_lines(b"a\nb\n", b"a\nc\n"),
            difference("line 2", Some("b"), Some("c"))
        );
        assert_eq!(of_lines(b"a\n", b"a"), difference("line 2", Some(""), None));
    }
}
