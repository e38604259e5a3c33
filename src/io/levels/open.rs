//! Opening level tables: headers and first rows of every file, settled into plans.

use super::columns::Seen;
use super::error::LevelError;
use super::options::LevelOptions;
use super::plan::{Plan, Stated, time_rules};
use super::registry::{LevelNames, Registry};
use super::{from_parquet, from_text};
use crate::io::delimited::{self, Cell, DecimalMark, FileKind, parse_number};
use crate::io::parquet::{ColumnKind, ParquetFile, Values};
use crate::io::time_text::{TimeRemarks, TimeRules, looks_like_time};
use crate::model::{Band, LevelKind, LevelRow};
use std::path::{Path, PathBuf};

/// The format of a file, found from its bytes and not from its name.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Format {
    Text,
    Parquet,
}

/// One file of a level table.
#[derive(Debug, Clone)]
pub(super) struct LevelFile {
    pub(super) path: PathBuf,
    pub(super) format: Format,
    pub(super) plan: Plan,
    /// Rows, where the file states them.
    pub(super) rows: Option<u64>,
    pub(super) notes: Vec<String>,
}

/// Level tables whose headers are understood; rows are streamed on demand.
#[derive(Debug, Clone)]
pub struct LevelTable {
    pub(super) options: LevelOptions,
    pub(super) files: Vec<LevelFile>,
    pub(super) kind: LevelKind,
    pub(super) registry: Registry,
    pub(super) times: TimeRules,
    pub(super) remarks: TimeRemarks,
    pub(super) blank_rows: u64,
}

/// Opens level tables: reads headers and the first rows, and settles what columns mean.
///
/// # Errors
/// When a file cannot be read or is no table, when columns cannot be understood, and when something that is needed is
/// stated neither in a file nor in the options: then the message names every key to set.
pub fn open_levels(files: &[PathBuf], options: &LevelOptions) -> Result<LevelTable, LevelError> {
    if files.is_empty() {
        return Err(LevelError::NoFiles);
    }
    let times = time_rules(options)?;
    for edges in &options.band_edges {
        Band::from_edges(edges.low_hz, edges.high_hz).map_err(|source| LevelError::Setting {
            key: "levels.band_edges",
            found: source.to_string(),
            expected: "a lower edge above 0 and an upper edge above it, Hz".to_owned(),
        })?;
    }
    let mut registry = Registry::default();
    let mut opened: Vec<LevelFile> = Vec::with_capacity(files.len());
    for path in files {
        let head = delimited::first_bytes(path)?;
        let file = if delimited::sniff(&head) == FileKind::Parquet {
            open_parquet(path, options, &mut registry)?
        } else {
            open_text(path, options, &mut registry)?
        };
        if let Some(first) = opened.first() {
            agree(first, &file)?;
        }
        opened.push(file);
    }
    let kind = opened.first().ok_or(LevelError::NoFiles)?.plan.kind;
    Ok(LevelTable {
        options: options.clone(),
        files: opened,
        kind,
        registry,
        times,
        remarks: TimeRemarks::default(),
        blank_rows: 0,
    })
}

/// All files of a table hold levels of one kind; references and scales may differ, since they are converted.
fn agree(first: &LevelFile, file: &LevelFile) -> Result<(), LevelError> {
    if first.plan.kind == file.plan.kind {
        return Ok(());
    }
    Err(LevelError::Disagree {
        path: file.path.clone(),
        first: first.path.clone(),
        what: "the kind of the levels",
        found: file.plan.kind.unit().to_owned(),
        expected: first.plan.kind.unit().to_owned(),
    })
}

fn open_text(path: &Path, options: &LevelOptions, registry: &mut Registry) -> Result<LevelFile, LevelError> {
    let opened = delimited::open(path, &options.text, "levels")?;
    let columns = 0..opened.names.len();
    let cells = |index: usize| opened.sample.iter().filter_map(move |row| row.get(index)).map(String::as_bytes);
    let times: Vec<usize> =
        columns.clone().filter(|index| cells(*index).next().is_some() && cells(*index).all(looks_like_time)).collect();
    let numbers: Vec<usize> = columns.filter(|index| holds_numbers(cells(*index), opened.decimal)).collect();
    let stated = Stated {
        seen: Seen { path, names: &opened.names, times: &times, header_line: opened.header_line, numbers: &numbers },
        units: &opened.units,
        preamble: &opened.preamble,
        first_bands: Vec::new(),
    };
    let roles = stated.seen.roles(options)?;
    let first_bands = roles
        .band
        .map_or_else(Vec::new, |band| opened.sample.iter().filter_map(|row| row.get(band)).cloned().collect());
    let plan = Stated { first_bands, ..stated }.plan(&roles, options, registry)?;
    Ok(LevelFile { path: path.to_owned(), format: Format::Text, plan, rows: None, notes: opened.notes })
}

/// At least one number, or nothing but missing values.
fn holds_numbers<'a>(cells: impl Iterator<Item = &'a [u8]>, mark: DecimalMark) -> bool {
    let (mut number, mut text) = (false, false);
    for cell in cells {
        match parse_number(cell, mark) {
            Cell::Number(_) => number = true,
            Cell::Text => text = true,
            Cell::Empty | Cell::NotANumber | Cell::NoValue => {}
        }
    }
    number || !text
}

fn open_parquet(path: &Path, options: &LevelOptions, registry: &mut Registry) -> Result<LevelFile, LevelError> {
    let file = ParquetFile::open(path)?;
    let names: Vec<String> = file.columns().iter().map(|column| column.name.trim().to_owned()).collect();
    let kind = |index: &usize| &file.columns()[*index].kind;
    let text_times = |index: &usize| -> bool {
        matches!(kind(index), ColumnKind::Text)
            && file.head(20, &[*index]).is_ok_and(|values| match values.as_slice() {
                [Values::Text(texts, _)] => {
                    !texts.is_empty() && texts.iter().all(|text| looks_like_time(text.trim().as_bytes()))
                }
                _ => false,
            })
    };
    let times: Vec<usize> = (0..names.len())
        .filter(|index| matches!(kind(index), ColumnKind::Time { .. } | ColumnKind::Date) || text_times(index))
        .collect();
    let numbers: Vec<usize> = (0..names.len())
        .filter(|index| match kind(index) {
            ColumnKind::Number => true,
            ColumnKind::Text => file.head(20, &[*index]).is_ok_and(|values| match values.as_slice() {
                [Values::Text(texts, _)] => holds_numbers(texts.iter().map(String::as_bytes), DecimalMark::Point),
                _ => false,
            }),
            _ => false,
        })
        .collect();
    let stated = Stated {
        seen: Seen { path, names: &names, times: &times, header_line: 0, numbers: &numbers },
        units: &[],
        preamble: &[],
        first_bands: Vec::new(),
    };
    let roles = stated.seen.roles(options)?;
    let first_bands = match roles.band {
        None => Vec::new(),
        Some(band) => match file.head(200, &[band])?.into_iter().next() {
            Some(Values::Text(texts, _)) => texts,
            Some(Values::Number(numbers, _)) => {
                let mut texts: Vec<String> = Vec::new();
                for number in numbers.iter().map(f64::to_string) {
                    if !texts.contains(&number) {
                        texts.push(number);
                    }
                }
                texts
            }
            _ => Vec::new(),
        },
    };
    let plan = Stated { first_bands, ..stated }.plan(&roles, options, registry)?;
    let mut notes = Vec::new();
    let extension = path.extension().map(|extension| extension.to_string_lossy().to_lowercase());
    if extension.as_deref().is_some_and(|extension| matches!(extension, "csv" | "txt" | "tsv" | "gz")) {
        notes.push("the file is Parquet although its name says otherwise".to_owned());
    }
    Ok(LevelFile { path: path.to_owned(), format: Format::Parquet, plan, rows: Some(file.rows()), notes })
}

impl LevelTable {
    /// What all levels describe.
    pub fn kind(&self) -> LevelKind {
        self.kind
    }

    /// The sites and bands met so far: all of a wide table's bands and a constant site at once, those of a long table
    /// while its rows are read.
    pub fn names(&self) -> &LevelNames {
        &self.registry.names
    }

    /// Streams all rows, file by file in order, with the names known so far. Levels come in dB re 1 uPa (band levels) or
    /// re 1 uPa²/Hz (density levels); a row without level, with a missing code or a flag comes with its reason.
    ///
    /// # Errors
    /// When a cell cannot be read (the message names its line), and whatever `each` returns.
    pub fn for_each<E, F>(&mut self, mut each: F) -> Result<(), E>
    where
        E: From<LevelError>,
        F: FnMut(&LevelNames, LevelRow) -> Result<(), E>,
    {
        self.blank_rows = 0;
        for file in &self.files {
            let (remarks, blank_rows) = match file.format {
                Format::Text => from_text::stream(file, &self.options, self.times, &mut self.registry, &mut each)?,
                Format::Parquet => {
                    from_parquet::stream(file, &self.options, self.times, &mut self.registry, &mut each)?
                }
            };
            self.blank_rows += blank_rows;
            self.remarks.naive |= remarks.naive;
            self.remarks.leap_second |= remarks.leap_second;
            self.remarks.hour_24 |= remarks.hour_24;
        }
        Ok(())
    }
}
