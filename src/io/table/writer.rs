//! The writer of tables, and of their column dictionary.

use super::error::TableError;
use super::to_csv::CsvWriter;
use super::to_parquet::PartWriter;
use crate::io::replace_file::{ReplaceFile, WriteError, replace_with};
use crate::model::{ColumnData, Table};
use std::path::{Path, PathBuf};

/// Writes a table part by part; each part is a row group in Parquet. The file appears under its name only when finished.
#[derive(Debug)]
pub struct TableWriter {
    path: PathBuf,
    columns: Vec<(&'static str, &'static str)>,
    target: Target,
    rows: u64,
}

#[derive(Debug)]
enum Target {
    /// Parquet before its first part: the columns are not known yet.
    Waiting(ReplaceFile),
    Parquet(Box<PartWriter>),
    Csv(CsvWriter),
    /// An earlier part failed.
    Broken,
}

fn kind(data: &ColumnData) -> &'static str {
    match data {
        ColumnData::Text { .. } => "text",
        ColumnData::Number(_) => "number",
        ColumnData::Integer(_) => "integer",
        ColumnData::Time(_) => "time",
        ColumnData::Truth(_) => "truth",
    }
}

fn named(columns: &[(&'static str, &'static str)]) -> String {
    columns.iter().map(|(name, kind)| format!("{name} ({kind})")).collect::<Vec<_>>().join(", ")
}

impl TableWriter {
    /// Begins a table; the name's ending says the format: .csv or .parquet.
    ///
    /// # Errors
    /// When the ending is another one, or when the folder cannot be written to.
    pub fn create(path: &Path) -> Result<Self, TableError> {
        let extension = path.extension().map(|extension| extension.to_string_lossy().to_lowercase());
        let target = match extension.as_deref() {
            Some("csv") => Target::Csv(CsvWriter::new(ReplaceFile::create(path)?)),
            Some("parquet") => Target::Waiting(ReplaceFile::create(path)?),
            other => {
                let found = other.map_or_else(|| "nothing".to_owned(), |extension| format!(".{extension}"));
                return Err(TableError::Extension { path: path.to_owned(), found });
            }
        };
        Ok(Self { path: path.to_owned(), columns: Vec::new(), target, rows: 0 })
    }

    /// Adds a part with the same columns as the first; a part without rows only says the columns.
    ///
    /// # Errors
    /// When the columns differ, or when the bytes cannot be written.
    pub fn append(&mut self, table: &Table) -> Result<(), TableError> {
        if table.columns.is_empty() {
            return Err(TableError::NoColumns { path: self.path.clone() });
        }
        let columns: Vec<_> = table.columns.iter().map(|column| (column.name, kind(&column.data))).collect();
        if self.columns.is_empty() {
            self.columns = columns;
        } else if self.columns != columns {
            let (found, expected) = (named(&columns), named(&self.columns));
            return Err(TableError::Columns { path: self.path.clone(), found, expected });
        }
        self.target = match std::mem::replace(&mut self.target, Target::Broken) {
            Target::Waiting(file) => {
                let mut parts = Box::new(PartWriter::new(file, table)?);
                parts.append(table)?;
                Target::Parquet(parts)
            }
            Target::Parquet(mut parts) => {
                parts.append(table)?;
                Target::Parquet(parts)
            }
            Target::Csv(mut rows) => {
                rows.append(table)?;
                Target::Csv(rows)
            }
            Target::Broken => return Err(self.broken()),
        };
        self.rows += table.rows() as u64;
        Ok(())
    }

    fn broken(&self) -> TableError {
        let source = std::io::Error::other("an earlier part of the table failed");
        TableError::Write(WriteError::Write { path: self.path.clone(), source })
    }

    /// Finishes the file and gives it its name; returns the number of rows.
    ///
    /// # Errors
    /// When no part was appended, or when the bytes cannot be written.
    pub fn finish(self) -> Result<u64, TableError> {
        if self.columns.is_empty() {
            return Err(TableError::NoColumns { path: self.path });
        }
        match self.target {
            Target::Parquet(parts) => parts.finish()?,
            Target::Csv(rows) => rows.finish()?,
            Target::Waiting(_) | Target::Broken => return Err(self.broken()),
        }
        Ok(self.rows)
    }
}

/// Writes the dictionary of a table's columns as CSV: name, unit, meaning.
///
/// # Errors
/// When the file cannot be written.
pub fn write_dictionary(path: &Path, table: &Table) -> Result<(), TableError> {
    let mut rows = csv::Writer::from_writer(Vec::new());
    let failed = |error: csv::Error| {
        TableError::Write(WriteError::Write { path: path.to_owned(), source: std::io::Error::other(error) })
    };
    rows.write_record(["name", "unit", "meaning"]).map_err(failed)?;
    for column in &table.columns {
        rows.write_record([column.name, column.unit, column.meaning]).map_err(failed)?;
    }
    let bytes = rows.into_inner().map_err(|error| failed(error.into_error().into()))?;
    Ok(replace_with(path, &bytes)?)
}
