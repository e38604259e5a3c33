//! Streaming the rows of a Parquet level table, one run of rows at a time.

use super::convert::Converted;
use super::error::LevelError;
use super::from_text::{Place, Quality, window_of};
use super::open::LevelFile;
use super::options::LevelOptions;
use super::plan::{BandRule, NoBand, SiteRule, ValueRule, WindowRule, band_of_text};
use super::registry::{LevelNames, Registry};
use crate::io::delimited::DecimalMark;
use crate::io::parquet::{ColumnKind, ParquetFile, Values};
use crate::io::time_text::{TimeProblem, TimeReader, TimeRemarks, TimeRules};
use crate::model::{Band, LevelRow, Missing};
use crate::units::{Instant, Window};
use std::path::Path;

struct Stream<'a> {
    path: &'a Path,
    file: &'a ParquetFile,
    options: &'a LevelOptions,
    times: TimeReader,
    quality: Quality,
    /// First row of the run, from 0.
    first: u64,
}

/// A column of the run with its index.
struct Column<'a> {
    index: usize,
    values: &'a Values,
}

impl<'a> Stream<'a> {
    fn place(&self, row: usize, column: &Column<'_>) -> Place<'a> {
        let found = match column.values {
            Values::Number(numbers, nulls) if nulls.get(row) != Some(&true) => {
                numbers.get(row).map_or_else(String::new, f64::to_string)
            }
            Values::Text(texts, codes) => {
                codes.get(row).and_then(|code| texts.get(*code as usize)).cloned().unwrap_or_else(|| "null".to_owned())
            }
            Values::TimeMs(ms) if ms.get(row).is_some_and(|ms| *ms != i64::MIN) => Instant(ms[row]).iso(),
            _ => "null".to_owned(),
        };
        Place {
            path: self.path,
            row: format!("row {}", self.first + row as u64 + 1),
            column: self.file.columns().get(column.index).map_or_else(String::new, |info| info.name.clone()),
            found,
        }
    }

    /// The instants of a whole run, or the first problem.
    fn instants(&mut self, column: &Column<'_>) -> Result<Vec<Instant>, LevelError> {
        let problem = |row: usize, problem: TimeProblem, this: &Self| this.place(row, column).time(problem);
        match column.values {
            Values::TimeMs(ms) => {
                let info = self.file.columns().get(column.index).map(|info| &info.kind);
                let zoned = matches!(info, Some(ColumnKind::Time { zone: Some(_) }));
                if !zoned {
                    self.times.note_naive();
                }
                ms.iter()
                    .enumerate()
                    .map(|(row, &ms)| match ms {
                        i64::MIN => Err(problem(row, TimeProblem::Empty, self)),
                        ms if zoned => Ok(Instant(ms)),
                        ms => Ok(self.times.from_naive_ms(ms)),
                    })
                    .collect()
            }
            Values::Number(numbers, nulls) => {
                let unit = self.times.rules().unit;
                (numbers.iter().enumerate())
                    .map(|(row, &number)| {
                        if nulls.get(row) == Some(&true) {
                            return Err(problem(row, TimeProblem::Empty, self));
                        }
                        let unit = unit.ok_or_else(|| problem(row, TimeProblem::Unit, self))?;
                        unit.instant(number).ok_or_else(|| problem(row, TimeProblem::Impossible, self))
                    })
                    .collect()
            }
            Values::Text(texts, codes) => {
                let read: Vec<Result<Instant, TimeProblem>> =
                    texts.iter().map(|text| self.times.read(text.trim().as_bytes())).collect();
                (codes.iter().enumerate())
                    .map(|(row, code)| match read.get(*code as usize) {
                        Some(Ok(instant)) => Ok(*instant),
                        Some(Err(why)) => Err(problem(row, *why, self)),
                        None => Err(problem(row, TimeProblem::Empty, self)),
                    })
                    .collect()
            }
        }
    }

    fn keeps(&self, column: Option<&Column<'_>>, row: usize) -> bool {
        match column.map(|column| column.values) {
            None => true,
            Some(Values::Number(numbers, _)) => {
                numbers.get(row).is_some_and(|number| self.quality.keeps_number(*number))
            }
            Some(Values::Text(texts, codes)) => {
                let text = codes.get(row).and_then(|code| texts.get(*code as usize)).map_or("", String::as_str);
                self.quality.keeps(text.trim().as_bytes())
            }
            Some(Values::TimeMs(_)) => false,
        }
    }
}

/// An index for each row, from a text or number column; `make` turns a new text into its index.
fn indices(
    column: &Column<'_>,
    mut make: impl FnMut(&str, usize) -> Result<u32, LevelError>,
    empty: impl Fn(usize) -> LevelError,
) -> Result<Vec<u32>, LevelError> {
    match column.values {
        Values::Text(texts, codes) => {
            let mut made: Vec<Option<u32>> = vec![None; texts.len()];
            (codes.iter().enumerate())
                .map(|(row, &code)| {
                    let Some(slot) = made.get_mut(code as usize) else { return Err(empty(row)) };
                    if let Some(index) = *slot {
                        return Ok(index);
                    }
                    let index = make(texts[code as usize].trim(), row)?;
                    *slot = Some(index);
                    Ok(index)
                })
                .collect()
        }
        Values::Number(numbers, nulls) => {
            // Tables repeat their order: the number that came after the last one is tried first.
            let mut made: Vec<(u64, u32)> = Vec::new();
            let mut at = 0;
            (numbers.iter().enumerate())
                .map(|(row, &number)| {
                    if nulls.get(row) == Some(&true) || number.is_nan() {
                        return Err(empty(row));
                    }
                    let bits = number.to_bits();
                    let next = if at + 1 < made.len() { at + 1 } else { 0 };
                    at = match (made.get(at), made.get(next)) {
                        (Some((known, _)), _) if *known == bits => at,
                        (_, Some((known, _))) if *known == bits => next,
                        _ => {
                            let found = made.iter().position(|(known, _)| *known == bits);
                            if found.is_none() {
                                made.push((bits, make(&number.to_string(), row)?));
                            }
                            found.unwrap_or(made.len() - 1)
                        }
                    };
                    Ok(made[at].1)
                })
                .collect()
        }
        Values::TimeMs(_) => Err(empty(0)),
    }
}

/// A finite number of a column.
fn number(column: &Column<'_>, row: usize) -> Option<f64> {
    match column.values {
        Values::Number(numbers, _) => numbers.get(row).copied().filter(|number| number.is_finite()),
        _ => None,
    }
}

/// Streams one file; returns what was met among the times (and no blank rows: Parquet has none).
pub(super) fn stream<E, F>(
    level_file: &LevelFile,
    options: &LevelOptions,
    times: TimeRules,
    registry: &mut Registry,
    each: &mut F,
) -> Result<(TimeRemarks, u64), E>
where
    E: From<LevelError>,
    F: FnMut(&LevelNames, LevelRow) -> Result<(), E>,
{
    let plan = &level_file.plan;
    let file = ParquetFile::open(&level_file.path).map_err(LevelError::from)?;
    let mut wanted: Vec<usize> = Vec::new();
    match plan.window {
        WindowRule::Stamped { column, .. } => wanted.push(column),
        WindowRule::Both { start, end } => wanted.extend([start, end]),
    }
    if let SiteRule::Column(column) = plan.site {
        wanted.push(column);
    }
    match &plan.value {
        ValueRule::Long { level, band } => {
            wanted.push(*level);
            match *band {
                BandRule::Column(column) => wanted.push(column),
                BandRule::Edges(low, high) => wanted.extend([low, high]),
                BandRule::Constant(_) => {}
            }
        }
        ValueRule::Wide(bands) => wanted.extend(bands.iter().map(|(column, _)| *column)),
    }
    wanted.extend(plan.qc);
    wanted.sort_unstable();
    wanted.dedup();

    let times = TimeReader::new(times);
    let quality = Quality::new(&options.qc_keep);
    let mut stream = Stream { path: &level_file.path, file: &file, options, times, quality, first: 0 };
    for run in 0..file.runs() {
        let values = file.read(run, &wanted).map_err(LevelError::from)?;
        stream.first = file.first_row(run);
        let column = |index: usize| {
            let at = wanted.binary_search(&index).expect("every planned column is wanted");
            Column { index, values: &values[at] }
        };
        let windows = windows(&mut stream, plan.window, &column)?;
        let sites = match plan.site {
            SiteRule::Constant(_) => Vec::new(),
            SiteRule::Column(index) => {
                let site = column(index);
                let empty = |row| stream.place(row, &site).site();
                indices(
                    &site,
                    |text, row| if text.is_empty() { Err(empty(row)) } else { Ok(registry.site(text)) },
                    empty,
                )?
            }
        };
        let site_of = |row: usize| match plan.site {
            SiteRule::Constant(site) => site,
            SiteRule::Column(_) => sites[row],
        };
        let qc = plan.qc.map(&column);
        let level_columns: Vec<(Column<'_>, Option<u32>)> = match &plan.value {
            ValueRule::Long { level, .. } => vec![(column(*level), None)],
            ValueRule::Wide(bands) => bands.iter().map(|(index, band)| (column(*index), Some(*band))).collect(),
        };
        let bands = match &plan.value {
            ValueRule::Long { band, .. } => bands_of(&stream, *band, &column, windows.len(), registry)?,
            ValueRule::Wide(_) => Vec::new(),
        };
        for (row, window) in windows.into_iter().enumerate() {
            let excluded = !stream.keeps(qc.as_ref(), row);
            for (level, band) in &level_columns {
                let converted = match level.values {
                    Values::Number(numbers, nulls) => match nulls.get(row) {
                        Some(true) => Converted::Missing(Missing::NoLevel),
                        _ => plan.conversion.number(numbers[row]),
                    },
                    Values::Text(texts, codes) => match texts.get(codes[row] as usize) {
                        Some(text) => plan.conversion.text(text.trim().as_bytes(), DecimalMark::Point),
                        None => Converted::Missing(Missing::NoLevel),
                    },
                    Values::TimeMs(_) => Converted::NotANumber,
                };
                let (level_db, reason) = Place::level(converted, excluded, || stream.place(row, level))?;
                let band = band.unwrap_or_else(|| bands[row]);
                let number = stream.first + row as u64 + 1;
                each(&registry.names, LevelRow { site: site_of(row), band, window, level_db, row: number, reason })?;
            }
        }
    }
    Ok((stream.times.remarks(), 0))
}

fn windows<'v>(
    stream: &mut Stream<'_>,
    rule: WindowRule,
    column: &impl Fn(usize) -> Column<'v>,
) -> Result<Vec<Window>, LevelError> {
    match rule {
        WindowRule::Stamped { column: index, stamp, length_ms } => {
            Ok(stream.instants(&column(index))?.into_iter().map(|instant| stamp.window(instant, length_ms)).collect())
        }
        WindowRule::Both { start, end } => {
            let (starts, ends) = (stream.instants(&column(start))?, stream.instants(&column(end))?);
            let first = stream.first;
            starts
                .into_iter()
                .zip(ends)
                .enumerate()
                .map(|(row, (start, end))| {
                    window_of(stream.path, || format!("row {}", first + row as u64 + 1), start, end)
                })
                .collect()
        }
    }
}

fn bands_of<'v>(
    stream: &Stream<'_>,
    rule: BandRule,
    column: &impl Fn(usize) -> Column<'v>,
    rows: usize,
    registry: &mut Registry,
) -> Result<Vec<u32>, LevelError> {
    match rule {
        BandRule::Constant(band) => Ok(vec![band; rows]),
        BandRule::Column(index) => {
            let column = column(index);
            let unreadable = |row| stream.place(row, &column).band(NoBand::Unreadable);
            let make = |text: &str, row| {
                if let Some(band) = registry.known_band(text.as_bytes()) {
                    return Ok(band);
                }
                let band = band_of_text(text, stream.options).map_err(|why| stream.place(row, &column).band(why))?;
                Ok(registry.band(text.as_bytes(), band))
            };
            indices(&column, make, unreadable)
        }
        BandRule::Edges(low, high) => {
            let (low, high) = (column(low), column(high));
            (0..rows)
                .map(|row| {
                    let edge = |column: &Column<'_>| {
                        number(column, row).ok_or_else(|| stream.place(row, column).band(NoBand::Unreadable))
                    };
                    let (low_hz, high_hz) = (edge(&low)?, edge(&high)?);
                    let key = format!("{low_hz}|{high_hz}");
                    if let Some(band) = registry.known_band(key.as_bytes()) {
                        return Ok(band);
                    }
                    let band = Band::from_edges(low_hz, high_hz)
                        .map_err(|why| stream.place(row, &low).band(NoBand::Wrong(why)))?;
                    Ok(registry.band(key.as_bytes(), band))
                })
                .collect()
        }
    }
}
