//! Tables as CSV (RFC 4180 quoting, line feeds, UTF-8).

use super::number_text::{TimeText, push_number};
use crate::io::replace_file::{ReplaceFile, WriteError};
use crate::model::{ColumnData, Table};
use std::io::{BufWriter, Write};

/// Writes rows as text.
#[derive(Debug)]
pub(super) struct CsvWriter {
    file: BufWriter<ReplaceFile>,
    begun: bool,
}

/// A text with quotes where it needs them.
fn quoted(text: &str) -> Vec<u8> {
    let needed = text.bytes().any(|byte| matches!(byte, b',' | b'"' | b'\n' | b'\r'))
        || text.trim() != text
        || text.starts_with('#');
    if needed { format!("\"{}\"", text.replace('"', "\"\"")).into_bytes() } else { text.as_bytes().to_vec() }
}

/// The values of a column ready to be written row by row.
enum Ready<'a> {
    Text(Vec<Vec<u8>>, &'a [u32]),
    Number(&'a [f64], Option<usize>),
    Integer(&'a [i64]),
    Time(&'a [i64], TimeText),
    Truth(&'a [bool]),
}

impl CsvWriter {
    pub(super) fn new(file: ReplaceFile) -> Self {
        Self { file: BufWriter::with_capacity(1 << 18, file), begun: false }
    }

    fn failed(&self, source: std::io::Error) -> WriteError {
        WriteError::Write { path: self.file.get_ref().path().to_owned(), source }
    }

    pub(super) fn append(&mut self, table: &Table) -> Result<(), WriteError> {
        let mut row = Vec::with_capacity(512);
        if !self.begun {
            self.begun = true;
            let names: Vec<Vec<u8>> = table.columns.iter().map(|column| quoted(column.name)).collect();
            row.extend_from_slice(&names.join(&b','));
            row.push(b'\n');
            self.file.write_all(&row).map_err(|source| self.failed(source))?;
        }
        let mut columns: Vec<Ready<'_>> = table
            .columns
            .iter()
            .map(|column| match &column.data {
                ColumnData::Text { texts, codes } => {
                    Ready::Text(texts.iter().map(|text| quoted(text)).collect(), codes)
                }
                ColumnData::Number(values) => Ready::Number(values, column.decimals),
                ColumnData::Integer(values) => Ready::Integer(values),
                ColumnData::Time(values) => Ready::Time(values, TimeText::default()),
                ColumnData::Truth(values) => Ready::Truth(values),
            })
            .collect();
        for index in 0..table.rows() {
            row.clear();
            for (at, column) in columns.iter_mut().enumerate() {
                if at > 0 {
                    row.push(b',');
                }
                match column {
                    Ready::Text(texts, codes) => {
                        if let Some(text) = texts.get(codes[index] as usize) {
                            row.extend_from_slice(text);
                        }
                    }
                    Ready::Number(values, decimals) => push_number(&mut row, values[index], *decimals),
                    Ready::Integer(values) => {
                        write!(row, "{}", values[index]).expect("writing to memory does not fail");
                    }
                    Ready::Time(values, text) => text.push(&mut row, values[index]),
                    Ready::Truth(values) => row.extend_from_slice(if values[index] { b"true" } else { b"false" }),
                }
            }
            row.push(b'\n');
            self.file.write_all(&row).map_err(|source| self.failed(source))?;
        }
        Ok(())
    }

    pub(super) fn finish(self) -> Result<(), WriteError> {
        let path = self.file.get_ref().path().to_owned();
        let file = self.file.into_inner().map_err(|error| WriteError::Write { path, source: error.into_error() })?;
        file.finish()
    }
}
