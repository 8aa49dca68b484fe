//! Reads comma-separated text.
//!
//! In: bytes. Out: text columns of equal length, trimmed, with the line of every row. What the
//! cells mean (a count, a level, a gap) is left to `design`.

use super::{Cells, Column, HeaderPlace, RaggedRow, Table, TableError, TableFault, TextCells};
use crate::regular_file;
use std::io::Read;
use std::path::Path;

/// How many characters of a ragged row are kept for its message.
const RAGGED_TEXT: usize = 40;

/// Reads the comma-separated table at `path`, which messages call `file`.
///
/// Accepts a byte-order mark, either line ending, quoted cells with commas and line breaks, and
/// blank lines, which are skipped. White space at both ends of every cell is removed.
///
/// # Errors
/// A file that cannot be read, is empty, is no UTF-8 text or has another separator; columns
/// without a name or with the same name; rows whose number of cells is not the header's.
pub fn read_csv(file: &str, path: &Path) -> Result<Table, TableError> {
    parse_csv(file, &read_bytes(file, path)?)
}

/// The bytes of the data file at `path`, which messages call `file`.
///
/// # Errors
/// The file cannot be read, or is a folder, a device or a pipe.
pub fn read_bytes(file: &str, path: &Path) -> Result<Vec<u8>, TableError> {
    let mut bytes = Vec::new();
    regular_file::open(path)
        .and_then(|mut opened| opened.read_to_end(&mut bytes))
        .map_err(|error| TableError {
            file: file.to_owned(),
            faults: vec![TableFault::Unreadable {
                reason: error.to_string(),
            }],
        })?;
    Ok(bytes)
}

/// As [`read_csv`], from bytes in memory.
///
/// # Errors
/// As [`read_csv`].
pub fn parse_csv(file: &str, bytes: &[u8]) -> Result<Table, TableError> {
    let refuse = |faults: Vec<TableFault>| TableError {
        file: file.to_owned(),
        faults,
    };
    let text = plain_text(bytes).map_err(|fault| refuse(vec![fault]))?;
    let mut rows = Rows::new(text);
    let Some(header) = rows.next().map_err(|fault| refuse(vec![fault]))? else {
        return Err(refuse(vec![TableFault::Empty]));
    };
    let names: Vec<String> = header.cells.iter().map(|name| name.trim().to_owned()).collect();
    let mut faults = header_faults(&names, header.line);
    if matches!(faults.as_slice(), [TableFault::OtherSeparator { .. }]) {
        return Err(refuse(faults));
    }

    let mut cells = vec![TextCells::default(); names.len()];
    let mut lines = Vec::new();
    let mut ragged = Vec::new();
    loop {
        let row = match rows.next() {
            Ok(Some(row)) => row,
            Ok(None) => break,
            Err(fault) => {
                faults.push(fault);
                break;
            }
        };
        if row.cells.len() != cells.len() {
            ragged.push(RaggedRow {
                line: row.line,
                cells: row.cells.len(),
                text: beginning(row.text),
            });
            continue;
        }
        for (column, cell) in cells.iter_mut().zip(row.cells) {
            column.push(cell.trim());
        }
        lines.push(row.line);
    }
    if lines.is_empty() && ragged.is_empty() && faults.is_empty() {
        faults.push(TableFault::NoRows);
    }
    if !ragged.is_empty() {
        faults.push(TableFault::Ragged {
            header: names.len(),
            rows: ragged,
        });
    }
    if !faults.is_empty() {
        return Err(refuse(faults));
    }
    let columns = names.into_iter().zip(cells).map(|(name, cells)| Column {
        name,
        cells: Cells::Text(cells),
    });
    Ok(Table {
        file: file.to_owned(),
        columns: columns.collect(),
        lines,
    })
}

/// The bytes as text without a byte-order mark.
fn plain_text(bytes: &[u8]) -> Result<&str, TableFault> {
    if bytes.starts_with(&[0xFF, 0xFE]) || bytes.starts_with(&[0xFE, 0xFF]) {
        return Err(TableFault::Utf16);
    }
    let text = std::str::from_utf8(bytes).map_err(|error| {
        let offset = error.valid_up_to();
        TableFault::NotUtf8 {
            offset,
            line: 1 + line_ends(&bytes[..offset]),
            byte: bytes[offset],
        }
    })?;
    if let Some(offset) = bytes.iter().position(|&byte| byte == 0) {
        let line = 1 + line_ends(&bytes[..offset]);
        return Err(TableFault::Nul { offset, line });
    }
    Ok(text.strip_prefix('\u{FEFF}').unwrap_or(text))
}

/// Line ends in `bytes`: a line feed, a carriage return, or both together.
fn line_ends(bytes: &[u8]) -> u64 {
    let feeds = bytes.iter().filter(|&&byte| byte == b'\n').count();
    let returns = bytes.iter().filter(|&&byte| byte == b'\r').count();
    let pairs = match returns {
        0 => 0,
        _ => bytes.windows(2).filter(|pair| pair == b"\r\n").count(),
    };
    (feeds + returns - pairs) as u64
}

/// One row of the text: its line, its cells, and the text that they were read from.
struct Row<'a> {
    line: u64,
    cells: &'a csv::StringRecord,
    text: &'a str,
}

/// The rows of a text, blank lines left out, each with the line that it starts on.
///
/// The lines are counted here and not taken from the reader's own position: that one is taken
/// before blank lines, and the line feed of a CRLF, are skipped, and is then a line too early.
struct Rows<'t> {
    text: &'t str,
    reader: csv::Reader<&'t [u8]>,
    cells: csv::StringRecord,
    counted_to: usize,
    line: u64,
}

impl<'t> Rows<'t> {
    fn new(text: &'t str) -> Self {
        let reader = csv::ReaderBuilder::new()
            .has_headers(false)
            .flexible(true)
            .from_reader(text.as_bytes());
        Rows {
            text,
            reader,
            cells: csv::StringRecord::new(),
            counted_to: 0,
            line: 1,
        }
    }

    fn next(&mut self) -> Result<Option<Row<'_>>, TableFault> {
        let bytes = self.text.as_bytes();
        loop {
            let before = self.reader.position().byte() as usize;
            let more = self
                .reader
                .read_record(&mut self.cells)
                .map_err(|error| TableFault::Unreadable {
                    reason: error.to_string(),
                })?;
            if !more {
                return Ok(None);
            }
            let after = self.reader.position().byte() as usize;
            let blank = bytes[before..after]
                .iter()
                .take_while(|byte| matches!(byte, b'\r' | b'\n'))
                .count();
            let start = before + blank;
            self.line += line_ends(&bytes[self.counted_to..start]);
            self.counted_to = start;
            let text = self.text.get(start..after).unwrap_or_default();
            if text.trim().is_empty() {
                continue;
            }
            if after == self.text.len() && never_closed(text) {
                return Err(TableFault::UnclosedQuote { line: self.line });
            }
            return Ok(Some(Row {
                line: self.line,
                cells: &self.cells,
                text,
            }));
        }
    }
}

/// Whether the last row of a file ends inside a quoted cell: it runs over a line end, and its
/// quotation marks do not pair. (A single mark within one line may be an inch sign.)
fn never_closed(text: &str) -> bool {
    text.trim_end().contains(['\n', '\r']) && text.matches('"').count() % 2 == 1
}

fn header_faults(names: &[String], line: u64) -> Vec<TableFault> {
    if let [only] = names
        && let Some(separator) = only.chars().find(|sign| matches!(sign, ';' | '\t'))
    {
        return vec![TableFault::OtherSeparator { separator }];
    }
    let mut seen = std::collections::HashSet::new();
    let mut unnamed = Vec::new();
    let mut repeated = Vec::new();
    for (position, name) in names.iter().enumerate() {
        let place = || HeaderPlace {
            position: position + 1,
            name: name.clone(),
            line,
        };
        if name.is_empty() {
            unnamed.push(place());
        } else if !seen.insert(name) {
            repeated.push(place());
        }
    }
    let mut faults = Vec::new();
    if !unnamed.is_empty() {
        faults.push(TableFault::UnnamedColumns { columns: unnamed });
    }
    if !repeated.is_empty() {
        faults.push(TableFault::RepeatedColumns { columns: repeated });
    }
    faults
}

/// The first characters of a row's first line.
fn beginning(text: &str) -> String {
    let first = text.lines().next().unwrap_or_default();
    let mut kept: String = first.chars().take(RAGGED_TEXT).collect();
    if kept.len() < text.trim_end().len() {
        kept.push('…');
    }
    kept
}
