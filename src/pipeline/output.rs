//! Tables in all the formats that are asked for, each with its column dictionary.

use crate::Error;
use crate::config::TableFormat;
use crate::io::table::{TableWriter, write_dictionary};
use crate::model::Table;
use std::path::{Path, PathBuf};

/// One table in each format, written part by part.
pub(super) struct Output {
    writers: Vec<(PathBuf, TableWriter)>,
    dictionary: PathBuf,
    columns: Option<Table>,
}

impl Output {
    pub(super) fn create(formats: &[TableFormat], folder: &Path, name: &str) -> Result<Self, Error> {
        let mut writers = Vec::new();
        for format in formats {
            let extension = match format {
                TableFormat::Parquet => "parquet",
                TableFormat::Csv => "csv",
            };
            let path = folder.join(format!("{name}.{extension}"));
            let writer = TableWriter::create(&path)?;
            writers.push((path, writer));
        }
        Ok(Self { writers, dictionary: folder.join(format!("{name}_columns.csv")), columns: None })
    }

    pub(super) fn append(&mut self, table: &Table) -> Result<(), Error> {
        for (_, writer) in &mut self.writers {
            writer.append(table)?;
        }
        if self.columns.is_none() {
            self.columns = Some(table.without_rows());
        }
        Ok(())
    }

    pub(super) fn finish(self) -> Result<Vec<PathBuf>, Error> {
        let mut written = Vec::new();
        for (path, writer) in self.writers {
            writer.finish()?;
            written.push(path);
        }
        if let Some(columns) = self.columns {
            write_dictionary(&self.dictionary, &columns)?;
            written.push(self.dictionary);
        }
        Ok(written)
    }
}

/// Writes a table that is at hand as a whole. Returns the files written.
///
/// # Errors
/// When a file cannot be written.
pub(super) fn write_table(
    formats: &[TableFormat],
    folder: &Path,
    name: &str,
    table: &Table,
) -> Result<Vec<PathBuf>, Error> {
    let mut output = Output::create(formats, folder, name)?;
    output.append(table)?;
    output.finish()
}
