//! Tables as Parquet files, fed with the lines of the same table as text.
//!
//! Rows are gathered in groups of bounded size. Column kinds say what a cell's text means; `NA` is null.
#![cfg_attr(not(test), deny(clippy::indexing_slicing))]
#![expect(
    clippy::indexing_slicing,
    reason = "places were found in the same line"
)]

use std::io::{self, Write};
use std::path::Path;
use std::sync::Arc;

use parquet::basic::{Compression, ConvertedType, LogicalType, Repetition, Type as Physical};
use parquet::data_type::{ByteArray, ByteArrayType, DoubleType, Int32Type, Int64Type};
use parquet::errors::ParquetError;
use parquet::file::metadata::KeyValue;
use parquet::file::properties::WriterProperties;
use parquet::file::writer::{SerializedColumnWriter, SerializedFileWriter};
use parquet::schema::types::{Type, TypePtr};

use crate::error::{Error, Result};
use crate::files::WholeFile;

/// Cells of a group of rows, all columns together.
const GROUP_CELLS: usize = 2_000_000;

/// What the cells of a column hold.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Kind {
    /// Text.
    Text,
    /// Whole numbers of 64 bits.
    Whole,
    /// Floating-point numbers.
    Number,
    /// A list of whole numbers, written with commas.
    Counts,
}

/// A Parquet file under way; lines of tab-separated cells are written to it.
pub struct ParquetTable {
    writer: SerializedFileWriter<WholeFile>,
    columns: Vec<Column>,
    /// The beginning of a line whose end has not come yet.
    pending: Vec<u8>,
    rows: usize,
    group_rows: usize,
}

/// The cells of a column that wait for their group to be written.
enum Column {
    Text(Vec<ByteArray>, Vec<i16>),
    Whole(Vec<i64>, Vec<i16>),
    Number(Vec<f64>, Vec<i16>),
    /// Values, definition levels, repetition levels.
    Counts(Vec<i32>, Vec<i16>, Vec<i16>),
}

impl ParquetTable {
    /// Creates the file (under a temporary name) with these columns.
    pub fn create(path: &Path, columns: &[(String, Kind)]) -> Result<Self> {
        let file = WholeFile::create(path)?;
        let failed = |e| Error::io(path, "write", io::Error::other(e));
        let schema = schema(columns).map_err(failed)?;
        let properties = WriterProperties::builder()
            .set_compression(Compression::SNAPPY)
            .set_created_by(concat!("genewane ", env!("CARGO_PKG_VERSION")).to_owned())
            .build();
        let writer =
            SerializedFileWriter::new(file, schema, Arc::new(properties)).map_err(failed)?;
        Ok(ParquetTable {
            writer,
            columns: columns.iter().map(|(_, kind)| Column::new(*kind)).collect(),
            pending: Vec::new(),
            rows: 0,
            group_rows: (GROUP_CELLS / columns.len().max(1)).max(256),
        })
    }

    /// Puts the complete file under its name, with texts by key in its footer.
    pub fn finish(mut self, path: &Path, texts: Vec<(String, String)>) -> Result<()> {
        let failed = |e: io::Error| Error::io(path, "write", e);
        self.write_group().map_err(failed)?;
        for (key, value) in texts {
            self.writer
                .append_key_value_metadata(KeyValue::new(key, value));
        }
        let file = self
            .writer
            .into_inner()
            .map_err(|e| failed(io::Error::other(e)))?;
        file.finish()
    }

    fn line(&mut self, line: &[u8]) -> io::Result<()> {
        let mut cells = line.split(|&b| b == b'\t');
        for column in &mut self.columns {
            let cell = cells.next().unwrap_or(b"NA");
            column.push(std::str::from_utf8(cell).map_err(io::Error::other)?)?;
        }
        self.rows += 1;
        match self.rows >= self.group_rows {
            true => self.write_group(),
            false => Ok(()),
        }
    }

    fn write_group(&mut self) -> io::Result<()> {
        if self.rows == 0 {
            return Ok(());
        }
        self.rows = 0;
        let mut group = self.writer.next_row_group().map_err(io::Error::other)?;
        for column in &mut self.columns {
            if let Some(mut writer) = group.next_column().map_err(io::Error::other)? {
                column.write(&mut writer).map_err(io::Error::other)?;
                writer.close().map_err(io::Error::other)?;
            }
        }
        group.close().map_err(io::Error::other)?;
        Ok(())
    }
}

impl Write for ParquetTable {
    fn write(&mut self, bytes: &[u8]) -> io::Result<usize> {
        let mut rest = bytes;
        while let Some(end) = rest.iter().position(|&b| b == b'\n') {
            let mut line = std::mem::take(&mut self.pending);
            line.extend_from_slice(&rest[..end]);
            self.line(&line)?;
            rest = &rest[end + 1..];
        }
        self.pending.extend_from_slice(rest);
        Ok(bytes.len())
    }

    fn flush(&mut self) -> io::Result<()> {
        Ok(())
    }
}

impl Column {
    fn new(kind: Kind) -> Self {
        match kind {
            Kind::Text => Column::Text(Vec::new(), Vec::new()),
            Kind::Whole => Column::Whole(Vec::new(), Vec::new()),
            Kind::Number => Column::Number(Vec::new(), Vec::new()),
            Kind::Counts => Column::Counts(Vec::new(), Vec::new(), Vec::new()),
        }
    }

    fn push(&mut self, cell: &str) -> io::Result<()> {
        let some = cell != "NA";
        let level = i16::from(some);
        match self {
            Column::Text(values, levels) => {
                levels.push(level);
                values.extend(some.then(|| ByteArray::from(cell)));
            }
            Column::Whole(values, levels) => {
                levels.push(level);
                if some {
                    values.push(cell.parse().map_err(io::Error::other)?);
                }
            }
            Column::Number(values, levels) => {
                levels.push(level);
                if some {
                    values.push(cell.parse().map_err(io::Error::other)?);
                }
            }
            Column::Counts(values, levels, repetitions) => {
                if !some || cell.is_empty() {
                    levels.push(0);
                    repetitions.push(0);
                    return Ok(());
                }
                for (i, count) in cell.split(',').enumerate() {
                    values.push(count.parse().map_err(io::Error::other)?);
                    levels.push(1);
                    repetitions.push(i16::from(i > 0));
                }
            }
        }
        Ok(())
    }

    fn write(
        &mut self,
        writer: &mut SerializedColumnWriter<'_>,
    ) -> std::result::Result<(), ParquetError> {
        match self {
            Column::Text(values, levels) => {
                let writer = writer.typed::<ByteArrayType>();
                writer.write_batch(values, Some(levels), None)?;
                values.clear();
                levels.clear();
            }
            Column::Whole(values, levels) => {
                let writer = writer.typed::<Int64Type>();
                writer.write_batch(values, Some(levels), None)?;
                values.clear();
                levels.clear();
            }
            Column::Number(values, levels) => {
                let writer = writer.typed::<DoubleType>();
                writer.write_batch(values, Some(levels), None)?;
                values.clear();
                levels.clear();
            }
            Column::Counts(values, levels, repetitions) => {
                let writer = writer.typed::<Int32Type>();
                writer.write_batch(values, Some(levels), Some(repetitions))?;
                values.clear();
                levels.clear();
                repetitions.clear();
            }
        }
        Ok(())
    }
}

fn schema(columns: &[(String, Kind)]) -> std::result::Result<TypePtr, ParquetError> {
    let fields = columns
        .iter()
        .map(|(name, kind)| field(name, *kind).map(Arc::new))
        .collect::<std::result::Result<Vec<_>, _>>()?;
    Type::group_type_builder("loci")
        .with_fields(fields)
        .build()
        .map(Arc::new)
}

fn field(name: &str, kind: Kind) -> std::result::Result<Type, ParquetError> {
    let primitive = |physical| {
        Type::primitive_type_builder(name, physical).with_repetition(Repetition::OPTIONAL)
    };
    match kind {
        Kind::Text => primitive(Physical::BYTE_ARRAY)
            .with_logical_type(Some(LogicalType::String))
            .with_converted_type(ConvertedType::UTF8)
            .build(),
        Kind::Whole => primitive(Physical::INT64).build(),
        Kind::Number => primitive(Physical::DOUBLE).build(),
        // The three levels that the Parquet standard asks of a list.
        Kind::Counts => {
            let element = Type::primitive_type_builder("element", Physical::INT32)
                .with_repetition(Repetition::REQUIRED)
                .build()?;
            let list = Type::group_type_builder("list")
                .with_repetition(Repetition::REPEATED)
                .with_fields(vec![Arc::new(element)])
                .build()?;
            Type::group_type_builder(name)
                .with_repetition(Repetition::REQUIRED)
                .with_logical_type(Some(LogicalType::List))
                .with_converted_type(ConvertedType::LIST)
                .with_fields(vec![Arc::new(list)])
                .build()
        }
    }
}
