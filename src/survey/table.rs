//! The table as a file: Parquet, CSV or NDJSON, by its ending.

use std::io::Write;
use std::path::Path;

use super::Row;
use super::parquet::{read_parquet, write_parquet};
use super::row::{COLUMNS, Cell, Holds};
use crate::error::{Error, Kind, Result};
use crate::format::write_whole;

/// How a table is written.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum TableFormat {
    /// Apache Parquet.
    Parquet,
    /// Text with a line of headings.
    Csv,
    /// One JSON object a line.
    Ndjson,
}

impl TableFormat {
    /// Its name, which is also the ending.
    pub fn name(self) -> &'static str {
        match self {
            Self::Parquet => "parquet",
            Self::Csv => "csv",
            Self::Ndjson => "ndjson",
        }
    }

    /// By the ending of the file's name.
    ///
    /// # Errors
    /// `usage` for another ending.
    pub fn of(path: &Path) -> Result<Self> {
        let ending = path.extension().and_then(|e| e.to_str());
        match ending.map(str::to_ascii_lowercase).as_deref() {
            Some("parquet") => Ok(Self::Parquet),
            Some("csv") => Ok(Self::Csv),
            Some("ndjson" | "jsonl") => Ok(Self::Ndjson),
            _ => Err(Error::new(
                Kind::Usage,
                "the ending of the table's name says no format",
                "end it in .parquet, .csv or .ndjson",
            )
            .in_file(path)),
        }
    }
}

/// Writes rows as a table, whole or not at all.
///
/// # Errors
/// `usage` for the ending, `cannot-write`.
pub fn write_table(path: &Path, rows: &[Row]) -> Result<()> {
    let format = TableFormat::of(path)?;
    write_whole(path, |to| match format {
        TableFormat::Parquet => to.write_all(&write_parquet(rows)?),
        TableFormat::Csv => write_csv(to, rows),
        TableFormat::Ndjson => {
            for row in rows {
                serde_json::to_writer(&mut *to, row)?;
                to.write_all(b"\n")?;
            }
            Ok(())
        }
    })
}

/// Reads a table that [`write_table`] wrote; the rows have the same bits.
///
/// # Errors
/// `usage` for the ending, `not-found`, and `unknown-format` for what is no table of a survey.
pub fn read_table(path: &Path) -> Result<Vec<Row>> {
    let format = TableFormat::of(path)?;
    let bytes = crate::format::Bytes::open(path)?;
    let rows = match format {
        TableFormat::Parquet => read_parquet(&bytes),
        TableFormat::Csv => read_csv(&bytes),
        TableFormat::Ndjson => {
            let lines = bytes.split(|&b| b == b'\n').filter(|l| !l.is_empty());
            let rows = lines.map(|l| serde_json::from_slice(l).map_err(|e| e.to_string()));
            rows.collect()
        }
    };
    rows.map_err(|e| {
        Error::new(
            Kind::UnknownFormat,
            format!("this is no table of a survey: {e}"),
            "name another file, or take this one away",
        )
        .in_file(path)
    })
}

fn write_csv(to: &mut dyn Write, rows: &[Row]) -> std::io::Result<()> {
    let mut out = csv::Writer::from_writer(to);
    out.write_record(COLUMNS.iter().map(|c| c.name))?;
    for row in rows {
        let cells = row.cells();
        out.write_record(cells.into_iter().map(|cell| match cell {
            Cell::Text(x) => x.unwrap_or_default(),
            Cell::Count(x) => x.map_or(String::new(), |x| x.to_string()),
            // The shortest digits that are this f64 and no other.
            Cell::Real(x) => x.map_or(String::new(), |x| format!("{x:?}")),
            Cell::Flag(x) => x.map_or(String::new(), |x| x.to_string()),
        }))?;
    }
    out.flush()
}

fn read_csv(bytes: &[u8]) -> Result<Vec<Row>, String> {
    let mut from = csv::Reader::from_reader(bytes);
    let headings = from.headers().map_err(|e| e.to_string())?.clone();
    // Somebody else's file must not be written over.
    if let Some(lost) = ["path", "sha256", "program"]
        .into_iter()
        .find(|name| !headings.iter().any(|h| h == *name))
    {
        return Err(format!("it has no column {lost}"));
    }
    let mut rows = Vec::new();
    for record in from.records() {
        let record = record.map_err(|e| e.to_string())?;
        let mut row = Row::default();
        for (name, text) in headings.iter().zip(&record) {
            let holds = COLUMNS.iter().find(|c| c.name == name).map(|c| c.holds);
            let some = Some(text).filter(|t| !t.is_empty());
            let bad = || format!("\"{text}\" stands in {name}");
            let cell = match holds {
                Some(Holds::Count) => {
                    Cell::Count(some.map(|t| t.parse().map_err(|_| bad())).transpose()?)
                }
                Some(Holds::Real) => {
                    Cell::Real(some.map(|t| t.parse().map_err(|_| bad())).transpose()?)
                }
                Some(Holds::Flag) => {
                    Cell::Flag(some.map(|t| t.parse().map_err(|_| bad())).transpose()?)
                }
                Some(Holds::Text) | None => Cell::Text(some.map(str::to_owned)),
            };
            row.set(name, cell)?;
        }
        rows.push(row);
    }
    Ok(rows)
}
