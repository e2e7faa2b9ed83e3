//! The table as Apache Parquet, compressed with Snappy, its units in the file's key-value metadata.

use std::io;
use std::sync::Arc;

use parquet::basic::Compression;
use parquet::data_type::{BoolType, ByteArray, ByteArrayType, DataType, DoubleType, Int64Type};
use parquet::file::metadata::KeyValue;
use parquet::file::properties::WriterProperties;
use parquet::file::reader::{FileReader, SerializedFileReader};
use parquet::file::writer::{SerializedColumnWriter, SerializedFileWriter};
use parquet::record::Field;
use parquet::schema::parser::parse_message_type;

use super::Row;
use super::row::{COLUMNS, Cell, Holds};

/// Rows in a row group: what a reader must hold at a time.
const GROUP: usize = 1 << 17;

fn schema() -> String {
    let fields: Vec<String> = COLUMNS
        .iter()
        .map(|c| match c.holds {
            Holds::Text => format!("optional binary {} (UTF8);", c.name),
            Holds::Count => format!("optional int64 {};", c.name),
            Holds::Real => format!("optional double {};", c.name),
            Holds::Flag => format!("optional boolean {};", c.name),
        })
        .collect();
    format!("message survey {{ {} }}", fields.join(" "))
}

/// Unit and meaning of every column, as JSON.
fn columns() -> String {
    let of = |c: &super::Column| {
        let about = serde_json::json!({ "unit": c.unit, "meaning": c.meaning });
        (c.name.to_owned(), about)
    };
    serde_json::Value::Object(COLUMNS.iter().map(of).collect()).to_string()
}

pub(super) fn write_parquet(rows: &[Row]) -> io::Result<Vec<u8>> {
    let metadata = vec![
        KeyValue::new("bismar.schema".to_owned(), "bismar/survey/1".to_owned()),
        KeyValue::new("bismar.columns".to_owned(), columns()),
    ];
    let properties = WriterProperties::builder()
        .set_compression(Compression::SNAPPY)
        .set_key_value_metadata(Some(metadata))
        .set_created_by(super::weigh::PROGRAM.to_owned())
        .build();
    let schema = Arc::new(parse_message_type(&schema())?);
    let mut out = Vec::new();
    let mut file = SerializedFileWriter::new(&mut out, schema, Arc::new(properties))?;
    for group in rows.chunks(GROUP) {
        let mut columns: Vec<Vec<Cell>> = vec![Vec::with_capacity(group.len()); COLUMNS.len()];
        for row in group {
            for (column, cell) in columns.iter_mut().zip(row.cells()) {
                column.push(cell);
            }
        }
        let mut to = file.next_row_group()?;
        for cells in columns {
            // A column a leaf of the schema: as many as are given here.
            let Some(mut column) = to.next_column()? else {
                break;
            };
            write_column(&mut column, cells)?;
            column.close()?;
        }
        to.close()?;
    }
    file.close()?;
    Ok(out)
}

/// All cells of a column are of one kind, that of the column.
fn write_column(to: &mut SerializedColumnWriter<'_>, cells: Vec<Cell>) -> io::Result<()> {
    macro_rules! of {
        ($kind:ident, $type:ty, $value:expr) => {{
            let cells = cells.into_iter().map(|c| match c {
                Cell::$kind(x) => x.map($value),
                _ => None,
            });
            write::<$type>(to, cells)
        }};
    }
    match cells.first() {
        Some(Cell::Text(_)) => of!(Text, ByteArrayType, |x| ByteArray::from(x.into_bytes())),
        // Counts of what lies in memory or in a file are below 2⁶³.
        Some(Cell::Count(_)) => of!(Count, Int64Type, |x| x as i64),
        Some(Cell::Real(_)) => of!(Real, DoubleType, |x| x),
        Some(Cell::Flag(_)) => of!(Flag, BoolType, |x| x),
        None => Ok(()),
    }
}

fn write<T: DataType>(
    to: &mut SerializedColumnWriter<'_>,
    cells: impl Iterator<Item = Option<T::T>>,
) -> io::Result<()> {
    let mut values = Vec::new();
    let mut there = Vec::new();
    for cell in cells {
        there.push(i16::from(cell.is_some()));
        values.extend(cell);
    }
    to.typed::<T>().write_batch(&values, Some(&there), None)?;
    Ok(())
}

pub(super) fn read_parquet(bytes: &[u8]) -> Result<Vec<Row>, String> {
    // The reader wants bytes that it may share.
    let bytes = bytes::Bytes::copy_from_slice(bytes);
    let file = SerializedFileReader::new(bytes).map_err(|e| e.to_string())?;
    let mut out = Vec::new();
    for record in file.get_row_iter(None).map_err(|e| e.to_string())? {
        let record = record.map_err(|e| e.to_string())?;
        let mut row = Row::default();
        for (name, field) in record.get_column_iter() {
            let cell = match field {
                Field::Null => continue,
                Field::Str(x) => Cell::Text(Some(x.clone())),
                Field::Long(x) => Cell::Count(Some(u64::try_from(*x).map_err(|e| e.to_string())?)),
                Field::Double(x) => Cell::Real(Some(*x)),
                Field::Bool(x) => Cell::Flag(Some(*x)),
                _ => return Err(format!("\"{name}\" holds something else")),
            };
            row.set(name, cell)?;
        }
        out.push(row);
    }
    Ok(out)
}
