//! Streaming the rows of a delimited level table.

use super::convert::{Conversion, Converted};
use super::error::LevelError;
use super::open::LevelFile;
use super::options::LevelOptions;
use super::plan::{BandRule, NoBand, SiteRule, ValueRule, WindowRule, band_of_text};
use super::registry::{LevelNames, Registry};
use crate::io::delimited::{self, DecimalMark, DelimitedError, Row, plain_number};
use crate::io::table::BadCell;
use crate::io::time_text::{TimeProblem, TimeReader, TimeRemarks, TimeRules};
use crate::model::{Band, LevelRow, Missing};
use crate::units::{Instant, Window};
use std::collections::HashMap;
use std::path::Path;

/// Indices of repeating texts: the text that came after the last one is tried first, since tables repeat their order.
#[derive(Debug, Default)]
pub(super) struct TextCache {
    entries: Vec<Entry>,
    by_text: HashMap<Vec<u8>, usize>,
    last: usize,
}

#[derive(Debug)]
struct Entry {
    text: Vec<u8>,
    value: u32,
    next: usize,
}

impl TextCache {
    pub(super) fn get(&mut self, text: &[u8]) -> Option<u32> {
        let last = self.entries.get(self.last)?;
        if let Some(guess) = self.entries.get(last.next)
            && guess.text == text
        {
            self.last = last.next;
            return Some(guess.value);
        }
        let found = *self.by_text.get(text)?;
        self.entries[self.last].next = found;
        self.last = found;
        Some(self.entries[found].value)
    }

    pub(super) fn put(&mut self, text: &[u8], value: u32) {
        let new = self.entries.len();
        self.entries.push(Entry { text: text.to_vec(), value, next: new });
        self.by_text.insert(text.to_vec(), new);
        if let Some(last) = self.entries.get_mut(self.last) {
            last.next = new;
        }
        self.last = new;
    }
}

/// A stamp cell that repeats.
#[derive(Debug, Default)]
struct LastTime {
    text: Vec<u8>,
    instant: Option<Instant>,
}

/// Which quality values keep a row.
#[derive(Debug)]
pub(super) struct Quality {
    texts: Vec<String>,
    numbers: Vec<f64>,
}

impl Quality {
    pub(super) fn new(keep: &[String]) -> Self {
        let texts: Vec<String> = keep.iter().map(|text| text.trim().to_owned()).collect();
        let numbers = texts.iter().filter_map(|text| plain_number(text.as_bytes(), DecimalMark::Point)).collect();
        Self { texts, numbers }
    }

    pub(super) fn keeps(&self, cell: &[u8]) -> bool {
        self.texts.iter().any(|text| text.as_bytes() == cell)
            || plain_number(cell, DecimalMark::Point).is_some_and(|number| self.keeps_number(number))
    }

    pub(super) fn keeps_number(&self, number: f64) -> bool {
        self.numbers.contains(&number)
    }
}

/// Where a row stands, for messages.
pub(super) struct Place<'a> {
    pub(super) path: &'a Path,
    pub(super) row: String,
    pub(super) column: String,
    pub(super) found: String,
}

impl Place<'_> {
    fn cell(self, what: &'static str, expected: &str, key: Option<&'static str>) -> LevelError {
        let Self { path, row: place, column, found } = self;
        let (path, expected, key) = (path.to_owned(), expected.to_owned(), key.map(str::to_owned));
        Box::new(BadCell { path, place, column, found, what, expected, key }).into()
    }

    /// The error of a time that cannot be read.
    pub(super) fn time(self, problem: TimeProblem) -> LevelError {
        let (expected, key) = problem.expected();
        let key = match key {
            Some("date_order") => Some("levels.date_order"),
            Some("time_unit") => Some("levels.time_unit"),
            _ => None,
        };
        self.cell("time", expected, key)
    }

    /// The error of a band that cannot be read.
    pub(super) fn band(self, why: NoBand) -> LevelError {
        match why {
            NoBand::Wrong(source) => LevelError::Band {
                path: self.path.to_owned(),
                place: format!("{}, column `{}`", self.row, self.column),
                source,
            },
            NoBand::Scheme => self.cell("band of stated width", "a stated width of bands", Some("levels.bands")),
            NoBand::Unreadable => self.cell("band", "a frequency such as 63, 63 Hz or 1 kHz", None),
        }
    }

    /// The error of a site cell that is empty.
    pub(super) fn site(self) -> LevelError {
        self.cell("site", "a site in every row", None)
    }

    /// What a level cell comes to: a level or a reason, or an error. A row that its flag excludes is never an error.
    pub(super) fn level(
        converted: Converted,
        excluded: bool,
        place: impl FnOnce() -> Self,
    ) -> Result<(f64, Option<Missing>), LevelError> {
        match converted {
            Converted::Level(level_db) => Ok((level_db, excluded.then_some(Missing::QualityFlag))),
            _ if excluded => Ok((f64::NAN, Some(Missing::QualityFlag))),
            Converted::Missing(why) => Ok((f64::NAN, Some(why))),
            Converted::NotANumber => {
                Err(place().cell("level", "a number, or a code in the setting", Some("levels.missing_codes")))
            }
            Converted::Implausible(level_db) => {
                let Self { path, row: place, column, found } = place();
                Err(LevelError::Implausible { path: path.to_owned(), place, column, found, level_db })
            }
        }
    }
}

/// One window, checked.
pub(super) fn window_of(
    path: &Path,
    place: impl FnOnce() -> String,
    start: Instant,
    end: Instant,
) -> Result<Window, LevelError> {
    Window::new(start, end).ok_or_else(|| LevelError::ReversedWindow {
        path: path.to_owned(),
        place: place(),
        start: start.iso(),
        end: end.iso(),
    })
}

struct Stream<'a> {
    path: &'a Path,
    names: &'a [String],
    options: &'a LevelOptions,
    conversion: &'a Conversion,
    decimal: DecimalMark,
    times: TimeReader,
    last: [LastTime; 2],
    sites: TextCache,
    bands: TextCache,
    quality: Quality,
}

impl<'a> Stream<'a> {
    fn place(&self, row: &Row<'_>, column: usize) -> Place<'a> {
        Place {
            path: self.path,
            row: format!("line {}", row.line),
            column: self.names.get(column).cloned().unwrap_or_else(|| format!("{}", column + 1)),
            found: row.shown(column),
        }
    }

    fn time(&mut self, row: &Row<'_>, column: usize, slot: usize) -> Result<Instant, LevelError> {
        let cell = row.cell(column);
        let last = &mut self.last[slot];
        if let Some(instant) = last.instant
            && last.text == cell
        {
            return Ok(instant);
        }
        match self.times.read(cell) {
            Ok(instant) => {
                let last = &mut self.last[slot];
                last.text.clear();
                last.text.extend_from_slice(cell);
                last.instant = Some(instant);
                Ok(instant)
            }
            Err(problem) => Err(self.place(row, column).time(problem)),
        }
    }

    fn site(&mut self, row: &Row<'_>, column: usize, registry: &mut Registry) -> Result<u32, LevelError> {
        let cell = row.cell(column);
        if let Some(site) = self.sites.get(cell) {
            return Ok(site);
        }
        if cell.is_empty() {
            return Err(self.place(row, column).site());
        }
        let site = registry.site(self.text(row, column)?);
        self.sites.put(cell, site);
        Ok(site)
    }

    fn text<'r>(&self, row: &Row<'r>, column: usize) -> Result<&'r str, LevelError> {
        std::str::from_utf8(row.cell(column)).map_err(|_| {
            let Place { column, .. } = self.place(row, column);
            let path = self.path.to_owned();
            LevelError::Text(DelimitedError::Encoding {
                path,
                line: row.line,
                column,
                key: "levels.encoding".to_owned(),
            })
        })
    }

    fn band(&mut self, row: &Row<'_>, column: usize, registry: &mut Registry) -> Result<u32, LevelError> {
        let cell = row.cell(column);
        if let Some(band) = self.bands.get(cell) {
            return Ok(band);
        }
        let found = if let Some(band) = registry.known_band(cell) {
            band
        } else {
            let text = self.text(row, column)?;
            let band = band_of_text(text, self.options).map_err(|why| self.place(row, column).band(why))?;
            registry.band(cell, band)
        };
        self.bands.put(cell, found);
        Ok(found)
    }

    fn band_by_edges(
        &mut self,
        row: &Row<'_>,
        low: usize,
        high: usize,
        registry: &mut Registry,
    ) -> Result<u32, LevelError> {
        let mut key = row.cell(low).to_vec();
        key.push(b'|');
        key.extend_from_slice(row.cell(high));
        if let Some(band) = self.bands.get(&key) {
            return Ok(band);
        }
        let number = |column: usize| {
            plain_number(row.cell(column), self.decimal).ok_or_else(|| self.place(row, column).band(NoBand::Unreadable))
        };
        let band = Band::from_edges(number(low)?, number(high)?)
            .map_err(|why| self.place(row, low).band(NoBand::Wrong(why)))?;
        let found = registry.band(&key, band);
        self.bands.put(&key, found);
        Ok(found)
    }

    fn level(&self, row: &Row<'_>, column: usize, excluded: bool) -> Result<(f64, Option<Missing>), LevelError> {
        let converted = self.conversion.text(row.cell(column), self.decimal);
        Place::level(converted, excluded, || self.place(row, column))
    }

    fn window(&mut self, row: &Row<'_>, rule: WindowRule) -> Result<Window, LevelError> {
        match rule {
            WindowRule::Stamped { column, stamp, length_ms } => Ok(stamp.window(self.time(row, column, 0)?, length_ms)),
            WindowRule::Both { start, end } => {
                let (start, end) = (self.time(row, start, 0)?, self.time(row, end, 1)?);
                window_of(self.path, || format!("line {}", row.line), start, end)
            }
        }
    }
}

/// Streams one file; returns what was met among the times, and how many blank rows there were.
pub(super) fn stream<E, F>(
    file: &LevelFile,
    options: &LevelOptions,
    times: TimeRules,
    registry: &mut Registry,
    each: &mut F,
) -> Result<(TimeRemarks, u64), E>
where
    E: From<LevelError>,
    F: FnMut(&LevelNames, LevelRow) -> Result<(), E>,
{
    let plan = &file.plan;
    let mut opened = delimited::open(&file.path, &options.text, "levels").map_err(LevelError::from)?;
    let mut stream = Stream {
        path: &file.path,
        names: &opened.names,
        options,
        conversion: &plan.conversion,
        decimal: opened.decimal,
        times: TimeReader::new(times),
        last: Default::default(),
        sites: TextCache::default(),
        bands: TextCache::default(),
        quality: Quality::new(&options.qc_keep),
    };
    let columns = opened.names.len();
    while let Some(row) = opened.rows.next().map_err(LevelError::from)? {
        if row.len() != columns {
            row.check_width(&file.path, columns, opened.header_line).map_err(LevelError::from)?;
        }
        let window = stream.window(&row, plan.window)?;
        let site = match plan.site {
            SiteRule::Constant(site) => site,
            SiteRule::Column(column) => stream.site(&row, column, registry)?,
        };
        let excluded = plan.qc.is_some_and(|column| !stream.quality.keeps(row.cell(column)));
        match &plan.value {
            ValueRule::Long { level, band } => {
                let band = match *band {
                    BandRule::Constant(band) => band,
                    BandRule::Column(column) => stream.band(&row, column, registry)?,
                    BandRule::Edges(low, high) => stream.band_by_edges(&row, low, high, registry)?,
                };
                let (level_db, reason) = stream.level(&row, *level, excluded)?;
                each(&registry.names, LevelRow { site, band, window, level_db, row: row.line, reason })?;
            }
            ValueRule::Wide(bands) => {
                for &(column, band) in bands {
                    let (level_db, reason) = stream.level(&row, column, excluded)?;
                    each(&registry.names, LevelRow { site, band, window, level_db, row: row.line, reason })?;
                }
            }
        }
    }
    Ok((stream.times.remarks(), opened.rows.blank_rows()))
}
