//! Parquet files of a run: the draws, and the rows that the fit used. All calls of the Parquet
//! library are made here.
//!
//! The bytes depend on the values alone: one thread, one row group, one compression.

use crate::fit::Draws;
use crate::output::OutputError;
use crate::table::{Cells, Table, TextCells};
use polars::prelude::{
    Column, DataFrame, DataType, IntoColumn, NamedFrom, ParquetCompression, ParquetReader, ParquetWriter, SerReader,
    Series,
};
use std::path::Path;

/// The columns before the parameters in `draws.parquet`.
const CHAIN: &str = "chain";
const DRAW: &str = "draw";

/// Name of the first column of `rows.parquet`: the line of the data file.
const LINE: &str = "line_of_file";

/// `draws.parquet`: chain and draw, both counted from 1, then one column for each parameter.
pub fn draws(path: &Path, draws: &Draws) -> Result<Vec<u8>, OutputError> {
    let chain: Vec<u32> = (0..draws.in_all())
        .map(|k| (k / draws.per_chain.max(1)) as u32 + 1)
        .collect();
    let draw: Vec<u32> = (0..draws.in_all())
        .map(|k| (k % draws.per_chain.max(1)) as u32 + 1)
        .collect();
    let mut names = Names::default();
    let mut columns = vec![
        Series::new(names.free(CHAIN).into(), chain).into_column(),
        Series::new(names.free(DRAW).into(), draw).into_column(),
    ];
    for (name, values) in draws.parameters.iter().zip(&draws.values) {
        columns.push(Series::new(names.free(name).into(), values.as_slice()).into_column());
    }
    written(path, columns)
}

/// `rows.parquet`: the line of each row in the data file, then the columns that the fit used.
pub fn rows(path: &Path, rows: &Table) -> Result<Vec<u8>, OutputError> {
    let mut names = Names::default();
    for column in &rows.columns {
        names.taken.push(column.name.clone());
    }
    let mut columns = vec![Series::new(names.free(LINE).into(), rows.lines.as_slice()).into_column()];
    for column in &rows.columns {
        let name = column.name.as_str().into();
        columns.push(match &column.cells {
            Cells::Numbers(cells) => Series::new(name, cells.as_slice()).into_column(),
            Cells::Text(cells) => Series::new(name, cells.iter().collect::<Vec<&str>>()).into_column(),
        });
    }
    written(path, columns)
}

/// Reads `rows.parquet` back; `file` is the name of the data file that its lines belong to.
///
/// # Errors
/// The file cannot be read, or is not as [`rows`] writes it.
pub fn read_rows(path: &Path, file: &str) -> Result<Table, OutputError> {
    let frame = read(path)?;
    let damaged = |because: &str| OutputError::Damaged {
        path: path.to_owned(),
        because: because.to_owned(),
    };
    let (first, rest) = frame
        .columns()
        .split_first()
        .ok_or_else(|| damaged("it has no column"))?;
    let lines: Vec<u64> = first
        .u64()
        .map_err(|_| damaged("its first column does not hold line numbers"))?
        .iter()
        .collect::<Option<_>>()
        .ok_or_else(|| damaged("a line number is missing"))?;
    let columns = rest
        .iter()
        .map(|column| {
            let cells = cells(column).ok_or_else(|| damaged("a column holds neither text nor numbers"))?;
            Ok(crate::table::Column {
                name: column.name().to_string(),
                cells,
            })
        })
        .collect::<Result<_, OutputError>>()?;
    Ok(Table {
        file: file.to_owned(),
        columns,
        lines,
    })
}

/// One column of a Parquet file, as far as a comparison needs it.
pub struct Compared {
    /// Its name.
    pub name: String,
    /// Its cells as text, numbers in their shortest form.
    pub cells: Vec<String>,
}

/// All columns of a Parquet file that a run has left, for comparison.
pub fn read_all(path: &Path) -> Result<Vec<Compared>, OutputError> {
    let frame = read(path)?;
    frame
        .columns()
        .iter()
        .map(|column| {
            let cells = cells(column).ok_or_else(|| OutputError::Damaged {
                path: path.to_owned(),
                because: "a column holds neither text nor numbers".to_owned(),
            })?;
            let cells = match cells {
                Cells::Text(cells) => cells.iter().map(str::to_owned).collect(),
                Cells::Numbers(cells) => cells
                    .into_iter()
                    .map(|cell| cell.map_or_else(String::new, crate::output::tables::number))
                    .collect(),
            };
            Ok(Compared {
                name: column.name().to_string(),
                cells,
            })
        })
        .collect()
}

fn read(path: &Path) -> Result<DataFrame, OutputError> {
    let bytes = std::fs::read(path).map_err(OutputError::read(path))?;
    ParquetReader::new(std::io::Cursor::new(bytes))
        .finish()
        .map_err(|error| OutputError::Damaged {
            path: path.to_owned(),
            because: error.to_string(),
        })
}

fn cells(column: &Column) -> Option<Cells> {
    match column.dtype() {
        DataType::String => {
            let mut cells = TextCells::default();
            for cell in column.str().ok()?.iter() {
                cells.push(cell.unwrap_or(""));
            }
            Some(Cells::Text(cells))
        }
        DataType::Float64 | DataType::UInt32 | DataType::UInt64 => {
            let numbers = column.cast(&DataType::Float64).ok()?;
            Some(Cells::Numbers(numbers.f64().ok()?.iter().collect()))
        }
        _ => None,
    }
}

fn written(path: &Path, columns: Vec<Column>) -> Result<Vec<u8>, OutputError> {
    let failed = |because: String| OutputError::Parquet {
        path: path.to_owned(),
        because,
    };
    let height = columns.first().map_or(0, Column::len);
    let mut frame = DataFrame::new(height, columns).map_err(|error| failed(error.to_string()))?;
    let mut bytes = Vec::new();
    ParquetWriter::new(&mut bytes)
        .with_compression(ParquetCompression::Zstd(None))
        .with_row_group_size(Some(height.max(1)))
        .set_parallel(false)
        .finish(&mut frame)
        .map_err(|error| failed(error.to_string()))?;
    Ok(bytes)
}

/// Column names that are taken: a covariate may be called `chain`, and no table has two such.
#[derive(Default)]
struct Names {
    taken: Vec<String>,
}

impl Names {
    /// The name, with underscores behind it as long as it is taken.
    fn free(&mut self, name: &str) -> String {
        let mut name = name.to_owned();
        while self.taken.contains(&name) {
            name.push('_');
        }
        self.taken.push(name.clone());
        name
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn table() -> Table {
        let mut names = TextCells::default();
        for name in ["North quay", "", "=1+1"] {
            names.push(name);
        }
        let columns = vec![
            crate::table::Column {
                name: "landing".into(),
                cells: Cells::Text(names),
            },
            crate::table::Column {
                name: "line_of_file".into(),
                cells: Cells::Numbers(vec![Some(0.1), None, Some(1e-300)]),
            },
        ];
        Table {
            file: "landings.csv".into(),
            columns,
            lines: vec![2, 5, 6],
        }
    }

    #[test]
    fn rows_read_back_as_they_were() {
        let folder = tempfile::tempdir().unwrap();
        let path = folder.path().join("rows.parquet");
        std::fs::write(&path, rows(&path, &table()).unwrap()).unwrap();
        assert_eq!(read_rows(&path, "landings.csv").unwrap(), table());
    }

    #[test]
    fn a_parameter_may_have_the_name_of_a_fixed_column() {
        let folder = tempfile::tempdir().unwrap();
        let path = folder.path().join("draws.parquet");
        let sample = Draws {
            parameters: vec!["baseline".into(), "chain".into()],
            chains: 2,
            per_chain: 2,
            values: vec![vec![1.0, 2.0, 3.0, 4.0], vec![0.5; 4]],
        };
        std::fs::write(&path, draws(&path, &sample).unwrap()).unwrap();
        let columns = read_all(&path).unwrap();
        let names: Vec<&str> = columns.iter().map(|column| column.name.as_str()).collect();
        assert_eq!(names, ["chain", "draw", "baseline", "chain_"]);
        assert_eq!(columns[0].cells, ["1", "1", "2", "2"]);
        assert_eq!(columns[1].cells, ["1", "2", "1", "2"]);
    }

    #[test]
    fn a_damaged_file_is_told_and_not_a_panic() {
        let folder = tempfile::tempdir().unwrap();
        let path = folder.path().join("rows.parquet");
        let whole = rows(&path, &table()).unwrap();
        for bytes in [&b""[..], b"PAR1", &whole[..whole.len() / 2], &whole[4..]] {
            std::fs::write(&path, bytes).unwrap();
            assert!(read_rows(&path, "landings.csv").is_err());
        }
    }
}
