//! Reads the check tables beside this file: `#` lines say where the numbers come from, then a header, then numbers.

use std::path::Path;

/// A table of numbers.
pub struct Table {
    name: String,
    header: Vec<String>,
    rows: Vec<Vec<f64>>,
}

impl Table {
    /// Reads `tests/tables/<name>`.
    pub fn read(name: &str) -> Table {
        let path = Path::new(env!("CARGO_MANIFEST_DIR")).join("tests/tables").join(name);
        let text = std::fs::read_to_string(&path).unwrap_or_else(|error| panic!("{}: {error}", path.display()));
        let mut lines = text.lines().filter(|line| !line.starts_with('#'));
        let header: Vec<String> = lines.next().expect("a header").split(',').map(String::from).collect();
        let rows: Vec<Vec<f64>> = lines
            .map(|line| {
                line.split(',')
                    .map(|cell| cell.parse().unwrap_or_else(|_| panic!("{name}: {line}")))
                    .collect()
            })
            .collect();
        assert!(!rows.is_empty(), "{name} is empty");
        Table {
            name: name.to_string(),
            header,
            rows,
        }
    }

    /// One column.
    pub fn column(&self, column: &str) -> Vec<f64> {
        let place = self
            .header
            .iter()
            .position(|name| name == column)
            .unwrap_or_else(|| panic!("{} has no column {column}", self.name));
        self.rows.iter().map(|row| row[place]).collect()
    }

    /// The rows.
    pub fn rows(&self) -> &[Vec<f64>] {
        &self.rows
    }
}
