//! Plain tables from delimited text or Parquet: whole columns as numbers, texts or times.

use super::error::{BadCell, TableError};
use crate::io::delimited::{self, Cell, FileKind, TextOptions, key_of, parse_number, plain_name};
use crate::io::parquet::{ColumnKind, ParquetFile, Values};
use crate::io::time_text::{TimeProblem, TimeReader, TimeRemarks, TimeRules};
use std::path::{Path, PathBuf};

/// How to read a column.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(crate) enum Plain {
    /// Numbers; missing ones are NaN.
    Number,
    /// Texts; empty ones are missing.
    Text,
    /// Times; every row must have one.
    Time,
}

/// A column that was read.
#[derive(Debug, Clone, PartialEq)]
pub(crate) enum PlainValues {
    /// One number a row.
    Number(Vec<f64>),
    /// Distinct texts and one code a row; `u32::MAX` is missing.
    Text(Vec<String>, Vec<u32>),
    /// One instant a row, ms since 1970.
    Time(Vec<i64>),
}

/// A table whose columns are known and not read yet.
pub(crate) struct PlainTable {
    path: PathBuf,
    text: TextOptions,
    section: &'static str,
    names: Vec<String>,
    units: Vec<String>,
    preamble: Vec<String>,
    parquet: Option<ParquetFile>,
    notes: Vec<String>,
}

/// What may stand in a number column besides numbers.
#[derive(Debug, Clone, Default)]
pub(crate) struct MissingTexts {
    /// Texts, compared as they are.
    pub(crate) texts: Vec<String>,
    /// Numbers.
    pub(crate) numbers: Vec<f64>,
}

impl PlainTable {
    /// Reads the header or the footer.
    pub(crate) fn open(path: &Path, text: &TextOptions, section: &'static str) -> Result<Self, TableError> {
        let mut table = Self {
            path: path.to_owned(),
            text: text.clone(),
            section,
            names: Vec::new(),
            units: Vec::new(),
            preamble: Vec::new(),
            parquet: None,
            notes: Vec::new(),
        };
        if delimited::sniff(&delimited::first_bytes(path)?) == FileKind::Parquet {
            let file = ParquetFile::open(path)?;
            table.names = file.columns().iter().map(|column| column.name.trim().to_owned()).collect();
            table.parquet = Some(file);
        } else {
            let opened = delimited::open(path, text, section)?;
            table.names = opened.names;
            table.units = opened.units;
            table.preamble = opened.preamble;
            table.notes = opened.notes;
        }
        Ok(table)
    }

    /// "line" or "row", as rows of this file are called in messages.
    pub(crate) fn row_word(&self) -> &'static str {
        if self.parquet.is_some() { "row" } else { "line" }
    }

    /// Column names.
    pub(crate) fn names(&self) -> &[String] {
        &self.names
    }

    /// Units row; empty where there is none.
    pub(crate) fn units(&self) -> &[String] {
        &self.units
    }

    /// Comment lines above the header.
    pub(crate) fn preamble(&self) -> &[String] {
        &self.preamble
    }

    /// Remarks on the text.
    pub(crate) fn notes(&self) -> &[String] {
        &self.notes
    }

    /// Column names for a message.
    pub(crate) fn listed(&self) -> String {
        let shown: Vec<String> = self.names.iter().take(16).map(|name| format!("`{name}`")).collect();
        shown.join(", ")
    }

    /// The column of a role: the named one, else the first of the known names (in their order) that is there.
    pub(crate) fn find(
        &self,
        named: Option<&str>,
        known: &[&str],
        role: &'static str,
        key: &str,
    ) -> Result<Option<usize>, TableError> {
        let all = |wanted: &str| -> Vec<usize> {
            let wanted = wanted.trim();
            self.names
                .iter()
                .enumerate()
                .filter(|(_, name)| name.trim().eq_ignore_ascii_case(wanted))
                .map(|(i, _)| i)
                .collect()
        };
        let candidates: Vec<&str> = named.map_or_else(|| known.to_vec(), |name| vec![name]);
        for candidate in &candidates {
            match all(candidate).as_slice() {
                [] => {}
                [one] => return Ok(Some(*one)),
                [first, second, ..] => {
                    let (first, second) = (self.names[*first].clone(), self.names[*second].clone());
                    return Err(TableError::Ambiguous {
                        path: self.path.clone(),
                        first,
                        second,
                        role,
                        key: key.to_owned(),
                    });
                }
            }
        }
        if named.is_some() { Err(self.no_column(role, &candidates, key)) } else { Ok(None) }
    }

    /// As `find`, but names are compared as plain words: lower case, one underscore for any other characters.
    pub(crate) fn find_plain(
        &self,
        named: Option<&str>,
        known: &[&str],
        role: &'static str,
        key: &str,
    ) -> Result<Option<usize>, TableError> {
        if named.is_some() {
            return self.find(named, known, role, key);
        }
        let mut found = known.iter().flat_map(|candidate| {
            self.names
                .iter()
                .enumerate()
                .filter(move |(_, name)| plain_name(name) == *candidate)
                .map(|(index, _)| index)
        });
        let Some(first) = found.next() else { return Ok(None) };
        match found.next() {
            None => Ok(Some(first)),
            Some(second) => {
                let (first, second) = (self.names[first].clone(), self.names[second].clone());
                Err(TableError::Ambiguous { path: self.path.clone(), first, second, role, key: key.to_owned() })
            }
        }
    }

    /// The error of a role that no column fills.
    pub(crate) fn no_column(&self, role: &'static str, known: &[&str], key: &str) -> TableError {
        TableError::NoColumn {
            path: self.path.clone(),
            role,
            names: known.iter().map(|name| format!("`{name}`")).collect::<Vec<_>>().join(", "),
            found: self.listed(),
            key: key.to_owned(),
        }
    }

    /// Reads these columns whole; also the line or row number of every row.
    pub(crate) fn read(
        &self,
        wanted: &[(usize, Plain)],
        rules: TimeRules,
        missing: &MissingTexts,
    ) -> Result<(Vec<PlainValues>, Vec<u64>, TimeRemarks), TableError> {
        match &self.parquet {
            Some(file) => self.read_parquet(file, wanted, rules, missing),
            None => self.read_text(wanted, rules, missing),
        }
    }

    fn cell(&self, place: String, column: usize, found: String, what: &'static str, expected: &str) -> TableError {
        let column = self.names.get(column).cloned().unwrap_or_default();
        let (path, expected) = (self.path.clone(), expected.to_owned());
        Box::new(BadCell { path, place, column, found, what, expected, key: None }).into()
    }

    fn time_error(&self, place: String, column: usize, found: String, problem: TimeProblem) -> TableError {
        let (expected, key) = problem.expected();
        let column = self.names.get(column).cloned().unwrap_or_default();
        let key = key.map(|key| key_of(self.section, key));
        let (path, expected) = (self.path.clone(), expected.to_owned());
        Box::new(BadCell { path, place, column, found, what: "time", expected, key }).into()
    }

    fn read_text(
        &self,
        wanted: &[(usize, Plain)],
        rules: TimeRules,
        missing: &MissingTexts,
    ) -> Result<(Vec<PlainValues>, Vec<u64>, TimeRemarks), TableError> {
        let mut opened = delimited::open(&self.path, &self.text, self.section)?;
        let mut times = TimeReader::new(rules);
        let mut values: Vec<PlainValues> = wanted.iter().map(|(_, plain)| empty(*plain)).collect();
        let mut known: Vec<std::collections::HashMap<String, u32>> =
            vec![std::collections::HashMap::new(); wanted.len()];
        let mut lines = Vec::new();
        while let Some(row) = opened.rows.next()? {
            if row.len() != self.names.len() {
                row.check_width(&self.path, self.names.len(), opened.header_line)?;
            }
            let place = || format!("line {}", row.line);
            for (at, (column, _)) in wanted.iter().enumerate() {
                let cell = row.cell(*column);
                match &mut values[at] {
                    PlainValues::Number(numbers) => numbers.push(match parse_number(cell, opened.decimal) {
                        Cell::Number(number) => missing.number(number),
                        Cell::Empty | Cell::NotANumber | Cell::NoValue => f64::NAN,
                        Cell::Text if missing.texts.iter().any(|text| text.as_bytes() == cell) => f64::NAN,
                        Cell::Text => {
                            return Err(self.cell(
                                place(),
                                *column,
                                row.shown(*column),
                                "number",
                                "a number or an empty cell",
                            ));
                        }
                    }),
                    PlainValues::Text(texts, codes) => {
                        let text = std::str::from_utf8(cell).map_err(|_| delimited::DelimitedError::Encoding {
                            path: self.path.clone(),
                            line: row.line,
                            column: self.names[*column].clone(),
                            key: key_of(self.section, "encoding"),
                        })?;
                        codes.push(intern(text, texts, &mut known[at]));
                    }
                    PlainValues::Time(ms) => match times.read(cell) {
                        Ok(instant) => ms.push(instant.0),
                        Err(problem) => return Err(self.time_error(place(), *column, row.shown(*column), problem)),
                    },
                }
            }
            lines.push(row.line);
        }
        Ok((values, lines, times.remarks()))
    }

    fn read_parquet(
        &self,
        file: &ParquetFile,
        wanted: &[(usize, Plain)],
        rules: TimeRules,
        missing: &MissingTexts,
    ) -> Result<(Vec<PlainValues>, Vec<u64>, TimeRemarks), TableError> {
        let mut times = TimeReader::new(rules);
        let mut values: Vec<PlainValues> = wanted.iter().map(|(_, plain)| empty(*plain)).collect();
        let mut known: Vec<std::collections::HashMap<String, u32>> =
            vec![std::collections::HashMap::new(); wanted.len()];
        let mut columns: Vec<usize> = wanted.iter().map(|(column, _)| *column).collect();
        columns.sort_unstable();
        columns.dedup();
        for run in 0..file.runs() {
            let first = file.first_row(run);
            let read = file.read(run, &columns)?;
            for (at, (column, _)) in wanted.iter().enumerate() {
                let raw = &read[columns.binary_search(column).expect("every wanted column is read")];
                let place = |row: usize| format!("row {}", first + row as u64 + 1);
                match (&mut values[at], raw) {
                    (PlainValues::Number(numbers), Values::Number(raw, _)) => {
                        numbers.extend(raw.iter().map(|number| missing.number(*number)));
                    }
                    (PlainValues::Text(texts, codes), Values::Text(raw, raw_codes)) => {
                        codes.extend(raw_codes.iter().map(|code| {
                            raw.get(*code as usize).map_or(u32::MAX, |text| intern(text.trim(), texts, &mut known[at]))
                        }));
                    }
                    (PlainValues::Text(texts, codes), Values::Number(raw, _)) => {
                        codes.extend(raw.iter().map(|number| {
                            if number.is_nan() { u32::MAX } else { intern(&number.to_string(), texts, &mut known[at]) }
                        }));
                    }
                    (PlainValues::Time(ms), Values::TimeMs(raw)) => {
                        let zoned = matches!(file.columns()[*column].kind, ColumnKind::Time { zone: Some(_) });
                        for (row, &tick) in raw.iter().enumerate() {
                            if tick == i64::MIN {
                                return Err(self.time_error(
                                    place(row),
                                    *column,
                                    "null".to_owned(),
                                    TimeProblem::Empty,
                                ));
                            }
                            ms.push(if zoned { tick } else { times.from_naive_ms(tick).0 });
                        }
                        if !zoned {
                            times.note_naive();
                        }
                    }
                    (PlainValues::Time(ms), Values::Number(raw, _)) => {
                        for (row, &number) in raw.iter().enumerate() {
                            let instant = rules
                                .unit
                                .ok_or(TimeProblem::Unit)
                                .and_then(|unit| unit.instant(number).ok_or(TimeProblem::Impossible));
                            ms.push(
                                instant
                                    .map_err(|problem| {
                                        self.time_error(place(row), *column, number.to_string(), problem)
                                    })?
                                    .0,
                            );
                        }
                    }
                    (PlainValues::Time(ms), Values::Text(raw, codes)) => {
                        for (row, code) in codes.iter().enumerate() {
                            let text = raw.get(*code as usize).map_or("", String::as_str);
                            let instant = times.read(text.trim().as_bytes());
                            ms.push(
                                instant
                                    .map_err(|problem| self.time_error(place(row), *column, text.to_owned(), problem))?
                                    .0,
                            );
                        }
                    }
                    (PlainValues::Number(_), _) => {
                        let found = format!("{:?}", file.columns()[*column].kind).to_lowercase();
                        return Err(self.cell(place(0), *column, found, "number", "a column of numbers"));
                    }
                    (PlainValues::Text(..), Values::TimeMs(_)) => {
                        return Err(self.cell(place(0), *column, "time".to_owned(), "text", "a column of texts"));
                    }
                }
            }
        }
        let rows = (1..=file.rows()).collect();
        Ok((values, rows, times.remarks()))
    }
}

impl MissingTexts {
    fn number(&self, number: f64) -> f64 {
        if self.numbers.contains(&number) { f64::NAN } else { number }
    }
}

fn empty(plain: Plain) -> PlainValues {
    match plain {
        Plain::Number => PlainValues::Number(Vec::new()),
        Plain::Text => PlainValues::Text(Vec::new(), Vec::new()),
        Plain::Time => PlainValues::Time(Vec::new()),
    }
}

fn intern(text: &str, texts: &mut Vec<String>, known: &mut std::collections::HashMap<String, u32>) -> u32 {
    if text.is_empty() {
        return u32::MAX;
    }
    if let Some(code) = known.get(text) {
        return *code;
    }
    let code = texts.len() as u32;
    texts.push(text.to_owned());
    known.insert(text.to_owned(), code);
    code
}
