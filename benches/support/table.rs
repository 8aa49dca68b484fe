//! CSV tables of figures: written by one bench, read by another or kept beside it.

use super::Failure;
use std::path::Path;

/// A table as text: a header, then one line a row.
#[derive(Debug, Clone)]
pub struct Table {
    header: Vec<String>,
    rows: Vec<Vec<String>>,
}

impl Table {
    /// An empty table with these columns.
    pub fn new(header: &[&str]) -> Table {
        Table {
            header: header.iter().map(|name| (*name).to_owned()).collect(),
            rows: Vec::new(),
        }
    }

    /// Adds a row of one cell a column.
    pub fn push(&mut self, row: Vec<String>) {
        self.rows.push(row);
    }

    /// The rows.
    pub fn rows(&self) -> &[Vec<String>] {
        &self.rows
    }

    /// Place of a column.
    ///
    /// # Errors
    /// There is no such column.
    pub fn column(&self, name: &str) -> Result<usize, Failure> {
        let place = self.header.iter().position(|column| column == name);
        place.ok_or_else(|| format!("the table has no column `{name}`").into())
    }

    /// Reads a table.
    ///
    /// # Errors
    /// The file cannot be read, or is no table.
    pub fn read(path: &Path) -> Result<Table, Failure> {
        let mut reader =
            csv::Reader::from_path(path).map_err(|error| format!("cannot read {}: {error}", path.display()))?;
        let header = reader.headers()?.iter().map(str::to_owned).collect();
        let mut rows = Vec::new();
        for record in reader.records() {
            rows.push(record?.iter().map(str::to_owned).collect());
        }
        Ok(Table { header, rows })
    }

    /// Writes the table, making its folder where that is missing.
    ///
    /// # Errors
    /// The file cannot be written.
    pub fn write(&self, path: &Path) -> Result<(), Failure> {
        if let Some(folder) = path.parent() {
            std::fs::create_dir_all(folder)?;
        }
        let mut writer =
            csv::Writer::from_path(path).map_err(|error| format!("cannot write {}: {error}", path.display()))?;
        writer.write_record(&self.header)?;
        for row in &self.rows {
            writer.write_record(row)?;
        }
        writer.flush()?;
        Ok(())
    }
}
