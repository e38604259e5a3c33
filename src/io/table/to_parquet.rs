//! Tables as Parquet: one row group for each part, zstd at a fixed level, statistics, no clock.

use super::error::TableError;
use crate::io::replace_file::ReplaceFile;
use crate::model::{ColumnData, Table};
use polars::polars_utils::compression::ZstdLevel;
use polars::prelude::{
    BatchedWriter, BooleanChunked, ChunkFull, ChunkFullNull, Column, DataFrame, DataType, Float64Chunked, Int64Chunked,
    IntoColumn, IntoSeries, NamedFrom, NewChunkedArray, ParquetCompression, ParquetWriter, PlSmallStr, Series,
    StatisticsOptions, StringChunked, TimeUnit, TimeZone,
};
use std::io::{BufWriter, Write};
use std::path::{Path, PathBuf};
use std::sync::{Arc, Mutex};

/// The compression level: small files at little cost; fixed, so that bytes depend on the table alone.
const ZSTD_LEVEL: i32 = 3;

/// The file, reachable again after the library is done with it.
#[derive(Debug, Clone)]
struct SharedFile(Arc<Mutex<Slot>>);

#[derive(Debug)]
struct Slot {
    file: Option<BufWriter<ReplaceFile>>,
    /// Why the system refused to write. The library turns it into an error of its own, which does not tell.
    refused: Option<std::io::ErrorKind>,
}

impl Write for SharedFile {
    fn write(&mut self, bytes: &[u8]) -> std::io::Result<usize> {
        self.with(|file| file.write(bytes))
    }

    fn flush(&mut self) -> std::io::Result<()> {
        self.with(Write::flush)
    }
}

impl SharedFile {
    fn with<T>(&self, act: impl FnOnce(&mut BufWriter<ReplaceFile>) -> std::io::Result<T>) -> std::io::Result<T> {
        let mut slot = self.0.lock().map_err(|_| std::io::Error::other("the writer was abandoned"))?;
        let done = slot.file.as_mut().map_or_else(|| Err(std::io::Error::other("the file is closed")), act);
        if let Err(error) = &done {
            slot.refused = Some(error.kind());
        }
        done
    }

    /// The library's error; where the system refused to write, that.
    fn error(&self, path: &Path, error: polars::error::PolarsError) -> TableError {
        match self.0.lock().ok().and_then(|slot| slot.refused) {
            Some(kind) => {
                let source = std::io::Error::new(kind, error.to_string());
                TableError::Write(crate::io::replace_file::WriteError::Write { path: path.to_owned(), source })
            }
            None => encode(path, error),
        }
    }
}

/// Writes parts as row groups.
pub(super) struct PartWriter {
    path: PathBuf,
    file: SharedFile,
    batched: BatchedWriter<SharedFile>,
}

impl std::fmt::Debug for PartWriter {
    fn fmt(&self, formatter: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        formatter.debug_struct("PartWriter").field("path", &self.path).finish_non_exhaustive()
    }
}

fn encode(path: &Path, error: polars::error::PolarsError) -> TableError {
    match error {
        polars::error::PolarsError::IO { error, .. } => {
            let source = std::io::Error::new(error.kind(), error.to_string());
            TableError::Write(crate::io::replace_file::WriteError::Write { path: path.to_owned(), source })
        }
        other => TableError::Encode { path: path.to_owned(), source: Box::new(other) },
    }
}

impl PartWriter {
    pub(super) fn new(file: ReplaceFile, first: &Table) -> Result<Self, TableError> {
        let path = file.path().to_owned();
        let file = SharedFile(Arc::new(Mutex::new(Slot {
            file: Some(BufWriter::with_capacity(1 << 18, file)),
            refused: None,
        })));
        let frame = frame(first).map_err(|error| encode(&path, error))?;
        let level = ZstdLevel::try_new(ZSTD_LEVEL).map_err(|error| encode(&path, error))?;
        let batched = ParquetWriter::new(file.clone())
            .with_compression(ParquetCompression::Zstd(Some(level)))
            .with_statistics(StatisticsOptions::full())
            .batched(frame.schema())
            .map_err(|error| file.error(&path, error))?;
        Ok(Self { path, file, batched })
    }

    pub(super) fn append(&mut self, table: &Table) -> Result<(), TableError> {
        let frame = frame(table).map_err(|error| encode(&self.path, error))?;
        self.batched.write_batch(&frame).map_err(|error| self.file.error(&self.path, error))
    }

    pub(super) fn finish(self) -> Result<(), TableError> {
        let Self { path, file, batched } = self;
        batched.finish().map_err(|error| file.error(&path, error))?;
        drop(batched);
        let slot = file.0.lock().ok().and_then(|mut slot| slot.file.take());
        let buffered = slot.expect("the file is there until it is finished");
        let failed = |source| crate::io::replace_file::WriteError::Write { path: path.clone(), source };
        let whole = buffered.into_inner().map_err(|error| failed(error.into_error()))?;
        Ok(whole.finish()?)
    }
}

fn frame(table: &Table) -> Result<DataFrame, polars::error::PolarsError> {
    let columns =
        table.columns.iter().map(|column| series(column.name, &column.data)).collect::<Result<Vec<Column>, _>>()?;
    DataFrame::new(table.rows(), columns)
}

fn series(name: &str, data: &ColumnData) -> Result<Column, polars::error::PolarsError> {
    let name = PlSmallStr::from_str(name);
    let series: Series = match data {
        ColumnData::Text { texts, codes } => {
            // Most text columns say one thing throughout, or nothing: those need no pass over the rows.
            match codes.first().map(|first| (codes.iter().all(|code| code == first), texts.get(*first as usize))) {
                Some((true, Some(text))) => StringChunked::full(name, text, codes.len()).into_series(),
                Some((true, None)) => StringChunked::full_null(name, codes.len()).into_series(),
                _ => {
                    let values = codes.iter().map(|code| texts.get(*code as usize).map(String::as_str));
                    StringChunked::from_iter_options(name, values).into_series()
                }
            }
        }
        ColumnData::Number(values) => {
            if values.iter().any(|value| value.is_nan()) {
                let values = values.iter().map(|value| (!value.is_nan()).then_some(*value));
                Float64Chunked::from_iter_options(name, values).into_series()
            } else {
                Float64Chunked::from_slice(name, values).into_series()
            }
        }
        ColumnData::Integer(values) => Int64Chunked::from_slice(name, values).into_series(),
        ColumnData::Time(values) => {
            let dtype = DataType::Datetime(TimeUnit::Milliseconds, Some(TimeZone::UTC));
            Int64Chunked::from_slice(name, values).into_series().cast(&dtype)?
        }
        ColumnData::Truth(values) => {
            <BooleanChunked as NamedFrom<_, [bool]>>::new(name, values.as_slice()).into_series()
        }
    };
    Ok(series.into_column())
}
