//! Parquet files as plain columns, one run of rows at a time.

use super::error::ParquetError;
use super::pages::check_chunk;
use crate::io::contain::contain;
use polars::prelude::{
    ArrowDataType, ArrowTimeUnit, DataFrame, DataType, ParallelStrategy, ParquetReader, SerReader, TimeUnit,
};
use std::collections::HashMap;
use std::fs::File;
use std::io::{Read, Seek, SeekFrom};
use std::path::{Path, PathBuf};

/// A panic of the library on a damaged file.
#[derive(Debug, thiserror::Error)]
#[error("the Parquet library gave up: {0}")]
struct GaveUp(String);

/// Runs the library so that a panic on damaged bytes is an error.
fn caught<T>(path: &Path, act: impl FnOnce() -> Result<T, polars::error::PolarsError>) -> Result<T, ParquetError> {
    let source: Box<dyn std::error::Error + Send + Sync> = match contain(act) {
        Ok(Ok(value)) => return Ok(value),
        Ok(Err(error)) => Box::new(error),
        Err(words) => Box::new(GaveUp(words)),
    };
    Err(ParquetError::Damaged { path: path.to_owned(), source })
}

/// What a column holds.
#[derive(Debug, Clone, PartialEq, Eq)]
pub(crate) enum ColumnKind {
    /// Integers or floating numbers.
    Number,
    /// Text, also as a dictionary.
    Text,
    /// Instants; with a zone (then they are UTC) or local without one.
    Time {
        /// Name of the zone, where there is one.
        zone: Option<String>,
    },
    /// Calendar dates.
    Date,
    /// Yes or no.
    Truth,
    /// Anything else; its name.
    Other(String),
}

/// A column's name and kind.
#[derive(Debug, Clone, PartialEq, Eq)]
pub(crate) struct ColumnInfo {
    /// Name.
    pub(crate) name: String,
    /// Kind.
    pub(crate) kind: ColumnKind,
}

/// Values of a column for a run of rows.
#[derive(Debug, Clone, PartialEq)]
pub(crate) enum Values {
    /// Numbers with a mark for nulls (empty: none is null); null numbers are NaN.
    Number(Vec<f64>, Vec<bool>),
    /// Distinct texts and one code a row; `u32::MAX` is null.
    Text(Vec<String>, Vec<u32>),
    /// Milliseconds since 1970; `i64::MIN` is null.
    TimeMs(Vec<i64>),
}

impl Values {
    fn len(&self) -> usize {
        match self {
            Self::Number(values, _) => values.len(),
            Self::Text(_, codes) => codes.len(),
            Self::TimeMs(values) => values.len(),
        }
    }
}

/// An open Parquet file: its columns and the runs of rows to read.
pub(crate) struct ParquetFile {
    path: PathBuf,
    columns: Vec<ColumnInfo>,
    rows: u64,
    runs: Vec<(usize, usize)>,
}

/// Row groups larger than this are read in parts.
const RUN_ROWS: usize = 1 << 20;

/// The length of the file's frame: "PAR1", footer length, "PAR1".
const FRAME: u64 = 12;

impl ParquetFile {
    /// Reads the footer.
    pub(crate) fn open(path: &Path) -> Result<Self, ParquetError> {
        check_frame(path)?;
        let file = File::open(path).map_err(|source| ParquetError::Read { path: path.to_owned(), source })?;
        let (metadata, schema) = caught(path, || {
            let mut reader = ParquetReader::new(file);
            let metadata = reader.get_metadata()?.clone();
            Ok((metadata, reader.schema()?))
        })?;
        let mut pages = File::open(path).map_err(|source| ParquetError::Read { path: path.to_owned(), source })?;
        for group in &metadata.row_groups {
            for chunk in group.parquet_columns() {
                check_chunk(&mut pages, chunk.byte_range(), chunk.num_values()).map_err(|found| {
                    ParquetError::Page {
                        path: path.to_owned(),
                        column: chunk.descriptor().path_in_schema.join("."),
                        found,
                    }
                })?;
            }
        }
        let columns = schema
            .iter_values()
            .map(|field| ColumnInfo { name: field.name.to_string(), kind: kind_of(&field.dtype) })
            .collect();
        let mut runs = Vec::new();
        let mut at = 0;
        for group in &metadata.row_groups {
            let rows = group.num_rows();
            let parts = rows.div_ceil(RUN_ROWS);
            for part in 0..parts {
                let (from, to) = (rows * part / parts, rows * (part + 1) / parts);
                runs.push((at + from, to - from));
            }
            at += rows;
        }
        if at == 0 {
            return Err(ParquetError::NoRows { path: path.to_owned() });
        }
        Ok(Self { path: path.to_owned(), columns, rows: at as u64, runs })
    }

    /// The columns.
    pub(crate) fn columns(&self) -> &[ColumnInfo] {
        &self.columns
    }

    /// Number of rows.
    pub(crate) fn rows(&self) -> u64 {
        self.rows
    }

    /// Number of runs of rows.
    pub(crate) fn runs(&self) -> usize {
        self.runs.len()
    }

    /// First row of a run, from 0.
    pub(crate) fn first_row(&self, run: usize) -> u64 {
        self.runs.get(run).map_or(0, |(at, _)| *at as u64)
    }

    /// Reads these columns (indices into `columns`, none twice) for a run of rows.
    pub(crate) fn read(&self, run: usize, wanted: &[usize]) -> Result<Vec<Values>, ParquetError> {
        let slice = self.runs.get(run).copied().unwrap_or((0, 0));
        self.read_slice(slice, wanted)
    }

    /// Reads these columns for the first rows.
    pub(crate) fn head(&self, rows: usize, wanted: &[usize]) -> Result<Vec<Values>, ParquetError> {
        self.read_slice((0, rows), wanted)
    }

    fn read_slice(&self, slice: (usize, usize), wanted: &[usize]) -> Result<Vec<Values>, ParquetError> {
        for &index in wanted {
            if let Some(ColumnInfo { name, kind: ColumnKind::Other(found) }) = self.columns.get(index) {
                return Err(ParquetError::Type {
                    path: self.path.clone(),
                    column: name.clone(),
                    found: found.clone(),
                    expected: "numbers, text, times or dates",
                });
            }
        }
        let file = File::open(&self.path).map_err(|source| ParquetError::Read { path: self.path.clone(), source })?;
        caught(&self.path, || {
            let frame = ParquetReader::new(file)
                .with_projection(Some(wanted.to_vec()))
                .with_slice(Some(slice))
                .read_parallel(ParallelStrategy::None)
                .finish()?;
            let columns = wanted.iter().filter_map(|index| self.columns.get(*index));
            let values: Vec<Values> = columns.map(|info| plain(&frame, info)).collect::<Result<_, _>>()?;
            // Damaged pages can give a column fewer rows than the footer promises, without an error.
            let rows = slice.1.min((self.rows as usize).saturating_sub(slice.0));
            if let Some(column) = values.iter().find(|column| column.len() != rows) {
                let text = format!("a column has {} rows where the footer promises {rows}", column.len());
                return Err(polars::error::PolarsError::ComputeError(text.into()));
            }
            Ok(values)
        })
    }
}

/// Checks both magic words and the footer's length against the size, before the library believes them.
fn check_frame(path: &Path) -> Result<(), ParquetError> {
    let read = |source| ParquetError::Read { path: path.to_owned(), source };
    let truncated = |found: String| ParquetError::Truncated { path: path.to_owned(), found };
    let mut file = File::open(path).map_err(read)?;
    let size = file.metadata().map_err(read)?.len();
    if size < FRAME {
        return Err(truncated(format!("{size} bytes in all")));
    }
    let mut tail = [0_u8; 8];
    file.seek(SeekFrom::End(-8)).map_err(read)?;
    file.read_exact(&mut tail).map_err(read)?;
    let [a, b, c, d, magic @ ..] = tail;
    if &magic != b"PAR1" {
        return Err(truncated("it does not end with PAR1".to_owned()));
    }
    let footer = u64::from(u32::from_le_bytes([a, b, c, d]));
    if footer + FRAME > size {
        return Err(truncated(format!("a footer of {footer} bytes in a file of {size} bytes")));
    }
    Ok(())
}

fn kind_of(dtype: &ArrowDataType) -> ColumnKind {
    use ArrowDataType as A;
    match dtype {
        A::Int8
        | A::Int16
        | A::Int32
        | A::Int64
        | A::UInt8
        | A::UInt16
        | A::UInt32
        | A::UInt64
        | A::Float32
        | A::Float64 => ColumnKind::Number,
        A::Utf8 | A::LargeUtf8 | A::Utf8View => ColumnKind::Text,
        A::Dictionary(_, values, _) => match kind_of(values) {
            ColumnKind::Text => ColumnKind::Text,
            other => ColumnKind::Other(format!("dictionary of {other:?}").to_lowercase()),
        },
        A::Timestamp(
            ArrowTimeUnit::Second | ArrowTimeUnit::Millisecond | ArrowTimeUnit::Microsecond | ArrowTimeUnit::Nanosecond,
            zone,
        ) => ColumnKind::Time { zone: zone.as_ref().map(ToString::to_string) },
        A::Date32 | A::Date64 => ColumnKind::Date,
        A::Boolean => ColumnKind::Truth,
        A::List(_) | A::LargeList(_) | A::FixedSizeList(..) => ColumnKind::Other("list".to_owned()),
        A::Struct(_) => ColumnKind::Other("nested structure".to_owned()),
        A::Binary | A::LargeBinary | A::BinaryView | A::FixedSizeBinary(_) => {
            ColumnKind::Other("bytes without a text type".to_owned())
        }
        A::Time32(_) | A::Time64(_) => ColumnKind::Other("time of day without a date".to_owned()),
        A::Duration(_) => ColumnKind::Other("duration".to_owned()),
        A::Decimal(..) | A::Decimal256(..) | A::Decimal32(..) | A::Decimal64(..) => {
            ColumnKind::Other("decimal number".to_owned())
        }
        other => ColumnKind::Other(format!("{other:?}").to_lowercase()),
    }
}

fn plain(frame: &DataFrame, info: &ColumnInfo) -> Result<Values, polars::error::PolarsError> {
    let series = frame.column(&info.name)?.as_materialized_series();
    match &info.kind {
        ColumnKind::Number => {
            let numbers = series.cast(&DataType::Float64)?;
            let numbers = numbers.f64()?;
            let nulls = if numbers.null_count() == 0 {
                Vec::new()
            } else {
                numbers.iter().map(|value| value.is_none()).collect()
            };
            Ok(Values::Number(numbers.iter().map(|value| value.unwrap_or(f64::NAN)).collect(), nulls))
        }
        ColumnKind::Time { .. } => {
            let DataType::Datetime(unit, _) = series.dtype() else {
                return Err(polars::error::PolarsError::SchemaMismatch(
                    "a timestamp column came as another type".into(),
                ));
            };
            let per_ms = match unit {
                TimeUnit::Milliseconds => 1,
                TimeUnit::Microseconds => 1_000,
                TimeUnit::Nanoseconds => 1_000_000,
            };
            let ticks = series.to_physical_repr().into_owned();
            let ticks = ticks.i64()?;
            Ok(Values::TimeMs(ticks.iter().map(|tick| tick.map_or(i64::MIN, |tick| nearest(tick, per_ms))).collect()))
        }
        ColumnKind::Date => {
            let days = series.to_physical_repr().into_owned();
            let days = days.cast(&DataType::Int64)?;
            let days = days.i64()?;
            Ok(Values::TimeMs(days.iter().map(|day| day.map_or(i64::MIN, |day| day * 86_400_000)).collect()))
        }
        ColumnKind::Text | ColumnKind::Truth | ColumnKind::Other(_) => {
            let texts = series.cast(&DataType::String)?;
            let texts = texts.str()?;
            let mut distinct: Vec<String> = Vec::new();
            let mut known: HashMap<&str, u32> = HashMap::new();
            let mut codes = Vec::with_capacity(texts.len());
            let mut last: Option<(&str, u32)> = None;
            for text in texts.iter() {
                let code = match (text, last) {
                    (None, _) => u32::MAX,
                    (Some(text), Some((before, code))) if text == before => code,
                    (Some(text), _) => {
                        let code = *known.entry(text).or_insert_with(|| {
                            distinct.push(text.to_owned());
                            distinct.len() as u32 - 1
                        });
                        last = Some((text, code));
                        code
                    }
                };
                codes.push(code);
            }
            Ok(Values::Text(distinct, codes))
        }
    }
}

/// Ticks to milliseconds, to the nearest.
fn nearest(tick: i64, per_ms: i64) -> i64 {
    if per_ms == 1 { tick } else { (tick + per_ms / 2).div_euclid(per_ms) }
}
